"""What the pages say: the Shelf's next step, the learning steps, why a size is recommended."""

from __future__ import annotations

from dataclasses import replace
from datetime import UTC, datetime, timedelta

import pytest

from app.pages import learning_view, order_view, shelf_view
from app.store import Asked, Choices, Plan, Study
from app.store.progress import JobState

START = datetime(2026, 3, 1, 12, tzinfo=UTC)
NEW = Study(
    key="harbour",
    name="Harbour clinic",
    created=START,
    source="visits.csv",
    sample=None,
    rows=9310,
    columns=17,
    digest="0",
    choices=Choices(),
    plan=Plan(stages=(("Everything", ("a", "b")),)),
    warnings=(),
    mended=(),
    links=None,
    recommended=None,
    max_parents=3,
    model="none",
    asked=0,
    last=None,
)
ORDERED = replace(NEW, plan=Plan(stages=(("Early", ("a",)), ("Late", ("b",))), outcomes={"b": ("yes",)}))
ASKED = Asked("pin=a.yes", "Among records ...", ("know", "weakens", "weakens"), START)


@pytest.mark.parametrize(
    ("study", "step"),
    [
        (NEW, ("Put them in order", "/study/harbour/order", False)),
        (ORDERED, ("Learn the model", "/study/harbour/learn", True)),
        (replace(ORDERED, model="current"), ("Ask", "/study/harbour/ask", False)),
        (replace(ORDERED, model="current", last=ASKED), ("Go on asking", "/study/harbour/ask?pin=a.yes", False)),
        (replace(ORDERED, model="old", last=ASKED), ("Learn again", "/study/harbour/learn", True)),
    ],
    ids=["new", "in order", "learned", "asked", "old"],
)
def test_a_study_offers_its_next_step(study: Study, step: tuple[str, str, bool]) -> None:
    assert shelf_view.entry(study, None).next_step == step


def test_a_study_that_is_learning_offers_to_look_at_it() -> None:
    running = JobState("running", 0.3, "Counting", (), START)
    assert shelf_view.entry(ORDERED, running).next_step == ("See it learning", "/study/harbour/model", False)


def test_cautions_are_counted_by_rank_the_gravest_first() -> None:
    assert shelf_view.entry(replace(NEW, last=ASKED), None).cautions == "2 cautions weaken it and 1 is worth knowing."
    blocked = replace(ASKED, cautions=("blocks",))
    assert shelf_view.entry(replace(NEW, last=blocked), None).cautions == "1 caution blocks it."


def test_the_shelf_counts_in_words() -> None:
    assert shelf_view.headline(1) == ("One", "study on this machine.")
    assert shelf_view.headline(3) == ("Three", "studies on this machine.")
    assert shelf_view.headline(0)[0] == "No"


def test_learning_is_told_as_done_now_and_to_come() -> None:
    state = JobState("running", 0.25, "Counting how often levels occur together", ("Opening the records",), START)
    view = learning_view.view(state, START + timedelta(seconds=10))
    assert [step.state for step in view.steps] == ["done", "done", "now", *["to come"] * 5]
    assert view.left == "30 seconds"
    assert view.words.startswith("counting")


def test_words_that_are_not_known_are_told_as_they_are() -> None:
    state = JobState("running", 0.5, "Sampling models", ("Opening the records",), START)
    assert [(step.state, step.name) for step in learning_view.view(state, START).steps] == [
        ("done", "Opening the records"),
        ("now", "Sampling models"),
    ]


def test_no_time_is_promised_at_the_very_start() -> None:
    assert learning_view.view(JobState("running", 0.0, "Starting", (), START), START).left is None


@pytest.mark.parametrize("state", ["cancelled", "failed", "died"])
def test_an_end_without_a_model_says_what_is_and_what_to_do(state: str) -> None:
    said = learning_view.ended(JobState(state, 0.5, "Counting", (), START))  # type: ignore[arg-type]
    assert said is not None
    assert all(sentence.endswith(".") for sentence in said)


def test_an_order_is_only_offered_for_learning_once_it_is_one() -> None:
    assert order_view.next_step(NEW) == "order"
    assert order_view.next_step(ORDERED) == "learn"
