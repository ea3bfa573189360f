"""How an answer was computed, in words."""

from __future__ import annotations

import math

from app.wording.figures import share
from engine.answering.answer import Answer
from engine.answering.weighed import FEWEST

COVERAGE = 0.90
SPARE = 0.95  # of the sampled models: fewer independent ones than this share are told


def method(answer: Answer) -> str:
    """Exactly, by ..., in 14 ms. Sampled, by ..., in 210 ms."""
    if answer.method.startswith("exact"):
        how = f"Exactly{answer.method.removeprefix('exact')}"
    else:
        how = answer.method[:1].upper() + answer.method[1:]
    return f"{how}, in {milliseconds(answer.milliseconds)}.{sampling(answer)}"


def sampling(answer: Answer) -> str:
    """How far sampling may be off; empty for an answer summed exactly."""
    if math.isinf(answer.effective):
        return ""
    if not math.isfinite(answer.mc_error) or answer.effective < FEWEST:
        return " How far sampling is off cannot be told."
    return (
        f" Sampling has a standard error of at most {100 * answer.mc_error:.1f} points in a share, and of as many "
        "hundredths of its own spread in a mean."
    )


def milliseconds(time: float) -> str:
    return "under 1 ms" if time < 1 else f"{time:,.0f} ms"


def size(links: int, accepted: bool) -> str:
    """31 links, the recommended size"""
    whose = "the size you accepted" if accepted else "the recommended size"
    return f"{links:,} {'link' if links == 1 else 'links'}, {whose}"


def intervals(answer: Answer, draws: int, each: int) -> str:
    """What the intervals hold and what they leave out.  draws: within one model.  each: in each of sampled models."""
    doubt = answer.doubt
    if doubt is not None and answer.doubted:
        others = f", {doubt.different:,} of them different" if doubt.different < doubt.graphs else ""
        if doubt.different == 1 < doubt.graphs:
            others = ", all alike"
        if doubt.effective < SPARE * doubt.graphs:
            others += f", worth {doubt.effective:,.0f} independent ones"
        return (
            f"intervals over {doubt.graphs:,} sampled {'model' if doubt.graphs == 1 else 'models'}{others}, with "
            f"{each:,} draws each, the short whisker within this model"
        )
    return (
        f"intervals hold {share(COVERAGE)} of {draws:,} plausible versions of this model’s figures; "
        "they leave out the doubt about its links"
    )
