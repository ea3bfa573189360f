"""A column of records, and the columns together as level positions."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from typing import Literal

import numpy as np

Kind = Literal["category", "grade", "number", "left out", "weight", "group"]
BLANK = "blank"  # the name of the level that stands for a blank; longer when a real level is called so
SMALL_COUNT = 10  # counts of records under this are shown as "under 10" only; common practice, no source


@dataclass(frozen=True)
class Column:
    """One column as it will be learned.

    name: as in the file.  kind: category, grade (ordered category) or number; left out; weight (what each record
    counts for) or group (which records belong together), neither of which is learned from.
    why: why it is taken as this kind, in a sentence or two.
    levels: grades low to high, bands of a number in words, the blank level last; empty when not learned from.
    codes: (rows,) positions in `levels` for the kept rows, int32; of a group, which one each row is in, from 0; else
    empty when not learned from.
    cuts: inner cuts of a number's bands, ascending; band i holds cuts[i-1] <= x < cuts[i].
    values: (rows,) float64 for a number, nan where blank, and for a weight, over 0; None otherwise.
    blank: what a blank means, "level" (in a group: a case by itself) or "drop row".
    blanks: blank cells among the rows read.
    warnings: sentences for the Records page.
    unit: what a number is measured in, "" where none is stated; nothing that is learned depends on it.
    """

    name: str
    kind: Kind
    why: str
    levels: tuple[str, ...] = ()
    codes: np.ndarray = field(default_factory=lambda: np.empty(0, dtype=np.int32))
    cuts: tuple[float, ...] = ()
    values: np.ndarray | None = None
    blank: Literal["level", "drop row"] = "level"
    blanks: int = 0
    warnings: tuple[str, ...] = ()
    unit: str = ""

    @property
    def used(self) -> bool:
        """Whether a model can be learned from it and it can stand in the order."""
        return self.kind in ("category", "grade", "number")

    @property
    def has_blank(self) -> bool:
        """Whether the last level stands for a blank; where every blank fell in a dropped row, no record holds it."""
        return bool(self.levels) and self.blanks > 0 and self.blank == "level"


@dataclass(frozen=True)
class Coded:
    """The columns that a model is learned from, as level positions: all that learning and counting need.

    codes: (rows, columns) int32, Fortran order.  weights: (rows,) float64, what each record counts for in learning.
    kinds, levels, cuts: one entry per column, as in `Column`.
    has_blank: whether the last level of the column is its blank.
    numbers: positions of the columns learned as numbers, ascending; the codes of these are their bands.
    values: (rows, numbers) float64 in their own units, finite.
    group: (rows,) int32, which rows belong together; None when each record is a case by itself.
    units: one entry per column, as in `Column`.
    """

    names: tuple[str, ...]
    kinds: tuple[Kind, ...]
    levels: tuple[tuple[str, ...], ...]
    cuts: tuple[tuple[float, ...], ...]
    has_blank: tuple[bool, ...]
    codes: np.ndarray
    weights: np.ndarray
    numbers: tuple[int, ...] = ()
    values: np.ndarray = field(default_factory=lambda: np.empty((0, 0)))
    group: np.ndarray | None = None
    units: tuple[str, ...] = ()

    def __post_init__(self) -> None:
        if not self.units:
            object.__setattr__(self, "units", ("",) * len(self.names))

    def in_units(self, units: Mapping[str, str]) -> Coded:
        """The same numbers with these units and no others; this object where nothing changes."""
        kinds = zip(self.names, self.kinds, strict=True)
        wanted = tuple(units.get(name, "") if kind == "number" else "" for name, kind in kinds)
        return self if wanted == self.units else replace(self, units=wanted)
