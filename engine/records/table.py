"""A table of records, its columns, and what was done to the file to get there."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Callable, Collection, Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from engine.records.bands import is_range, level_positions, range_ends
from engine.records.cells import Cells, cells
from engine.records.column import SMALL_COUNT, Coded, Column, Kind
from engine.records.columns import Choice, column_of, take
from engine.records.design_effect import DesignEffect
from engine.records.standing import standing
from engine.records.wording import listing, people
from engine.refusal import Refusal, quoted

__all__ = ["SMALL_COUNT", "Coded", "Column", "Kind", "Table"]


@dataclass(frozen=True, eq=False)
class Table:
    """Records with every column's kind decided.

    frame: every row and column as read.  kept: (rows read,) True where no column made the row drop.
    columns: name -> Column, in file order.  dropped: column -> rows that are blank there and so were dropped.
    rows: rows kept.  warnings: sentences about the table as a whole.
    weights: (rows,) float64, what each record counts for as if none belonged together: they sum to Kish's effective
    number of records, and are 1 without a weight.  group: (rows,) int32 from 0, which rows belong together, or None.
    effect: what groups do to that number, by the columns learned together; None without.
    """

    name: str
    frame: pd.DataFrame
    columns: Mapping[str, Column]
    kept: NDArray[np.bool_]
    dropped: Mapping[str, int]
    weights: NDArray[np.float64]
    warnings: tuple[str, ...] = ()
    group: NDArray[np.int32] | None = None
    effect: DesignEffect | None = None

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
        units: Mapping[str, str] | None = None,
    ) -> Table:
        """Decide every column's kind: as given, else guessed from its cells.

        kinds: column -> "category", "grade", "number" or "left out"; of one column each "weight", what every record
        counts for, and "group", which records belong together.  bands: column -> inner cuts, ascending.
        grades: column -> levels, low to high.  blanks: column -> "level" or "drop row".
        units: number -> what it is measured in, a short text; the digest does not change with it.
        Raises Refusal for a choice about an unknown column, one that its cells do not bear, a second weight or group,
        and fewer than two rows or columns left.
        """
        kinds, bands, grades, blanks, units = kinds or {}, bands or {}, grades or {}, blanks or {}, units or {}
        _check(frame, {"kinds": kinds, "bands": bands, "grades": grades, "blanks": blanks, "units": units})
        taken = {}
        for column in frame.columns:
            own = (kinds.get(column), bands.get(column), grades.get(column), blanks.get(column), units.get(column))
            taken[column] = take(column, cells(column, frame[column]), Choice(*own))
        kept = np.ones(len(frame), dtype=np.bool_)
        dropped = {}
        for column, each in taken.items():
            if each.drops:
                dropped[column] = each.cells.blanks
                kept &= ~each.cells.blank
        rows = int(kept.sum())
        if rows < 2:
            raise Refusal(
                "Leaving out every row with a blank leaves fewer than two records.",
                where=", ".join(dropped),
                do="Let blanks be a level of their own in some columns.",
            )
        columns = {column: column_of(each, kept) for column, each in taken.items()}
        counting = standing(columns, rows)
        said = (*warnings, *_rows_left_out(kept, dropped), *counting.said)
        weights, group, effect = counting.weights, counting.group, counting.effect
        return cls(name, frame.copy(deep=False), columns, kept, dropped, weights, said, group=group, effect=effect)

    @property
    def rows(self) -> int:
        return int(self.weights.size)

    @cached_property
    def digest(self) -> str:
        """sha256, in hexadecimal, of the cells and of what each column is taken as."""
        found = hashlib.sha256(self.kept.tobytes())
        for column in self.columns.values():
            taken = [column.name, column.kind, column.levels, column.cuts, column.blank, column.blanks]
            found.update(json.dumps(taken).encode())
            if column.kind in ("left out", "group"):
                _add_cells(found, cells(column.name, self.frame[column.name]))
            else:
                found.update(np.asarray(column.codes, dtype="<i4").tobytes())
                if column.values is not None:
                    found.update(_one_nan(column.values).tobytes())
        return found.hexdigest()

    def matches(self, column: str, wanted: object) -> NDArray[np.bool_]:
        """(rows,) True where `column` is the level, in the set of levels, or in the (low, high) range wanted.

        A range on a number is low <= x < high, either end None for open. Raises Refusal for an unknown column or level.
        """
        made = self._used(column)
        if is_range(made.kind, wanted):
            assert made.values is not None and isinstance(wanted, tuple)
            low, high = range_ends(wanted[0], wanted[1], column)
            return np.asarray((made.values >= low) & ((made.values < high) | np.isposinf(high)))
        positions = level_positions(made.levels, made.kind, made.cuts, wanted, column)
        return np.isin(made.codes, list(positions))

    def coded(
        self,
        names: Sequence[str],
        numbers: Collection[str] = (),
        linked: Callable[[str, str], bool] = lambda one, other: True,
    ) -> Coded:
        """Those columns as level positions, and the values of those in `numbers`, which no record leaves blank.

        The weights are those of the table by the design effect of the groups on these columns.
        linked: whether one column may be a parent of the other, either way round.
        Raises Refusal for an unknown column and one that is left out.
        """
        made = [self._used(name) for name in names]
        held = [place for place, name in enumerate(names) if name in numbers]
        values = np.empty((self.rows, len(held)), order="F")
        for at, place in enumerate(held):
            values[:, at] = made[place].values
        codes = np.empty((self.rows, len(made)), dtype=np.int32, order="F")
        for place, column in enumerate(made):
            codes[:, place] = column.codes
        factor = 1.0 if self.effect is None else self.effect.factor(names, linked)
        return Coded(
            names=tuple(names),
            kinds=tuple(column.kind for column in made),
            levels=tuple(column.levels for column in made),
            cuts=tuple(column.cuts for column in made),
            has_blank=tuple(column.has_blank for column in made),
            codes=codes,
            weights=self.weights / factor,
            group=self.group,
            numbers=tuple(held),
            values=values,
            units=tuple(column.unit for column in made),
        )

    def _used(self, name: str) -> Column:
        if name not in self.columns:
            raise Refusal(
                f"The records have no column {quoted(name)}.",
                where=name,
                do=f"Its columns are {listing(list(self.columns), 12)}.",
            )
        if self.columns[name].kind == "left out":
            raise Refusal(f"The column {quoted(name)} is left out.", where=name, do="Give it a kind first.")
        if not self.columns[name].used:
            raise Refusal(
                f"The column {quoted(name)} is taken as the {self.columns[name].kind}, which is not learned from.",
                where=name,
                do="Take it out of the order, or give it another kind.",
            )
        return self.columns[name]


def _check(frame: pd.DataFrame, chosen: Mapping[str, Mapping[str, object]]) -> None:
    """Raises Refusal for a table without rows or columns, a column twice, and a choice about an unknown column."""
    if len(frame.columns) < 2:
        raise Refusal(
            f"The table has too few columns ({len(frame.columns)}); at least two are needed.",
            where="columns",
            do="Bring a table with a column for each thing recorded.",
        )
    if len(frame) < 2:
        raise Refusal(
            f"The table has too few records ({len(frame)}); at least two are needed.",
            where="records",
            do="Bring a table with one row for each record, under a line of column names.",
        )
    bare: dict[str, str] = {}
    for place, name in enumerate(frame.columns):
        if not isinstance(name, str):
            raise Refusal(f"The column name {name!r} is not a text.", where=str(name), do="Name columns with words.")
        if not name:
            raise Refusal(
                f"Column {place + 1} has no name.", where=f"column {place + 1}", do="Name columns with words."
            )
        if name.strip() in bare:
            spaces = "" if bare[name.strip()] == name else ", but for spaces around the name"
            raise Refusal(
                f"Two columns are called {quoted(name.strip())}{spaces}.",
                where=name,
                do="Give each column a name of its own.",
            )
        bare[name.strip()] = name
    names = set(bare.values())
    for what, choices in chosen.items():
        for name in choices:
            if name not in names:
                raise Refusal(
                    f"The table has no column {quoted(name)}, which is named among the {what}.",
                    where=name,
                    do=f"Its columns are {listing(list(frame.columns), 12)}.",
                )


def _rows_left_out(kept: NDArray[np.bool_], dropped: Mapping[str, int]) -> tuple[str, ...]:
    """How many rows are left out in all, and how many for each column."""
    out = int((~kept).sum())
    if not out:
        return ()
    causes = listing([f"{quoted(name)} in {people(rows, SMALL_COUNT)}" for name, rows in dropped.items()], 12)
    said = f"{people(out, SMALL_COUNT)} of {kept.size:,} rows are left out because of a blank: {causes}."
    return (said[0].upper() + said[1:],)


def _one_nan(values: NDArray[np.float64]) -> NDArray[np.float64]:
    """The same numbers with every nan written in the same bytes, which nan need not be."""
    return np.where(np.isnan(values), np.nan, values).astype("<f8")


def _add_cells(found: hashlib._Hash, held: Cells) -> None:
    if held.values is not None:
        found.update(_one_nan(held.values).tobytes())
        return
    codes, firsts = np.unique(held.codes, return_index=True)
    order = codes[np.argsort(firsts)]
    order = order[order >= 0]  # of appearance, however pandas listed them
    places = np.full(held.different + 1, -1, dtype="<i4")
    places[order] = np.arange(order.size)
    found.update(json.dumps([held.texts[place] for place in order.tolist()]).encode())
    found.update(places[held.codes].tobytes())
