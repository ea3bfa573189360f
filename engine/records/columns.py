"""One column of cells becomes a Column: its kind as chosen or guessed, its levels, its codes."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from engine.records.bands import band_codes, band_levels, checked_cuts, equal_count_cuts
from engine.records.cells import Cells, as_numbers, level_text
from engine.records.column import BLANK, SMALL_COUNT, Column, Kind
from engine.records.kinds import MOST_LEVELS, Guess, category_levels, grade_levels, guess
from engine.records.standing import groups_of, weights_of
from engine.records.units import checked_unit
from engine.records.wording import cited, listing, per_cent
from engine.refusal import Refusal, quoted

KINDS: tuple[Kind, ...] = ("category", "grade", "number", "left out", "weight", "group")
BLANKS = ("level", "drop row")
MUCH_BLANK = 0.05  # share of blank cells from which the page asks what a blank means; common practice, no source


@dataclass(frozen=True)
class Choice:
    """What the user decided about one column; None for what is left to be guessed."""

    kind: str | None = None
    cuts: Sequence[float] | None = None
    grades: Sequence[str] | None = None
    blank: str | None = None
    unit: str | None = None


@dataclass(frozen=True)
class Taken:
    """A column whose kind is decided and whose levels wait for the rows that are kept."""

    name: str
    cells: Cells
    choice: Choice
    kind: Kind
    blank: Literal["level", "drop row"]
    why: str
    warnings: tuple[str, ...]
    unit: str = ""

    @property
    def drops(self) -> bool:
        """Whether a row that is blank here is left out."""
        return self.kind != "left out" and self.blank == "drop row" and self.cells.blanks > 0


def take(name: str, cells: Cells, choice: Choice) -> Taken:
    """Decide the kind of a column, as chosen, else as guessed. Raises Refusal for a choice that is none."""
    guessed = guess(name, cells)
    kind = _kind(name, choice, guessed)
    if choice.kind is None and kind == guessed.kind:
        why = guessed.why
    else:
        why = f"You chose it. {guessed.why}" if kind == guessed.kind else "You chose it."
    warnings = guessed.warnings if kind == guessed.kind else ()
    return Taken(name, cells, choice, kind, _blank(name, choice), why, warnings, _unit(name, choice, kind))


def column_of(taken: Taken, kept: NDArray[np.bool_]) -> Column:
    """The column of the rows in `kept`, (rows read,). Raises Refusal for a choice that its cells do not bear."""
    name, cells = taken.name, taken.cells
    if taken.kind == "left out":
        return Column(name, "left out", taken.why, blank=taken.blank, blanks=cells.blanks, warnings=taken.warnings)
    if taken.kind == "weight":
        values = weights_of(name, cells, kept)
        return Column(name, "weight", taken.why, values=values, blank=taken.blank, blanks=cells.blanks)
    if taken.kind == "group":
        groups = groups_of(name, cells, kept)
        return Column(name, "group", taken.why, codes=groups, blank=taken.blank, blanks=cells.blanks)
    codes = cells.codes if kept.all() else cells.codes[kept]
    if not (codes >= 0).any():
        raise Refusal(
            f"Every cell of {quoted(name)} is blank" + (" in the records that are kept." if not kept.all() else "."),
            where=name,
            do="Leave the column out.",
        )
    warnings = list(taken.warnings)
    if cells.blanks >= MUCH_BLANK * kept.size:
        few = 0 < cells.blanks < SMALL_COUNT
        amount = f"Under {SMALL_COUNT}" if few else per_cent(cells.blanks / kept.size)
        warnings.append(f"{amount} are blank. Say what a blank means here.")
    cuts: tuple[float, ...] = ()
    numbers = None
    if taken.kind == "number":
        numbers, cuts = _banded(taken, kept)
        codes, levels = band_codes(numbers, cuts), band_levels(cuts)
    else:
        levels, places, said = _levels(taken, codes)
        codes = places[codes]
        warnings += said
    if len(levels) == 1 and not (codes < 0).any():
        warnings.append("Every record that is kept has the same value.")
    if cells.blanks and taken.blank == "level":
        codes, levels = _with_blank(codes, levels)
    return Column(
        *(name, taken.kind, taken.why, levels, codes, cuts, numbers, taken.blank, cells.blanks, tuple(warnings)),
        unit=taken.unit,
    )


def _kind(name: str, choice: Choice, guessed: Guess) -> Kind:
    implied: Kind | None = "number" if choice.cuts is not None else "grade" if choice.grades is not None else None
    if choice.cuts is not None and choice.grades is not None:
        raise Refusal(
            f"{quoted(name)} has both cuts and an order of its levels.",
            where=name,
            do="Give cuts for a number, or an order for a grade.",
        )
    if choice.kind is None:
        return implied or guessed.kind
    if implied is not None and choice.kind in ("category", "grade", "number") and choice.kind != implied:
        what = "cuts, which only a number" if implied == "number" else "an order of its levels, which only a grade"
        raise Refusal(
            f"{quoted(name)} is to be a {choice.kind} but comes with {what} has.",
            where=name,
            do=f"Make it a {implied}, or take them away.",
        )
    for kind in KINDS:
        if choice.kind == kind:
            return kind
    raise Refusal(f"{quoted(choice.kind)} is not a kind of column.", where=name, do=f"Choose among {', '.join(KINDS)}.")


def _blank(name: str, choice: Choice) -> Literal["level", "drop row"]:
    if choice.blank is None or choice.blank == "level":
        return "level"
    if choice.blank == "drop row":
        return "drop row"
    if choice.blank == "fill":
        raise Refusal(
            f"Blanks of {quoted(name)} cannot be filled in yet.",
            where=name,
            do="Let a blank be a level, or leave the row out.",
        )
    raise Refusal(
        f"{quoted(choice.blank)} is not a meaning of a blank in {quoted(name)}.",
        where=name,
        do=f"Choose among {', '.join(BLANKS)}.",
    )


def _unit(name: str, choice: Choice, kind: Kind) -> str:
    """The unit of a number, "" where none is stated and for a column that is left out."""
    unit = "" if choice.unit is None else checked_unit(name, choice.unit)
    if unit and kind not in ("number", "left out"):
        raise Refusal(
            f"{quoted(name)} has a unit, {quoted(unit)}, but is taken as a {kind}; only a number has one.",
            where=name,
            do="Make it a number, or take the unit away.",
        )
    return unit if kind == "number" else ""


def _banded(taken: Taken, kept: NDArray[np.bool_]) -> tuple[NDArray[np.float64], tuple[float, ...]]:
    """(rows kept,) the numbers, and their cuts: as given, each band with a record in it, else of equal counts."""
    held = as_numbers(taken.name, taken.cells).values
    assert held is not None
    values = held if kept.all() else held[kept]
    present = values[~np.isnan(values)]
    if taken.choice.cuts is None:
        return values, equal_count_cuts(present)
    cuts = checked_cuts(taken.name, taken.choice.cuts)
    if len(cuts) >= MOST_LEVELS:
        raise Refusal(
            f"{quoted(taken.name)} would have {len(cuts) + 1} bands; at most {MOST_LEVELS} can be levels.",
            where=taken.name,
            do="Give fewer cuts.",
        )
    filled = np.bincount(band_codes(present, cuts), minlength=len(cuts) + 1)
    if (filled == 0).any():
        empty = band_levels(cuts)[int((filled == 0).argmax())]
        raise Refusal(
            f"No record of {quoted(taken.name)} lies in the band {quoted(empty)}.",
            where=taken.name,
            do="Move or remove that cut.",
        )
    return values, cuts


def _levels(taken: Taken, codes: NDArray[np.int32]) -> tuple[tuple[str, ...], NDArray[np.int32], tuple[str, ...]]:
    """The levels that the rows kept hold, in order; (texts + 1,) the level of each text, -1 last; and warnings."""
    name, cells = taken.name, taken.cells
    present = np.bincount(codes + 1, minlength=cells.different + 1)[1:] > 0
    if present.sum() > MOST_LEVELS:
        raise Refusal(
            f"{quoted(name)} has {int(present.sum()):,} different values; at most {MOST_LEVELS} can be levels.",
            where=name,
            do="Take it as a number if it is one, merge levels in the file, or leave it out.",
        )
    said: tuple[str, ...] = ()
    if taken.kind == "category":
        order = category_levels(cells)
    elif taken.choice.grades is not None:
        order = _given(taken, present)
    else:
        order, _, sure = grade_levels(cells)
        if not sure and present.sum() > 2:
            said = ("Nothing tells the order of its grades. Say which is lowest and which is highest.",)
    order = tuple(place for place in order if present[place])
    places = np.full(cells.different + 1, -1, dtype=np.int32)
    places[list(order)] = np.arange(len(order), dtype=np.int32)
    return tuple(cells.texts[place] for place in order), places, said


def _given(taken: Taken, present: NDArray[np.bool_]) -> tuple[int, ...]:
    name, texts = taken.name, taken.cells.texts
    given = [level_text(level) for level in taken.choice.grades or ()]
    if len(set(given)) < len(given):
        raise Refusal(
            f"A grade of {quoted(name)} is given twice.", where=name, do="Give each grade once, the lowest first."
        )
    places = {text: place for place, text in enumerate(texts)}
    if unknown := [level for level in given if level not in places]:
        raise Refusal(
            f"{quoted(name)} has no {listing([cited(level) for level in unknown])} among its levels.",
            where=name,
            do=f"Its levels are {listing(texts, 12)}.",
        )
    if missing := [text for text, held in zip(texts, present, strict=True) if held and text not in given]:
        raise Refusal(
            f"The grades of {quoted(name)} leave out {listing([cited(level) for level in missing])}.",
            where=name,
            do="Give every level its place.",
        )
    return tuple(places[level] for level in given)


def _with_blank(codes: NDArray[np.int32], levels: tuple[str, ...]) -> tuple[NDArray[np.int32], tuple[str, ...]]:
    """Codes of blanks, all under 0, moved to a level of their own."""
    called = BLANK
    while called in levels:
        called = f"{called} (no value)"
    return np.where(codes < 0, len(levels), codes).astype(np.int32), (*levels, called)
