"""The whole walk in a browser: a table comes in, an order is stated, a model is learned, a question is answered."""

from __future__ import annotations

import re
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from playwright.sync_api import Page, expect

from app import samples
from tests.app.mixed_evening import mixed_evening
from tests.browser.test_pages import bring
from tests.browser.test_pages import csv as csv  # a fixture

pytestmark = pytest.mark.browser
OpenPage = Callable[..., Page]
BOTH = pytest.mark.parametrize("javascript", [True, False], ids=["with a script", "without a script"])


def to_a_model(page: Page, csv: Path) -> None:
    bring(page, csv)
    for column, mark in (("passed", "yes"), ("mentor", "changeable")):
        card = page.get_by_role("form", name=column)
        card.locator("summary").click()
        card.get_by_label(mark, exact=mark == "yes").check()
        card.get_by_role("button", name=f"Save {column}").click()
        expect(card.locator(".marks")).to_contain_text("outcome" if column == "passed" else "changeable")
    page.get_by_role("link", name="Go on to the order").click()
    page.locator("#text").fill("Before: shift work, travel time\nProgramme: mentor\nAfter: passed")
    page.get_by_role("button", name="Use this order").click()
    page.get_by_role("button", name="Learn a model of this order").click()
    expect(page.get_by_role("heading", level=1)).to_contain_text("unseen records", timeout=60_000)


def answer(page: Page):
    return page.locator("#answer")


@BOTH
def test_from_a_file_to_a_pinned_and_set_answer(open_page: OpenPage, csv: Path, javascript: bool) -> None:
    page = open_page(javascript=javascript)
    to_a_model(page, csv)
    page.get_by_role("link", name="Ask", exact=True).click()
    expect(answer(page)).to_contain_text("Across all 400 records passed is yes for")
    page.get_by_role("link", name=re.compile("^Open shift work")).click()
    page.get_by_role("link", name="Pin nights", exact=True).click()
    expect(answer(page)).to_contain_text("Among records with shift work = nights, passed is yes for")
    page.get_by_role("link", name="Set to yes", exact=True).click()
    said = re.compile(
        r"By this estimate, among records with shift work = nights, setting mentor to yes "
        r"(would move passed from|may not move passed: from) [\d.]+% to [\d.]+% "
        r"\([+−]?[\d.]+ points?, 90% interval"
    )
    expect(answer(page)).to_contain_text(said)
    expect(page.locator(".had")).to_contain_text("That is not the effect.")
    expect(page.locator(".standing")).to_contain_text("does not replace a trial, an ethics review")
    expect(page.locator(".cautions")).to_contain_text("checks made")
    if javascript:
        expect(page.get_by_role("status")).to_contain_text("By this estimate, among records with shift work = nights")

    sentence = answer(page).inner_text()
    page.reload()
    assert answer(page).inner_text() == sentence
    page.go_back()
    expect(answer(page)).to_contain_text("Among records with shift work = nights, passed is yes for")
    page.go_forward()
    expect(answer(page)).to_contain_text(said)
    page.get_by_role("link", name="Print this answer").click()
    expect(page.get_by_role("heading", level=1)).to_contain_text(said)


def open_sample(live, page: Page) -> str:
    key = samples.open_sample(live.app.state.store, live.app.state.jobs, "lantern_street").key
    page.goto(f"study/{key}/ask")
    expect(answer(page)).to_contain_text("Across all 4,000 records", timeout=60_000)
    return key


def test_the_sample_answers_in_six_clicks(live, open_page: OpenPage) -> None:
    page = open_page()
    open_sample(live, page)
    clicks = 0
    said = "By this estimate, among records with shift work = nights, setting mentor to yes would move passed from"
    for name, then in (
        ("^Open shift work", "Across all 4,000 records"),
        ("^Pin nights$", "Among records with shift work = nights"),
        ("^Set to yes$", said),
    ):
        page.get_by_role("link", name=re.compile(name)).first.click()
        clicks += 1
        expect(answer(page)).to_contain_text(then)
    expect(page.locator(".had")).to_contain_text("Those with mentor = yes anyway: 42%. That is not the effect.")
    expect(page.locator(".rank.weakens")).to_contain_text("fewer than 10 records with mentor = yes")
    assert clicks <= 6


def test_two_tabs_do_not_disturb_each_other(live, open_page: OpenPage) -> None:
    first = open_page()
    key = open_sample(live, first)
    second = first.context.new_page()
    first.goto(f"study/{key}/ask?pin=shift-work.nights")
    second.goto(f"{live.address}study/{key}/ask?pin=shift-work.days&set=mentor.yes")
    first.get_by_role("link", name="Set to yes", exact=True).first.click()
    expect(answer(first)).to_contain_text("among records with shift work = nights, setting mentor to yes")
    second.reload()
    expect(answer(second)).to_contain_text("among records with shift work = days, setting mentor to yes")
    first.reload()
    expect(answer(first)).to_contain_text("among records with shift work = nights, setting mentor to yes")


