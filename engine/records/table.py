"""A table of records, its columns, and what was done to the file to get there."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

import numpy as np
import pandas as pd

Kind = Literal["category", "grade", "number", "left out"]
SMALL_COUNT = 10  # counts of records under this are shown as "under 10" only; common practice, no source


@dataclass(frozen=True)
class Column:
    """One column as it will be learned.

    name: as in the file.  kind: category, grade (ordered category), number, or left out.
    why: one sentence: why it is taken as this kind.
    levels: grades low to high, bands of a number in words, the blank level last; empty when left out.
    codes: (rows,) positions in `levels` for the kept rows, int32; empty when left out.
    cuts: inner cuts of a number's bands, ascending; band i holds cuts[i-1] <= x < cuts[i].
    values: (rows,) float64 for a number, nan where blank; None otherwise.
    blank: what a blank means, "level" or "drop row".  blanks: blank cells among the rows read.
    warnings: sentences for the Records page.
    """

    name: str
    kind: Kind
    why: str
    levels: tuple[str, ...] = ()
    codes: np.ndarray = np.empty(0, dtype=np.int32)
    cuts: tuple[float, ...] = ()
    values: np.ndarray | None = None
    blank: Literal["level", "drop row"] = "level"
    blanks: int = 0
    warnings: tuple[str, ...] = ()


@dataclass(frozen=True)
class Coded:
    """The columns that a model is learned from, as level positions: all that learning and counting need.

    codes: (rows, columns) int32, Fortran order.  weights: (rows,) float64.
    kinds, levels, cuts: one entry per column, as in `Column`.
    has_blank: whether the last level of the column is its blank.
    """

    names: tuple[str, ...]
    kinds: tuple[Kind, ...]
    levels: tuple[tuple[str, ...], ...]
    cuts: tuple[tuple[float, ...], ...]
    has_blank: tuple[bool, ...]
    codes: np.ndarray
    weights: np.ndarray


@dataclass(frozen=True)
class Table:
    """Records with every column's kind decided.

    frame: every row and column as read.  kept: (rows read,) True where no column made the row drop.
    columns: name -> Column, in file order.  dropped: column -> rows that its blanks dropped.
    rows: rows kept.  weights: (rows,) float64.  warnings: sentences about the table as a whole.
    """

    name: str
    frame: pd.DataFrame
    columns: Mapping[str, Column]
    kept: np.ndarray
    dropped: Mapping[str, int]
    weights: np.ndarray
    warnings: tuple[str, ...] = ()

    @property
    def rows(self) -> int:
        return int(self.kept.sum())
