"""Where cells are blank, and whether they are blank in some records more than in others."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.judging.tables import departure
from engine.records.column import SMALL_COUNT
from engine.records.table import Table


@dataclass(frozen=True)
class Blank:
    """A column with blanks.

    share: of the rows read.  blanks: how many.  taken: as what a blank counts, "level" or "drop row".
    by: (column, level) where blanks are most common, of the column that they differ by most beyond chance, or None;
    there, elsewhere: shares blank among the kept records at that level and at all others, nan without `by`.
    """

    column: str
    share: float
    blanks: int
    taken: str
    by: tuple[str, str] | None = None
    there: float = np.nan
    elsewhere: float = np.nan


def blanks(table: Table, names: Sequence[str]) -> tuple[Blank, ...]:
    """The columns `names` that have blanks, most first."""
    found = []
    for name in names:
        column = table.columns[name]
        if column.blanks:
            by = None
            if column.blank == "level" and column.blanks >= SMALL_COUNT:
                by = _by(table, names, name, column.codes == len(column.levels) - 1)
            share = column.blanks / len(table.frame)
            found.append(Blank(name, share, column.blanks, column.blank, *(by or ())))
    return tuple(sorted(found, key=lambda each: (-each.blanks, names.index(each.column))))


def _by(
    table: Table, names: Sequence[str], name: str, blank: NDArray[np.bool_]
) -> tuple[tuple[str, str], float, float] | None:
    """The level where blanks are most common, of the column on which they depend most surely, each tried counted."""
    best: tuple[float, str] | None = None
    for other in names:
        if other != name and len(table.columns[other].levels) > 1:
            seen = _joint(table, other, blank)
            chance = departure(seen, np.ones_like(seen))[2] * (len(names) - 1)
            if chance < 0.05 and (best is None or chance < best[0]):
                best = (chance, other)
    if best is None:
        return None
    column = table.columns[best[1]]
    joint = _joint(table, best[1], blank)
    rows = joint.sum(axis=1)
    telling = np.flatnonzero((joint[:, 1] >= SMALL_COUNT) & (rows - joint[:, 1] >= SMALL_COUNT))
    if not telling.size:
        return None
    at = int(telling[np.argmax(joint[telling, 1] / rows[telling])])
    rest = joint.sum(axis=0) - joint[at]
    if rest.sum() == 0 or joint[at, 1] / rows[at] <= rest[1] / rest.sum():
        return None
    return (column.name, column.levels[at]), float(joint[at, 1] / rows[at]), float(rest[1] / rest.sum())


def _joint(table: Table, other: str, blank: NDArray[np.bool_]) -> NDArray[np.float64]:
    """(levels, 2) records at each level of `other`, without and with a blank."""
    column = table.columns[other]
    at = column.codes.astype(np.int64) * 2 + blank
    return np.bincount(at, minlength=2 * len(column.levels)).reshape(-1, 2).astype(np.float64)