@BOTH
def test_a_bad_file_is_told_and_nothing_is_stored(live, open_page: OpenPage, tmp_path: Path, javascript: bool) -> None:
    page = open_page(javascript=javascript, expect={422})
    bad = tmp_path / "visits.csv"
    bad.write_text("shift,passed\nnights,yes\ndays,no,maybe\n")
    page.goto("")
    page.get_by_label("Name of the study").fill("Visits")
    page.get_by_label("The table").set_input_files(bad)
    page.get_by_role("button", name="Read it").click()
    expect(page.get_by_role("alert")).to_contain_text("line 3 has 3 cells")
    expect(page.get_by_role("alert")).to_contain_text("nothing; what was on the Shelf is as it was")
    expect(page.get_by_label("Name of the study")).to_have_value("Visits")
    assert live.app.state.store.studies() == []


def test_a_clicked_pin_keeps_focus_and_place(live, open_page: OpenPage) -> None:
    page = open_page()
    key = open_sample(live, page)
    page.goto(f"study/{key}/ask?open=shift-work")
    ring = page.get_by_role("link", name="Pin nights", exact=True)
    ring.scroll_into_view_if_needed()
    before = ring.bounding_box()
    ring.click()
    pinned = page.get_by_role("link", name="Pinned at nights, take out")
    expect(pinned).to_be_focused()
    after = pinned.bounding_box()
    assert abs(after["y"] - before["y"]) <= 2 and abs(after["x"] - before["x"]) <= 2


@pytest.fixture
def mixed(tmp_path: Path) -> Path:
    """500 invented learners in a file: categories, numbers, sites that belong together and a number that repeats."""
    frame = mixed_evening()
    rng = np.random.default_rng(9)
    frame = frame.assign(fee=np.where(rng.random(len(frame)) < 0.5, 0.0, rng.normal(80.0, 9.0, len(frame)).round(1)))
    path = tmp_path / "learners.csv"
    frame.assign(site=[f"site {each:02d}" for each in rng.integers(0, 40, len(frame))]).to_csv(path, index=False)
    return path


def change(page: Page, column: str, then: str, **marks: str) -> None:
    """Open the card of a column on Records, choose its kind or direction or tick it as changeable, and save it."""
    card = page.get_by_role("form", name=column, exact=True)
    card.locator("summary").click()
    if "kind" in marks:
        card.get_by_label(f"Kind of {column}").select_option(marks["kind"])
    if "better" in marks:
        card.get_by_label(f"More or less of {column}").select_option(marks["better"])
    if "changeable" in marks:
        card.get_by_label("changeable").check()
    card.get_by_role("button", name=f"Save {column}").click()
    expect(page.get_by_role("form", name=column, exact=True)).to_contain_text(then)


@BOTH
def test_from_a_file_with_numbers_to_a_mean_among_a_band_if_a_number_is_set(
    open_page: OpenPage, mixed: Path, javascript: bool
) -> None:
    page = open_page(javascript=javascript)
    bring(page, mixed, "Learners")
    expect(page.get_by_role("form", name="travel time", exact=True)).to_contain_text("learned as a number")
    expect(page.get_by_role("form", name="fee", exact=True)).to_contain_text("learned as bands")
    change(page, "site", "40 groups", kind="group")
    change(page, "mentor hours", "changeable", changeable="yes")
    change(page, "mark", "more is better", better="more")
    page.get_by_role("link", name="Go on to the order").click()
    page.locator("#text").fill(
        "Before: shift work, travel time, fee\nOffered: mentor\nDuring: mentor hours\nAfter: mark, passed"
    )
    page.get_by_role("button", name="Use this order").click()
    page.get_by_role("button", name="Learn a model of this order").click()
    expect(page.get_by_role("heading", level=1)).to_contain_text("unseen records", timeout=60_000)
    expect(page.get_by_role("main")).to_contain_text("The records stand in 40 groups.")
    expect(page.get_by_role("main")).to_contain_text("“fee” is taken as bands")
    expect(page.get_by_role("main")).to_contain_text("Nobody settled this direction: mark goes with passed.")
    expect(page.locator("table.links")).to_contain_text("on average")

    page.get_by_role("link", name="Ask", exact=True).click()
    expect(answer(page)).to_contain_text(re.compile(r"Across all 500 records mark is [\d.]+ on average"))
    page.get_by_role("link", name=re.compile("^Open travel time")).click()
    page.locator("[id^=pin-travel-time-under]").click()
    expect(answer(page)).to_contain_text(re.compile(r"Among records with travel time under [\d.]+, mark is [\d.]+ on"))
    hours = page.locator("#form-set-mentor-hours")
    if not hours.is_visible():
        page.get_by_role("link", name=re.compile("^Open mentor hours")).click()
    hours.locator("input[name='set.mentor-hours']").fill("11.5")
    hours.get_by_role("button", name="Set").click()
    said = re.compile(
        r"By this estimate.*, among records with travel time under [\d.]+, setting mentor hours to 11.5 "
        r"would move mark from [\d.]+ to [\d.]+ on average \(\+[\d.]+, "
    )
    expect(answer(page)).to_contain_text(said)
    assert "set=mentor-hours.to.11.5" in page.url
    figures = re.search(r"from ([\d.]+) to ([\d.]+) on average", answer(page).inner_text())
    assert figures is not None
    before, after = map(float, figures.groups())
    assert after - before > 2.0, "2 more for each hour, and hours are 7 on average"
    expect(page.locator(".cautions")).to_contain_text("checks made")
    sentence = answer(page).inner_text().split("(")[0]
    page.reload()
    assert answer(page).inner_text().split("(")[0] == sentence
    page.get_by_role("link", name="Print this answer").click()
    expect(page.get_by_role("heading", level=1)).to_contain_text(said)
