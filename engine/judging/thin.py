"""Where the records are thin: levels, and levels of changeable columns among others, that few records have."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from engine.order import Order
from engine.records.column import SMALL_COUNT, Coded

FEW = 30  # records: below this a share counted directly is uncertain by about 15 points or more
MOST = 12


@dataclass(frozen=True)
class Thin:
    """Few records have these levels together.  places: (column, level), the changeable column first of two."""

    places: tuple[tuple[str, str], ...]
    records: int


def thin(coded: Coded, order: Order) -> tuple[Thin, ...]:
    """Levels under the small-count limit, and levels of a changeable column that fewer than FEW records have at a
    level of a column that may come before it. Fewest records first, at most MOST; levels that are rare by themselves
    are not told again in company."""
    alone, together = [], []
    counts = [np.bincount(coded.codes[:, at], minlength=len(levels)) for at, levels in enumerate(coded.levels)]
    for at, name in enumerate(coded.names):
        for level in np.flatnonzero(counts[at] < SMALL_COUNT):
            alone.append(Thin(((name, coded.levels[at][level]),), int(counts[at][level])))
    for lever in order.changeable:
        own = coded.names.index(lever)
        for at, name in enumerate(coded.names):
            if at == own or not order.may_lead(name, lever):
                continue
            joint = np.zeros((len(coded.levels[own]), len(coded.levels[at])), dtype=np.int64)
            np.add.at(joint, (coded.codes[:, own], coded.codes[:, at]), 1)
            common = (counts[own] >= FEW)[:, None] & (counts[at] >= FEW)
            for mine, theirs in zip(*np.nonzero(common & (joint < FEW)), strict=True):
                places = ((lever, coded.levels[own][mine]), (name, coded.levels[at][theirs]))
                together.append(Thin(places, int(joint[mine, theirs])))
    return tuple(sorted([*together, *alone], key=lambda each: (each.records, -len(each.places)))[:MOST])
