"""What kind of column is this, and why? Guessed from the cells; the user has the last word."""

from __future__ import annotations

import re
from dataclasses import dataclass

import numpy as np

from engine.records.cells import Cells
from engine.records.column import Kind
from engine.records.grading import grading, natural
from engine.records.wording import cited, figure, listing

MOST_LEVELS = 50  # a category's levels, its blank among them
FEW_VALUES = 7  # whole numbers with this many values or fewer are steps of a scale as often as amounts
FEWEST_EACH = 3  # records for each value before few values count as a sign of steps
SURE_OF_IDS = 10  # records: fewer may all differ by chance
LONG = 5  # words in a cell from which on it reads as a sentence

_NAMED_AS_ID = re.compile(r"(?:^|[\W_])(?:id|ids|uuid|guid|identifier|key)(?:$|[\W_])|[a-z]I[Dd]$", re.IGNORECASE)
_DIGITS_ONLY = re.compile(r"(?:19|20)\d\d(?:0[1-9]|1[0-2])(?:0[1-9]|[12]\d|3[01])")
_MONTH = r"(?:jan|feb|mar|apr|may|jun|jul|aug|sep|oct|nov|dec)[a-z]*\.?"
_CLOCK = r"(?:[T ,]+\d{1,2}:\d\d(?::\d\d(?:\.\d+)?)?(?: ?[AaPp]\.?[Mm]\.?)?(?:Z| ?[+-]\d\d:?\d\d)?)?"
_DATE = re.compile(
    rf"(?:\d{{4}}[-/.]\d{{1,2}}[-/.]\d{{1,2}}|\d{{1,2}}[-/.]\d{{1,2}}[-/.](?:\d{{4}}|\d\d)"
    rf"|\d{{1,2}}[ -]{_MONTH}[ -](?:\d{{4}}|\d\d)|{_MONTH} \d{{1,2}},? \d{{4}}){_CLOCK}",
    re.IGNORECASE,
)


@dataclass(frozen=True)
class Guess:
    """A kind. why: one sentence.  warnings: sentences."""

    kind: Kind
    why: str
    warnings: tuple[str, ...] = ()


def guess(name: str, held: Cells) -> Guess:
    """The kind of the column `name`, from its cells alone."""
    seen = int(held.codes.size - held.blanks)
    if seen == 0:
        return Guess("left out", "Every cell is blank.")
    if held.different == 1 and not held.blanks:
        return Guess("left out", f"Every record has the same value: {cited(held.texts[0])}.")
    if held.dates or _are_dates(held):
        return Guess("left out", "It holds dates, which cannot be learned from as they are.")
    if held.different == 1:
        return Guess("category", f"It holds {cited(held.texts[0])} or nothing.")
    return _number(name, held, seen) if held.values is not None else _text(name, held, seen)


def category_levels(held: Cells) -> tuple[int, ...]:
    """Positions of the texts in the order in which a category lists them."""
    if held.values is not None or held.ordered:
        return tuple(range(held.different))
    return tuple(sorted(range(held.different), key=lambda place: natural(held.texts[place])))


def grade_levels(held: Cells) -> tuple[tuple[int, ...], str, bool]:
    """Positions of the texts low to high, where that order comes from, and whether that is more than a guess."""
    if held.ordered:
        return tuple(range(held.different)), "The order of its levels came with it.", True
    if held.values is not None:
        return tuple(range(held.different)), "Its levels are numbers.", True
    found = grading(held.texts)
    if found is not None:
        return found.order + found.outside, found.why, not found.outside
    return category_levels(held), "Its levels stand in alphabetical order.", False


def _number(name: str, held: Cells, seen: int) -> Guess:
    assert held.values is not None
    distinct = held.different
    present = held.values[~held.blank]
    whole = bool((present == np.floor(present)).all())
    if whole and _is_id(name, present, distinct, seen):
        return Guess("left out", _id_words(distinct, seen))
    if distinct == 2:
        return Guess("category", f"It has two values, {held.texts[0]} and {held.texts[1]}.")
    if distinct <= FEW_VALUES and seen >= FEWEST_EACH * distinct:
        low, high = figure(float(present.min())), figure(float(present.max()))
        warning = (
            f"A number with only {distinct} different values, {low} to {high}: taken as grades. "
            "Choose category if the numbers only stand for names."
        )
        return Guess("grade", f"It is a number with only {distinct} different values.", (warning,))
    return Guess("number", "It holds numbers.", _spike(held))


