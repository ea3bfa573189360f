"""What the Model page says of links."""

from __future__ import annotations

from collections.abc import Sequence

from app.wording.amounts import count, listing, plural, small_word
from app.wording.figures import share
from app.wording.units import apart
from engine.records.wording import figure

SETTLED = {
    "your order": "your order",
    "the data": "the data, if nothing unrecorded",
    "nobody": "nobody",
}


def wide_stages(stages: Sequence[str], widest: int, drawn: int, effective: float) -> str:
    """What to know of support where stages hold more columns than can be summed graph by graph.

    stages: their names.  widest: the most columns that can.  drawn, effective: models drawn and what they are worth.
    """
    which = f"the {plural(len(stages), 'stage')} {listing(stages)}"
    said = f"In {which}, of more than {small_word(widest)} columns, support is summed over orders of the columns."
    said += " That favours models that fit many orders, and may move a support by up to 20 points."
    if drawn:
        said += f" The {count(drawn)} models drawn are corrected for it and are worth {count(int(effective))}."
    return said


def doubted(links: int) -> str:
    """What to know of the links of a model that have support under half: they predict, but may not be there."""
    if links == 1:
        return "1 of these links has support under 50%: it helps to predict, but most plausible models do without it."
    return (
        f"{count(links)} of these links have support under 50%: they help to predict, but most plausible models do "
        "without them."
    )


def support(likely: float) -> str:
    """A posterior probability in per cent; what records say is never quite sure."""
    return share(min(max(likely, 1e-6), 1 - 1e-6))


def strength(moved: float, of_a_number: bool = False, unit: str = "") -> str:
    """How far a link moves its child: a share, 0 to 1, in points; the mean of a number in its own unit."""
    if of_a_number:
        return f"{apart(figure(float(f'{moved:.2g}')), unit)} on average"
    if 0 < moved < 0.005:
        return "under 1 point"
    rounded = round(100 * moved)
    return "1 point" if rounded == 1 else f"{rounded} points"
