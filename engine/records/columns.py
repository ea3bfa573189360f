"""One column of cells becomes a Column: its kind as chosen or guessed, its levels, its codes."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
import pandas as pd

from engine.records.bands import band_codes, band_levels, checked_cuts, equal_count_cuts
from engine.records.cells import Cells, as_numbers
from engine.records.column import Column, Kind
from engine.records.kinds import MOST_LEVELS, Guess, category_levels, grade_levels, guess
from engine.refusal import Refusal

KINDS: tuple[Kind, ...] = ("category", "grade", "number", "left out")
LATER_KINDS = ("weight", "group")
BLANKS = ("level", "drop row")
BLANK = "blank"
MUCH_BLANK = 0.05  # share of blank cells from which the page asks what a blank means; common practice, no source


@dataclass(frozen=True)
class Choice:
    """What the user decided about one column; None for what is left to be guessed."""

    kind: str | None = None
    cuts: Sequence[float] | None = None
    grades: Sequence[str] | None = None
    blank: str | None = None


def check_names(frame: pd.DataFrame, chosen: Mapping[str, Mapping[str, object]]) -> None:
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
    names = list(frame.columns)
    for name in names:
        if not isinstance(name, str):
            raise Refusal(f"The column name {name!r} is not a text.", where=str(name), do="Name columns with words.")
        if names.count(name) > 1:
            raise Refusal(f"Two columns are called “{name}”.", where=name, do="Give each column a name of its own.")
    for what, choices in chosen.items():
        for name in choices:
            if name not in names:
                raise Refusal(
                    f"The table has no column “{name}”, which is named among the {what}.",
                    where=name,
                    do=f"Its columns are {', '.join(names)}.",
                )


def column_of(name: str, cells: Cells, choice: Choice, kept: np.ndarray | None = None) -> Column:
    """The column made of `cells`, as chosen, else as guessed.

    kept: (rows read,) which rows to code; None for all.  Raises Refusal for a choice that the cells do not bear.
    """
    guessed = guess(name, cells)
    kind = _kind(name, choice, guessed)
    blank = _blank(name, choice)
    blanks = int(cells.blank.sum())
    why = (
        guessed.why
        if choice.kind is None
        else f"You chose it. {guessed.why}"
        if kind == guessed.kind
        else "You chose it."
    )
    warnings = list(guessed.warnings) if kind == guessed.kind else []
    if kind == "left out":
        return Column(name, kind, why, blank=blank, blanks=blanks, warnings=tuple(warnings))
    codes = cells.codes if kept is None else cells.codes[kept]
    if not (codes >= 0).any():
        raise Refusal(f"Every cell of “{name}” is blank.", where=name, do="Leave the column out.")
    if blanks >= MUCH_BLANK * codes.size:
        warnings.append(f"{round(100 * blanks / cells.codes.size)}% are blank. Say what a blank means here.")
    if kind == "number":
        held = as_numbers(name, cells).values
        assert held is not None
        values = held if kept is None else held[kept]
        cuts = equal_count_cuts(values[~np.isnan(values)]) if choice.cuts is None else _cuts(name, choice.cuts, values)
        banded = band_codes(values, cuts)
        codes, levels = _with_blank(banded, band_levels(cuts), blank, blanks)
        return Column(name, kind, why, levels, codes, cuts, values, blank, blanks, tuple(warnings))
    order, alphabetical = _order(name, kind, cells, codes, choice, guessed)
    if alphabetical:
        warnings.append("The order of its grades is only alphabetical. Say which is lowest and which is highest.")
    if len(order) > MOST_LEVELS:
        raise Refusal(
            f"“{name}” has {len(order):,} different values; at most {MOST_LEVELS} can be levels.",
            where=name,
            do="Take it as a number if it is one, merge levels in the file, or leave it out.",
        )
    place = {level: position for position, level in enumerate(order)}
    positions = np.asarray([place.get(level, -1) for level in cells.texts] + [-1])[codes]
    codes, levels = _with_blank(positions, order, blank, blanks)
    return Column(name, kind, why, levels, codes, blank=blank, blanks=blanks, warnings=tuple(warnings))


def _kind(name: str, choice: Choice, guessed: Guess) -> Kind:
    if choice.kind is None:
        if guessed.kind != "left out" and choice.cuts is not None:
            return "number"
        return "grade" if guessed.kind != "left out" and choice.grades is not None else guessed.kind
    if choice.kind in LATER_KINDS:
        raise Refusal(
            f"“{name}” cannot be taken as a {choice.kind} yet.",
            where=name,
            do="Take it as another kind, or leave it out.",
        )
    for kind in KINDS:
        if choice.kind == kind:
            return kind
    raise Refusal(f"“{choice.kind}” is not a kind of column.", where=name, do=f"Choose among {', '.join(KINDS)}.")


def _blank(name: str, choice: Choice) -> Literal["level", "drop row"]:
    if choice.blank is None or choice.blank == "level":
        return "level"
    if choice.blank == "drop row":
        return "drop row"
    if choice.blank == "fill":
        raise Refusal(
            f"Blanks of “{name}” cannot be filled in yet.",
            where=name,
            do="Let a blank be a level, or leave the row out.",
        )
    raise Refusal(
        f"“{choice.blank}” is not a meaning of a blank in “{name}”.",
        where=name,
        do=f"Choose among {', '.join(BLANKS)}.",
    )


def _cuts(name: str, given: Sequence[float], values: np.ndarray) -> tuple[float, ...]:
    """The cuts given. Raises Refusal unless they rise and leave no band without a record."""
    cuts = checked_cuts(name, given)
    filled = np.bincount(band_codes(values[~np.isnan(values)], cuts), minlength=len(cuts) + 1)
    if (filled == 0).any():
        empty = band_levels(cuts)[int((filled == 0).argmax())]
        raise Refusal(f"No record of “{name}” lies in the band “{empty}”.", where=name, do="Move or remove that cut.")
    return cuts


def _order(
    name: str, kind: Kind, cells: Cells, codes: np.ndarray, choice: Choice, guessed: Guess
) -> tuple[tuple[str, ...], bool]:
    """The levels in order, and whether that order is nothing but the alphabet."""
    held = frozenset(np.unique(codes[codes >= 0]).tolist())
    if kind == "category":
        return tuple(cells.texts[place] for place in category_levels(cells) if place in held), False
    order, _, sure = grade_levels(cells)
    found = tuple(cells.texts[place] for place in order if place in held)
    if choice.grades is None:
        return found, not sure and len(found) > 2
    given = tuple(str(level) for level in choice.grades)
    if len(set(given)) < len(given):
        raise Refusal(f"A grade of “{name}” is given twice.", where=name, do="Give each grade once, the lowest first.")
    if missing := [level for level in found if level not in given]:
        raise Refusal(
            f"The grades of “{name}” leave out {', '.join(f'“{level}”' for level in missing[:5])}.",
            where=name,
            do="Give every level its place.",
        )
    return tuple(level for level in given if level in found), False


def _with_blank(
    codes: np.ndarray, levels: tuple[str, ...], blank: str, blanks: int
) -> tuple[np.ndarray, tuple[str, ...]]:
    if blank != "level" or blanks == 0:
        return codes, levels
    called = BLANK if BLANK not in levels else f"{BLANK} (no value)"
    return np.where(codes < 0, len(levels), codes).astype(np.int32), (*levels, called)