def _is_id(name: str, present: np.ndarray, distinct: int, seen: int) -> bool:
    if seen < SURE_OF_IDS:
        return False
    if _NAMED_AS_ID.search(name) and distinct > MOST_LEVELS:
        return True
    if distinct < seen:
        return False
    steps = np.diff(present)
    runs_on = bool((steps > 0).all() or (steps < 0).all())
    fills = float(present.max() - present.min()) < 2.0 * seen
    return bool(_NAMED_AS_ID.search(name)) or runs_on or fills


def _spike(held: Cells) -> tuple[str, ...]:
    distinct = held.different
    said = [f"A number with only {distinct} different values."] if distinct <= 2 * FEW_VALUES else []
    common = int(held.counts.argmax())
    seen = int(held.counts.sum())
    if held.counts[common] > seen / 2 and distinct > 2 * FEW_VALUES:
        said.append(f"More than half of its values are {figure(float(held.distinct[common]))}.")
    return tuple(said)


def _text(name: str, held: Cells, seen: int) -> Guess:
    distinct = held.different
    mostly = _mostly_numbers(held, seen)
    if mostly:
        return _levels_or_out(held, (mostly,), f"{distinct:,} different values; at most {MOST_LEVELS} can be levels.")
    words = np.array([1 + text.count(" ") for text in held.texts])
    wordy = float((words * held.counts).sum()) / seen
    if distinct > seen / 2 and wordy >= LONG and seen >= SURE_OF_IDS:
        return Guess("left out", f"Free text cannot be learned from; {distinct:,} different texts.")
    if distinct == seen and seen >= SURE_OF_IDS and grading(held.texts[: MOST_LEVELS + 1]) is None:
        return Guess("left out", _id_words(distinct, seen))
    if distinct > MOST_LEVELS and (_NAMED_AS_ID.search(name) or (distinct > 0.9 * seen and wordy < 2)):
        return Guess("left out", _id_words(distinct, seen))
    return _levels_or_out(held, (), f"{distinct:,} different values; at most {MOST_LEVELS} can be levels.")


def _levels_or_out(held: Cells, warnings: tuple[str, ...], too_many: str) -> Guess:
    if held.different + bool(held.blanks) > MOST_LEVELS:
        return Guess("left out", f"It has {too_many}", warnings)
    _, why, sure = grade_levels(held)
    if sure:
        return Guess("grade", why, warnings)
    found = grading(held.texts)
    if found is not None and len(found.order) > 2:
        outside = listing([cited(held.texts[place]) for place in found.outside])
        warnings = (*warnings, f"Its levels have an order except for {outside}, so it is taken as a category.")
    count = held.different
    return Guess("category", f"It has {count} different {'value' if count == 1 else 'values'}.", warnings)


def _id_words(distinct: int, seen: int) -> str:
    if distinct == seen:
        return "Looks like an identifier: every record has its own value."
    return (
        f"Looks like an identifier: {distinct:,} different values. "
        "Take it as the group if it says which records belong together."
    )


def _are_dates(held: Cells) -> bool:
    if held.values is None:
        return all(_DATE.fullmatch(text) for text in held.texts)
    low, high = float(held.distinct[0]), float(held.distinct[-1])
    if held.different <= FEW_VALUES or low < 1900_01_01 or high > 2099_12_31:
        return False
    return all(_DIGITS_ONLY.fullmatch(text) for text in held.texts)


def _mostly_numbers(held: Cells, seen: int) -> str | None:
    spelt = np.array([is_number(text) for text in held.texts])
    numbers = int(held.counts[spelt].sum())
    if spelt.all() or numbers <= seen / 2 or spelt.sum() <= FEW_VALUES:
        return None
    record = int((~np.append(spelt, True)[held.codes]).argmax())
    others = seen - numbers
    return (
        f"Most of its values are numbers, but record {record + 1:,} holds {cited(held.texts[held.codes[record]])}"
        f"{f' and {others - 1:,} more hold no number either' if others > 1 else ''}, so it is read as text. "
        "Mend them in the file, or leave those cells empty, to use it as a number."
    )


def is_number(text: str) -> bool:
    """Whether a text spells a number."""
    return _SPELT.fullmatch(text) is not None


_SPELT = re.compile(r"[+\-−]?(?:\d+(?:[.,]\d*)?|[.,]\d+)(?:[eE][+-]?\d{1,3})?", re.ASCII)
