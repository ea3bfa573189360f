"""The doubt over sampled models comes to Ask by itself, moves nothing, and never answers an earlier question."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING

import pytest
from playwright.sync_api import Page, Route, expect

from app.store import Choices
from tests.app.evening import PLAN, evening, keep_a_model

if TYPE_CHECKING:
    from tests.conftest import Live

pytestmark = pytest.mark.browser
WITHIN, OVER = "within this model", "90% interval"


@pytest.fixture
def home(live: Live) -> str:
    store = live.app.state.store
    study = keep_a_model(store, store.bring("Evening", evening(200), "evening.csv", Choices(), PLAN))
    return f"/study/{study.key}/ask"


def held_back(page: Page) -> list[Route]:
    """Requests for the doubt wait here until a test lets them go."""
    waiting: list[Route] = []
    page.route("**/ask/doubt?*", lambda route: waiting.append(route))
    return waiting


def test_the_first_answer_is_within_the_model_and_the_doubt_takes_its_place(
    open_page: Callable[..., Page], home: str
) -> None:
    page = open_page(height=700)
    page.goto(f"{home}?pin=shift-work.nights")
    waiting = held_back(page)
    page.locator("#set-mentor-yes").scroll_into_view_if_needed()
    page.click("#set-mentor-yes")
    expect(page.locator("#answer")).to_contain_text(WITHIN)
    page.wait_for_selector(".doubt", state="attached")
    top = page.evaluate("document.activeElement.getBoundingClientRect().top")
    address = page.url
    waiting.pop().continue_()
    expect(page.locator("#answer")).to_contain_text(OVER)
    expect(page.locator("#status")).to_contain_text(OVER)
    assert page.evaluate("document.activeElement.id") == "set-mentor-yes"
    assert abs(page.evaluate("document.activeElement.getBoundingClientRect().top") - top) <= 2
    assert page.url == address and page.locator(".doubt").count() == 0
    assert page.locator("svg.beam line[stroke-width='1']").count() > 0


def test_the_doubt_of_an_earlier_question_never_arrives(open_page: Callable[..., Page], home: str) -> None:
    page = open_page()
    page.goto(home)
    waiting = held_back(page)
    page.click("#set-mentor-yes")
    expect(page.locator("#answer")).to_contain_text("setting mentor to yes")
    page.wait_for_selector(".doubt", state="attached")
    page.click("#set-mentor-no")
    expect(page.locator("#answer")).to_contain_text("setting mentor to no")
    expect(page.locator("#answer")).to_contain_text(WITHIN)
    page.wait_for_timeout(100)
    earlier, later = waiting
    assert "mentor.no" in later.request.url
    earlier.abort()
    later.continue_()
    expect(page.locator("#answer")).to_contain_text(OVER)
    expect(page.locator("#answer")).to_contain_text("setting mentor to no")
    assert page.locator("#gone").is_hidden()


def test_without_scripts_the_page_waits_for_the_doubt(open_page: Callable[..., Page], home: str) -> None:
    page = open_page(javascript=False)
    page.goto(home)
    page.click("#set-mentor-yes")
    expect(page.locator("#answer")).to_contain_text(OVER)
    assert page.locator(".doubt").count() == 0
