"""What a column is, guessed from its cells, with the reason in words."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd

from engine.records.cells import Cells
from engine.records.column import Kind

MOST_LEVELS = 50
FEW_VALUES = 7  # whole numbers with at most so many different values are grades; common practice, no source
NAMED_LEVELS = 20  # rows from which a column of all-different texts counts as an identifier or free text

_DATE = (
    r"^(\d{4}[-/.]\d{1,2}[-/.]\d{1,2}|\d{1,2}[-/.]\d{1,2}[-/.](\d{4}|\d{2}))"
    r"([ T]\d{1,2}:\d{2}(:\d{2}(\.\d+)?)?(Z|[+-]\d{2}:?\d{2})?)?$"
)
_ID_NAME = re.compile(r"(^|[ _\-.])(id|ids|nr|no|number|code|key|ref|uuid|reference|identifier)$", re.IGNORECASE)
_SCALES: tuple[tuple[str, ...], ...] = (
    ("very low", "low", "medium", "moderate", "high", "very high"),
    ("never", "rarely", "seldom", "sometimes", "often", "usually", "always"),
    ("none", "little", "some", "much", "most", "all"),
    ("none", "few", "some", "many", "most", "all"),
    ("very poor", "poor", "fair", "average", "good", "very good", "excellent"),
    ("strongly disagree", "disagree", "neutral", "neither", "agree", "strongly agree"),
    ("very dissatisfied", "dissatisfied", "neutral", "satisfied", "very satisfied"),
    ("none", "mild", "moderate", "severe", "very severe"),
    ("extra small", "small", "medium", "large", "extra large"),
    ("none", "primary", "lower", "lower secondary", "secondary", "upper", "upper secondary", "tertiary", "higher"),
    ("zero", "one", "two", "three", "four", "five", "six"),
    ("first", "second", "third", "fourth", "fifth"),
)
_NUMBER_WORDS = {"none": 0.0, "zero": 0.0, "no": 0.0, "one": 1.0, "two": 2.0, "three": 3.0, "four": 4.0, "five": 5.0}
_LEADING = re.compile(r"^(?P<under>under|below|less than|up to|<=?|≤)?\s*(?P<number>[-−]?\d+(?:[.,]\d+)?)")


@dataclass(frozen=True)
class Guess:
    """kind, why: as in Column.  grades: the levels low to high, for a grade.  warnings: sentences."""

    kind: Kind
    why: str
    grades: tuple[str, ...] = ()
    warnings: tuple[str, ...] = ()


def guess(name: str, cells: Cells) -> Guess:
    """The kind of a column, from its cells."""
    if not cells.different:
        return Guess("left out", "Every cell is blank.")
    if len(cells.different) == 1:
        return Guess("left out", "Every record has the same value.")
    if cells.form == "date":
        return Guess("left out", "Dates cannot be learned from as they are.")
    if cells.form == "ordered":
        return Guess("grade", "Its levels come in order.", cells.different)
    return _number(name, cells) if cells.values is not None else _text(name, cells)


def _number(name: str, cells: Cells) -> Guess:
    assert cells.values is not None
    present = cells.values[~cells.blank]
    size = len(cells.different)
    whole = bool((present == np.rint(present)).all())
    if size == 2:
        return Guess("category", "It has two different values.")
    if whole and size == present.size and size >= NAMED_LEVELS:
        consecutive = float(present.max() - present.min()) == size - 1
        if consecutive or _ID_NAME.search(name):
            return Guess("left out", "Looks like an identifier: every record has its own value.")
    if whole and size <= FEW_VALUES:
        return Guess(
            "grade",
            f"It is a whole number with only {size} different values.",
            cells.different,
            (f"A number with only {size} different values, so it is taken as a grade.",),
        )
    return Guess("number", "Its cells are numbers.")


def _text(name: str, cells: Cells) -> Guess:
    different = pd.Series(cells.different, dtype="str")
    present = int((~cells.blank).sum())
    if different.str.match(_DATE).mean() >= 0.95:
        return Guess("left out", "Dates cannot be learned from as they are.")
    all_different = len(different) == present and present >= NAMED_LEVELS
    wordy = bool((different.str.len() > 25).mean() > 0.5 or (different.str.count(" ") >= 3).mean() > 0.5)
    if all_different and not wordy:
        return Guess("left out", "Looks like an identifier: every record has its own value.")
    if wordy and (all_different or len(different) > MOST_LEVELS):
        return Guess("left out", "Free text cannot be learned from.")
    if len(different) > MOST_LEVELS:
        if _ID_NAME.search(name) and len(different) > present / 2:
            return Guess("left out", "Looks like an identifier: most records have their own value.")
        warnings = _nearly_a_number(cells)
        why = f"It has {len(different):,} different values; at most {MOST_LEVELS} can be levels."
        return Guess("left out", why, (), warnings)
    warnings = _nearly_a_number(cells)
    order = grade_order(cells.different)
    if len(order) > 2:
        return Guess("grade", f"Its levels have an order: {', '.join(order)}.", order, warnings)
    return Guess("category", f"It has {len(different)} different values in words.", (), warnings)


def grade_order(levels: Sequence[str]) -> tuple[str, ...]:
    """The levels low to high when their words tell; empty when they do not."""
    for scale in _SCALES:
        places = {word: place for place, word in enumerate(scale)}
        if all(level.strip().lower() in places for level in levels):
            return tuple(sorted(levels, key=lambda level: places[level.strip().lower()]))
    keys = [_order_key(level) for level in levels]
    if any(key is None for key in keys) or len(set(keys)) < len(keys):
        return ()
    return tuple(level for _, level in sorted(zip(keys, levels, strict=True), key=lambda pair: pair[0] or (0.0, 0)))


def _order_key(level: str) -> tuple[float, int] | None:
    text = level.strip().lower()
    if found := _LEADING.match(text):
        return float(found["number"].replace("−", "-").replace(",", ".")), -1 if found["under"] else 0
    first = re.split(r"[\s-]", text, maxsplit=1)[0]
    return (_NUMBER_WORDS[first], 0) if first in _NUMBER_WORDS else None


def _nearly_a_number(cells: Cells) -> tuple[str, ...]:
    numeric = pd.to_numeric(pd.Series(cells.different, dtype="str"), errors="coerce").notna().to_numpy()
    odd = np.append(~numeric, False)[cells.codes]
    if not odd.any() or odd.sum() > 0.2 * (~cells.blank).sum():
        return ()
    row = int(np.flatnonzero(odd)[0])
    value, others = cells.different[cells.codes[row]], int(odd.sum())
    return (
        f"Mostly numbers, but {others:,} of its cells are not, the first in record {row + 1:,}: “{value}”. "
        "Correct the file to have it read as a number.",
    )
