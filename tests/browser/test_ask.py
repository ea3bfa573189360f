"""Ask in a browser: nothing moves but what changed, and everything works without scripts too."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING

import pytest
from playwright.sync_api import Browser, Page, expect

from app.store import Choices, Study
from tests.app.evening import PLAN, evening, keep_a_model

if TYPE_CHECKING:
    from tests.conftest import Live

pytestmark = pytest.mark.browser
CLICKS = ("#set-mentor-yes", "#card-shift-work", "#pin-shift-work-nights", "#also-shift-work-mixed")
ASKED = "pin=shift-work.mixed.nights&set=mentor.yes&open=shift-work"


@pytest.fixture
def study(live: Live) -> Study:
    store = live.app.state.store
    return keep_a_model(store, store.bring("Evening", evening(), "evening.csv", Choices(), PLAN))


@pytest.fixture
def home(study: Study) -> str:
    return f"/study/{study.key}/ask"


def click(page: Page, selector: str) -> None:
    """Click, and wait until the answer has been put in place, with the doubt that follows it."""
    page.evaluate(
        "() => { const root = document.documentElement; delete root.dataset.swapped;"
        " document.addEventListener('htmx:after:swap', () => { root.dataset.swapped = 'yes' }, { once: true }) }"
    )
    page.click(selector)
    page.wait_for_selector("html[data-swapped]")
    expect(page.locator(".doubt")).to_have_count(0)


def top(page: Page, selector: str) -> float:
    found: float = page.locator(selector).evaluate("node => node.getBoundingClientRect().top")
    return found


def focused(page: Page) -> str:
    found: str = page.evaluate("document.activeElement.id")
    return found


def sentence(page: Page) -> str:
    return " ".join(page.inner_text("#answer").split())


def test_a_click_changes_the_answer_and_nothing_else(open_page: Callable[..., Page], home: str) -> None:
    page = open_page()
    page.goto(f"{home}?open=shift-work.tutor")
    page.evaluate("window.loaded = 'once'")
    for selector in ("#set-mentor-yes", "#pin-shift-work-nights"):
        page.locator(selector).scroll_into_view_if_needed()
        before = top(page, selector)
        click(page, selector)
        assert abs(top(page, selector) - before) <= 2
        assert f"#{focused(page)}" == selector
    assert page.evaluate("window.loaded") == "once"
    assert page.url.endswith("?pin=shift-work.nights&set=mentor.yes&open=shift-work.tutor")
    assert sentence(page).startswith("By this estimate, among records with shift work = nights, setting mentor to yes")
    assert page.text_content("#status").strip() == sentence(page)
    assert page.title().startswith("What would passed be among records with shift work = nights")


def test_a_control_keeps_its_place_where_the_page_becomes_shorter(open_page: Callable[..., Page], home: str) -> None:
    page = open_page(height=700)
    page.goto(f"{home}?pin=shift-work.nights&set=mentor.yes&open=tutor")
    page.evaluate("scrollTo(0, document.body.scrollHeight)")
    before = top(page, "#pin-passed-yes")
    click(page, "#pin-shift-work-nights")
    click(page, "#set-mentor-yes")
    assert "mentor" not in page.url
    page.evaluate("scrollTo(0, document.body.scrollHeight)")
    before = top(page, "#pin-passed-yes")
    click(page, "#pin-passed-yes")
    assert abs(top(page, "#pin-passed-yes") - before) <= 2


def test_focus_goes_where_the_act_went_when_its_control_is_gone(open_page: Callable[..., Page], home: str) -> None:
    page = open_page()
    page.goto(f"{home}?pin=shift-work.nights")
    click(page, "#also-shift-work-mixed")
    assert focused(page) == "pin-shift-work-mixed"
    click(page, ".out")
    assert focused(page) == "answer"
    click(page, "#card-age")
    assert focused(page) == "card-age"


def test_back_and_forward_lead_through_the_questions(open_page: Callable[..., Page], home: str) -> None:
    page = open_page()
    page.goto(home)
    first = sentence(page)
    click(page, "#set-mentor-yes")
    expect(page.locator("#answer")).to_contain_text("90% interval")
    second = sentence(page)
    assert second != first
    page.go_back()
    expect(page.locator("#answer")).to_have_text(first)
    page.go_forward()
    expect(page.locator("#answer")).to_have_text(second)
    page.reload()
    assert sentence(page) == second


def test_two_tabs_do_not_disturb_each_other(open_page: Callable[..., Page], home: str) -> None:
    one, other = open_page(), open_page()
    one.goto(home)
    other.goto(f"{home}?pin=shift-work.days")
    click(one, "#set-mentor-yes")
    click(other, "#pin-shift-work-days")
    assert "set=mentor.yes" in one.url and "set" not in other.url
    assert "setting mentor" in sentence(one) and sentence(other).startswith("Across all")


def test_the_same_clicks_lead_to_the_same_answer_without_scripts(open_page: Callable[..., Page], home: str) -> None:
    with_scripts, without = open_page(), open_page(javascript=False)
    with_scripts.goto(home)
    without.goto(home)
    for selector in CLICKS:
        click(with_scripts, selector)
        without.click(selector)
    assert without.url == with_scripts.url and without.url.endswith(ASKED)
    assert sentence(without) == sentence(with_scripts)
    without.fill("#share-mentor", "50")
    without.click("#send-mentor")
    assert "setting mentor to yes for 50% of them" in sentence(without)
    without.fill("#find", "tutor")
    without.click("#finder")
    assert without.locator(".fold").count() == 1


def test_typing_finds_a_column_and_keeps_the_cursor(open_page: Callable[..., Page], home: str) -> None:
    page = open_page()
    page.goto(home)
    page.locator("#find").press_sequentially("tutor", delay=20)
    expect(page.locator(".fold")).to_have_count(1)
    assert focused(page) == "find" and page.input_value("#find") == "tutor"


def test_a_question_that_cannot_be_asked_is_told_in_place(open_page: Callable[..., Page], home: str) -> None:
    page = open_page(expect={422})
    page.goto(f"{home}?set=mentor.yes&open=turned-up")
    click(page, "#pin-turned-up-most")
    assert sentence(page).endswith("which you set, so pinning it would mix two worlds.")
    click(page, "a.btn:has-text('Do not set mentor')")
    assert sentence(page).startswith("Among records with turned up = most")


def test_silence_of_the_program_is_said(live: Live, chromium: Browser, home: str) -> None:
    page = chromium.new_page(base_url=live.address)
    page.goto(home)
    page.context.set_offline(True)
    page.click("#set-mentor-yes")
    expect(page.locator("#gone")).to_be_visible()
    assert "not answering" in page.inner_text("#gone")
    page.context.set_offline(False)
    click(page, "#set-mentor-yes")
    expect(page.locator("#gone")).to_be_hidden()
    page.close()


@pytest.mark.parametrize("width", [1280, 360, 320])
def test_no_page_is_wider_than_the_window(open_page: Callable[..., Page], home: str, width: int) -> None:
    page = open_page(width=width)
    for address in (home, f"{home}?{ASKED}", f"{home}?show=all", f"{home}?{ASKED}".replace("/ask", "/answer")):
        page.goto(address)
        assert page.evaluate("document.documentElement.scrollWidth") <= width
