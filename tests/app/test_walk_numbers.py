"""A file with numbers, by plain requests alone: brought, marked, put in order, learned, read and asked."""

from __future__ import annotations

import html
import re
import time

import numpy as np
import pytest
from fastapi.testclient import TestClient

from tests.app.mixed_evening import mixed_evening
from tests.app.test_ask import sentence
from tests.app.test_pages_model import words

ORDER = "Before: shift work, travel time, fee\nOffered: mentor\nDuring: mentor hours\nAfter: mark\nLater: passed"


def fields_of(page: str, column: str) -> dict[str, str]:
    """The fields of a card's form on Records as they stand, without what is not ticked."""
    found = next(part for part in re.findall(r"<form.*?</form>", page, re.DOTALL) if f'aria-label="{column}"' in part)
    fields = dict(re.findall(r'<input (?:type="hidden"|class="field"[^>]*) name="([^"]*)" value="([^"]*)"', found))
    for name, options in re.findall(r'<select[^>]* name="([^"]*)"[^>]*>(.*?)</select>', found, re.DOTALL):
        chosen = re.search(r"<option(?: value=\"([^\"]*)\")? selected>([^<]*)", options)
        fields[name] = "" if chosen is None else chosen[1] or chosen[2]
    kind = re.search(r'<select name="kind">.*?<option selected>([^<]*)', found, re.DOTALL)
    assert kind is not None
    return {name: html.unescape(value) for name, value in (fields | {"kind": kind[1]}).items()}


@pytest.fixture(scope="module")
def client(tmp_path_factory: pytest.TempPathFactory):
    from app.main import create_app
    from app.settings import Settings

    settings = Settings(data=tmp_path_factory.mktemp("walk"))
    with TestClient(
        create_app(settings), base_url=settings.address, headers={"Sec-Fetch-Site": "same-origin"}
    ) as client:
        yield client


def test_every_step_works_by_plain_requests(client: TestClient) -> None:
    rng = np.random.default_rng(9)
    frame = mixed_evening()
    fee = np.where(rng.random(len(frame)) < 0.5, 0.0, rng.normal(80.0, 9.0, len(frame)).round(1))
    frame = frame.assign(fee=fee, counts=rng.choice([1.0, 1.5, 2.0], len(frame)))
    content = frame.to_csv(index=False).encode()
    page = client.post("/bring", data={"name": "Learners"}, files={"file": ("learners.csv", content, "text/csv")})
    assert page.url.path == "/study/learners/records"
    home = "/study/learners"
    for column, changed in (
        ("counts", {"kind": "weight"}),
        ("mentor hours", {"changeable": "true"}),
        ("mark", {"direction": "more"}),
    ):
        there = client.get(f"{home}/records").text
        answer = client.post(f"{home}/records", data=fields_of(there, column) | changed)
        assert answer.status_code == 200, words(answer.text)
    assert "how much each record counts; not learned from" in words(answer.text)
    assert "outcome, more is better" in words(answer.text)

    page = client.post(f"{home}/order", data={"do": "type", "text": ORDER})
    assert "this order allows" in words(page.text)
    page = client.post(f"{home}/learn")
    for _ in range(600):
        if "Learning the model" not in page.text:
            break
        assert '<meta http-equiv="refresh"' in page.text
        time.sleep(0.05)
        page = client.get(f"{home}/model")
    told = words(page.text)
    assert "unseen records" in told and "“fee” is taken as bands" in told
    assert "By their weights the 500 records are worth" in told
    program = client.get(html.unescape(re.search(r'href="([^"]*model\.py[^"]*)"', page.text)[1]))
    space: dict[str, object] = {"__name__": "a_program"}
    exec(compile(program.text, "program.py", "exec"), space)
    drawn = space["sample"](4_000, 1)  # type: ignore[operator]
    assert drawn["mark"].mean() == pytest.approx(np.average(frame["mark"], weights=frame["counts"]), abs=1.0)

    assert re.match(r"Across all 500 records mark is [\d.]+ on average", sentence(client.get(f"{home}/ask").text))
    page = client.get(f"{home}/ask", params={"open": "travel-time"})
    ring = re.search(r'<a id="pin-travel-time-under[^"]*" href="([^"]*)"', page.text)
    assert ring is not None
    page = client.get(html.unescape(ring[1]))
    assert re.match(r"Among records with travel time under [\d.]+, mark is [\d.]+ on average", sentence(page.text))
    asked = dict(part.split("=") for part in page.url.query.decode().split("&"))
    page = client.get(f"{home}/ask", params=asked | {"set.mentor-hours": "11.5", "reach.mentor-hours": "100"})
    assert "set=mentor-hours.to.11.5" in page.url.query.decode()
    assert re.search(r"setting mentor hours to 11\.5 would move mark from [\d.]+ to [\d.]+ on", sentence(page.text))
    for place in ("records", "order", "model", "ask", "answer"):
        page = client.get(f"{home}/{place}")
        assert page.status_code == 200 and " style=" not in page.text and "<script>" not in page.text
