"""How an answer was computed, in words."""

from __future__ import annotations

from app.wording.figures import share
from engine.answering.answer import Answer

COVERAGE = 0.90


def method(answer: Answer) -> str:
    """Exactly, by ..., in 14 ms."""
    how = answer.method.removeprefix("exact")
    exactly = "Exactly" if answer.method.startswith("exact") else "By sampling"
    return f"{exactly}{how}, in {milliseconds(answer.milliseconds)}."


def milliseconds(time: float) -> str:
    return "under 1 ms" if time < 1 else f"{time:,.0f} ms"


def size(links: int, accepted: bool) -> str:
    """31 links, the recommended size"""
    whose = "the size you accepted" if accepted else "the recommended size"
    return f"{links:,} {'link' if links == 1 else 'links'}, {whose}"


def intervals(draws: int) -> str:
    """What the intervals hold and what they leave out."""
    return (
        f"intervals hold {share(COVERAGE)} of {draws:,} plausible versions of this model’s figures; "
        "they leave out the doubt about its links"
    )
