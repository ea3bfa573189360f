"""Names that would be markup, script or SQL elsewhere are names on every page, and run nothing."""

from __future__ import annotations

import re
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from playwright.sync_api import Page, expect

from tests.browser.test_pages import bring

pytestmark = pytest.mark.browser
SCRIPT, IMAGE, TITLE, QUERY = "<script>alert(1)</script>", '"><img src=x onerror=alert(2)>', "</title>", "select"


def hostile(path: Path) -> Path:
    """300 records of columns and levels with hostile names."""
    rng = np.random.default_rng(5)
    group = rng.choice([SCRIPT, IMAGE], 300)
    end = np.where(rng.random(300) < np.where(group == SCRIPT, 0.7, 0.3), "</script>", "=1+1")
    pd.DataFrame({"<b>": group, QUERY: rng.choice(["drop table", "--"], 300), TITLE: end}).to_csv(path, index=False)
    return path


@pytest.mark.parametrize("javascript", [True, False], ids=["with a script", "without a script"])
def test_hostile_names_are_only_names(open_page: Callable[..., Page], tmp_path: Path, javascript: bool) -> None:
    page = open_page(javascript=javascript)
    opened: list[str] = []
    page.on("dialog", lambda dialog: (opened.append(dialog.message), dialog.dismiss()))
    bring(page, hostile(tmp_path / "a';drop table studies;--.csv"), "<i>Visits</i>")
    study = page.url.removesuffix("/records")
    expect(page.locator("main")).to_contain_text(SCRIPT)
    page.goto(f"{study}/order")
    page.locator("#text").fill(f"<u>Start</u>: <b>\nMid: {QUERY}\nEnd: {TITLE}")
    page.get_by_role("button", name="Use this order").click()
    expect(page.locator("section.lane")).to_have_count(3)
    page.get_by_role("button", name="Learn a model of this order").click()
    expect(page.get_by_role("heading", level=1)).to_contain_text("unseen records", timeout=60_000)
    if javascript:
        page.get_by_text("Explore this curve").click()
        expect(page.locator("#explore .main-svg").first).to_be_visible()
    page.goto(f"{study}/ask?show=all")
    page.get_by_role("link", name=f"Pin {SCRIPT}", exact=True).click()
    expect(page.locator("#answer")).to_contain_text(f"Among records with <b> = {SCRIPT}, {TITLE} is")
    page.get_by_role("link", name="Print this answer").click()
    expect(page.get_by_role("heading", level=1)).to_contain_text(SCRIPT)
    expect(page).to_have_title(re.compile("<i>Visits</i>"))
    page.goto("")
    expect(page.locator("main")).to_contain_text(SCRIPT)
    assert opened == []
