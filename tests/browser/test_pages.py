"""Shelf, Records, Order and Model in a browser: with and without a script nothing typed is lost, no policy broken."""

from __future__ import annotations

import re
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from playwright.sync_api import Page, expect

pytestmark = pytest.mark.browser
OpenPage = Callable[..., Page]


@pytest.fixture
def csv(tmp_path: Path) -> Path:
    """400 invented visits in a file, with blanks and a number."""
    rng = np.random.default_rng(11)
    rows = 400
    shift = rng.choice(["days", "nights"], rows, p=[0.6, 0.4])
    mentor = np.where(rng.random(rows) < np.where(shift == "nights", 0.7, 0.3), "yes", "no")
    passed = np.where(rng.random(rows) < 0.3 + 0.3 * (mentor == "yes") + 0.2 * (shift == "days"), "yes", "no")
    travel = pd.Series(rng.integers(5, 90, rows)).astype(object)
    travel[rng.random(rows) < 0.04] = ""
    path = tmp_path / "visits.csv"
    frame = pd.DataFrame({"shift work": shift, "travel time": travel, "mentor": mentor, "passed": passed})
    frame.to_csv(path, index=False)
    return path


def bring(page: Page, csv: Path, name: str = "Visits") -> None:
    page.goto("")
    page.get_by_label("Name of the study").fill(name)
    page.get_by_label("The table").set_input_files(csv)
    page.get_by_role("button", name="Read it").click()
    expect(page).to_have_url(re.compile("/records$"))


@pytest.mark.parametrize("javascript", [True, False], ids=["with a script", "without a script"])
def test_from_a_file_to_a_model(open_page: OpenPage, csv: Path, javascript: bool) -> None:
    page = open_page(javascript=javascript)
    bring(page, csv)
    expect(page.get_by_role("heading", level=1)).to_contain_text("400 records. 4 columns will be used")

    card = page.get_by_role("form", name="passed")
    card.locator("summary").click()
    card.get_by_label("yes", exact=True).check()
    card.get_by_role("button", name="Save passed").click()
    expect(card.locator(".marks")).to_contain_text("outcome, yes is better")

    page.get_by_role("link", name="Go on to the order").click()
    page.locator("#text").fill("Before: shift work, travel time\nProgramme: mentor\nAfter: passed")
    page.get_by_role("button", name="Use this order").click()
    expect(page.get_by_role("heading", level=1)).to_contain_text("this order allows 7")
    page.get_by_role("button", name="Learn a model of this order").click()
    expect(page.get_by_role("heading", level=1)).to_contain_text("unseen records", timeout=60_000)
    expect(page.get_by_role("heading", name="How each column comes about")).to_be_visible()


def test_saving_one_card_keeps_what_is_typed_in_another(open_page: OpenPage, csv: Path) -> None:
    page = open_page(expect={422})
    bring(page, csv)
    shift, mentor = page.get_by_role("form", name="shift work"), page.get_by_role("form", name="mentor")
    shift.locator("summary").click()
    shift.get_by_label("changeable").check()
    mentor.locator("summary").click()
    mentor.get_by_label("changeable").check()
    mentor.get_by_role("button", name="Save mentor").click()
    expect(mentor.locator(".marks")).to_contain_text("changeable")
    expect(mentor.locator("details")).not_to_have_attribute("open", "")
    expect(shift.get_by_label("changeable")).to_be_checked()
    expect(shift.locator("details")).to_have_attribute("open", "")


def test_buttons_of_the_order_keep_focus_and_place(open_page: OpenPage, csv: Path) -> None:
    page = open_page()
    bring(page, csv)
    page.goto(page.url.replace("/records", "/order"))
    button = page.get_by_role("button", name="Move passed to a new stage after this one")
    button.focus()
    page.keyboard.press("Enter")
    expect(page.get_by_role("heading", level=1)).to_contain_text("that would run backwards")
    expect(page.locator("section.lane")).to_have_count(2)
    assert page.url.endswith("/order")


def test_the_curve_can_be_explored_within_the_policy(open_page: OpenPage, csv: Path) -> None:
    page = open_page()
    bring(page, csv)
    page.goto(page.url.replace("/records", "/model"))
    page.get_by_role("button", name="Learn without an order").click()
    expect(page.get_by_role("heading", level=1)).to_contain_text("unseen records", timeout=60_000)
    assert page.locator("#explore .main-svg").count() == 0
    page.get_by_text("Explore this curve").click()
    expect(page.locator("#explore .main-svg").first).to_be_visible()


def test_a_bad_file_is_explained_beside_the_form_that_keeps_the_name(open_page: OpenPage, tmp_path: Path) -> None:
    page = open_page(expect={422})
    bad = tmp_path / "spring.csv"
    bad.write_text("a,b\n1,2\n3,4,5\n")
    page.goto("")
    page.get_by_label("Name of the study").fill("Spring intake")
    page.get_by_label("The table").set_input_files(bad)
    page.get_by_role("button", name="Read it").click()
    expect(page.get_by_role("heading", name="Not read")).to_be_visible()
    expect(page.get_by_label("Name of the study")).to_have_value("Spring intake")


@pytest.mark.parametrize("width", [320, 360, 1280, 1920])
def test_no_page_is_wider_than_the_window(open_page: OpenPage, csv: Path, width: int) -> None:
    page = open_page(width=width)
    bring(page, csv)
    for place in ("records?open=0", "order", "model"):
        page.goto(re.sub("/records.*|/order|/model", f"/{place}", page.url))
        assert page.evaluate("document.documentElement.scrollWidth") <= width, place
