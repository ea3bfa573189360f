"""Numbers on Ask in a browser: set, shifted and pinned by hand, with the keyboard alone, with a script and without."""

from __future__ import annotations

import re
from collections.abc import Callable
from typing import TYPE_CHECKING

import pytest
from playwright.sync_api import Page, expect

from app.store import Choices
from tests.app.evening import keep_a_model
from tests.app.mixed_evening import MIXED_PLAN, mixed_evening

if TYPE_CHECKING:
    from tests.conftest import Live

pytestmark = pytest.mark.browser
BOTH = pytest.mark.parametrize("javascript", [True, False], ids=["with a script", "without a script"])
OpenPage = Callable[..., Page]


@pytest.fixture
def home(live: Live) -> str:
    store = live.app.state.store
    study = keep_a_model(store, store.bring("Mixed", mixed_evening(), "mixed.csv", Choices(), MIXED_PLAN))
    return f"/study/{study.key}/ask"


def answer(page: Page):
    return page.locator("#answer")


@BOTH
def test_a_number_is_set_shifted_and_pinned_by_hand(open_page: OpenPage, home: str, javascript: bool) -> None:
    page = open_page(javascript=javascript)
    page.goto(f"{home}?open=mentor-hours")
    page.get_by_label("Set mentor hours to").fill("12")
    page.get_by_label("mentor hours: for how many of them, in per cent").first.fill("80")
    page.locator("#send-set-mentor-hours").click()
    expect(answer(page)).to_contain_text("setting mentor hours to 12 for 80% of all records would move mark from")
    page.get_by_label("Shift mentor hours by").fill("-1.5")
    page.locator("#send-shift-mentor-hours").click()
    expect(answer(page)).to_contain_text("lowering mentor hours by 1.5 for 80% of all records would move mark from")
    page.get_by_label("mentor hours from").fill("3")
    page.get_by_label("mentor hours to under").fill("9")
    page.locator("#send-range-mentor-hours").click()
    expect(answer(page)).to_contain_text("among records with mentor hours 3 to under 9, lowering mentor hours by 1.5")
    page.get_by_role("link", name="Set 1.5 lower, take out").click()
    expect(answer(page)).to_contain_text("Among records with mentor hours 3 to under 9, mark is ")
    page.go_back()
    expect(answer(page)).to_contain_text("lowering mentor hours by 1.5", timeout=20_000)


def test_the_keyboard_alone_sets_a_number_and_keeps_its_place(open_page: OpenPage, home: str) -> None:
    page = open_page()
    page.goto(f"{home}?open=mentor-hours")
    field = page.get_by_label("Set mentor hours to")
    field.focus()
    before = field.evaluate("node => node.getBoundingClientRect().top")
    page.keyboard.press("Control+a")
    page.keyboard.type("12")
    page.keyboard.press("Enter")
    expect(answer(page)).to_contain_text("setting mentor hours to 12 would move mark from")
    page.wait_for_selector(".doubt", state="detached")
    assert page.evaluate("document.activeElement.id") == "form-set-value-mentor-hours"
    assert abs(field.evaluate("node => node.getBoundingClientRect().top") - before) <= 2
    page.get_by_role("link", name="Set to 12, take out").focus()
    page.keyboard.press("Enter")
    expect(answer(page)).to_contain_text("Across all 500 records mark is ")
    assert page.evaluate("document.activeElement.id") == "form-set-value-mentor-hours"


@BOTH
def test_nonsense_typed_is_answered_by_a_sentence_with_a_way_on(
    open_page: OpenPage, home: str, javascript: bool
) -> None:
    page = open_page(javascript=javascript, expect={422})
    page.goto(f"{home}?open=mentor-hours&pin=shift-work.nights")
    page.get_by_label("Set mentor hours to").fill("lots")
    page.locator("#send-set-mentor-hours").click()
    expect(page.get_by_role("heading", level=1)).to_have_text("“lots” is no number that mentor hours could be.")
    assert "lots" in page.url
    page.get_by_role("link", name="Ask the rest of it").click()
    expect(answer(page)).to_contain_text("Among records with shift work = nights, mark is ")


@pytest.mark.parametrize("width", [320, 360, 1280])
def test_cards_of_numbers_stay_inside_the_page(open_page: OpenPage, home: str, width: int) -> None:
    page = open_page(width=width)
    page.goto(f"{home}?show=all&pin=travel-time.from.20.5.under.35.25&shift=mentor-hours.by.2&reach=mentor-hours.60")
    expect(answer(page)).to_contain_text("raising mentor hours by 2 for 60% of them")
    assert page.evaluate("document.documentElement.scrollWidth") <= width
    for strip in page.locator(".strip").all():
        box, card = strip.bounding_box(), strip.locator("xpath=ancestor::article").bounding_box()
        assert box is not None and card is not None
        assert box["height"] == 68 and box["x"] >= card["x"] - 1 and box["width"] <= card["width"] + 1
    small = [
        box
        for box in (control.bounding_box() for control in page.locator(".card a, .card button, .card input").all())
        if box is not None and box["height"] < 24
    ]
    assert len(small) <= page.locator(".told a").count()  # links inside a sentence are excepted


def test_means_are_told_to_those_who_do_not_see_the_marks(open_page: OpenPage, home: str) -> None:
    page = open_page()
    page.goto(f"{home}?pin=shift-work.nights&shift=mentor-hours.by.2")
    told = page.locator("#column-mark .mean").inner_text()
    assert re.sub(r"\s+", " ", told).startswith("mean")
    assert page.locator("#column-mark .strip").get_attribute("aria-hidden") == "true"
    assert re.search(r"as recorded .* among these .* if set", page.locator("#column-mark .mean").text_content() or "")
