"""A table of records, its columns, and what was done to the file to get there."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import pandas as pd

from engine.records.bands import level_positions
from engine.records.cells import cells as cells_of
from engine.records.column import SMALL_COUNT, Coded, Column, Kind
from engine.records.columns import Choice, check_names, column_of
from engine.refusal import Refusal

__all__ = ["SMALL_COUNT", "Coded", "Column", "Kind", "Table"]


@dataclass(frozen=True, eq=False)
class Table:
    """Records with every column's kind decided.

    frame: every row and column as read.  kept: (rows read,) True where no column made the row drop.
    columns: name -> Column, in file order.  dropped: column -> rows that are blank there and so were dropped.
    rows: rows kept.  weights: (rows,) float64.  warnings: sentences about the table as a whole.
    """

    name: str
    frame: pd.DataFrame
    columns: Mapping[str, Column]
    kept: np.ndarray
    dropped: Mapping[str, int]
    weights: np.ndarray
    warnings: tuple[str, ...] = ()

    @classmethod
    def from_frame(
        cls,
        frame: pd.DataFrame,
        kinds: Mapping[str, str] | None = None,
        bands: Mapping[str, Sequence[float]] | None = None,
        grades: Mapping[str, Sequence[str]] | None = None,
        blanks: Mapping[str, str] | None = None,
        name: str = "",
        warnings: Sequence[str] = (),
    ) -> Table:
        """Decide every column's kind: as given, else guessed from its cells.

        kinds: column -> "category", "grade", "number" or "left out".  bands: column -> inner cuts, ascending.
        grades: column -> levels, low to high.  blanks: column -> "level" or "drop row".
        Raises Refusal for a choice about an unknown column, one that its cells do not bear, and fewer than two
        rows or columns left.
        """
        kinds, bands, grades, blanks = kinds or {}, bands or {}, grades or {}, blanks or {}
        check_names(frame, {"kinds": kinds, "bands": bands, "grades": grades, "blanks": blanks})
        cells = {column: cells_of(column, frame[column]) for column in frame.columns}
        choices = {
            column: Choice(kinds.get(column), bands.get(column), grades.get(column), blanks.get(column))
            for column in frame.columns
        }
        whole = {column: column_of(column, cells[column], choices[column]) for column in frame.columns}
        kept = np.ones(len(frame), dtype=np.bool_)
        dropped = {}
        for column, made in whole.items():
            if made.blank == "drop row" and made.kind != "left out":
                blank = cells[column].blank
                dropped[column] = int(blank.sum())
                kept &= ~blank
        if not kept.all():
            if kept.sum() < 2:
                raise Refusal(
                    "Leaving out every row with a blank leaves fewer than two records.",
                    where=", ".join(dropped),
                    do="Let blanks be a level of their own in some columns.",
                )
            whole = {
                column: column_of(column, cells[column], choices[column], kept) if made.kind != "left out" else made
                for column, made in whole.items()
            }
        rows = int(kept.sum())
        return cls(name, frame, whole, kept, dropped, np.ones(rows), tuple(warnings))

    @property
    def rows(self) -> int:
        return int(self.weights.size)

    @cached_property
    def digest(self) -> str:
        """sha256, in hexadecimal, of the cells and of what each column is taken as."""
        taken = [
            [made.name, made.kind, list(made.levels), list(made.cuts), made.blank] for made in self.columns.values()
        ]
        found = hashlib.sha256(json.dumps(taken).encode())
        for name in self.columns:
            cells = cells_of(name, self.frame[name])
            found.update(json.dumps(cells.texts).encode())
            found.update(np.ascontiguousarray(cells.codes).tobytes())
        return found.hexdigest()

    def matches(self, column: str, wanted: object) -> np.ndarray:
        """(rows,) True where `column` is the level, in the set of levels, or in the (low, high) range wanted.

        A range on a number is low <= x < high, either end None for open. Raises Refusal for an unknown column or level.
        """
        made = self._used(column)
        if made.kind == "number" and made.values is not None and isinstance(wanted, tuple):
            low, high = (None if end is None else float(end) for end in wanted)
            inside = np.isfinite(made.values)
            with np.errstate(invalid="ignore"):
                if low is not None:
                    inside &= made.values >= low
                if high is not None:
                    inside &= made.values < high
            return np.asarray(inside)
        positions = level_positions(made.levels, made.kind, made.cuts, wanted)
        return np.isin(made.codes, list(positions))

    def coded(self, names: Sequence[str]) -> Coded:
        """Those columns as level positions. Raises Refusal for an unknown column and one that is left out."""
        made = [self._used(name) for name in names]
        codes = np.empty((self.rows, len(made)), dtype=np.int32, order="F")
        for place, column in enumerate(made):
            codes[:, place] = column.codes
        return Coded(
            names=tuple(names),
            kinds=tuple(column.kind for column in made),
            levels=tuple(column.levels for column in made),
            cuts=tuple(column.cuts for column in made),
            has_blank=tuple(column.has_blank for column in made),
            codes=codes,
            weights=self.weights,
        )

    def _used(self, name: str) -> Column:
        if name not in self.columns:
            raise Refusal(
                f"The records have no column “{name}”.", where=name, do=f"Its columns are {', '.join(self.columns)}."
            )
        if self.columns[name].kind == "left out":
            raise Refusal(f"The column “{name}” is left out.", where=name, do="Give it a kind first.")
        return self.columns[name]
