"""Bands of a number: where they are cut, what they are called, and what a pinned value or range means."""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from decimal import ROUND_FLOOR, Decimal
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from engine.records.wording import figure, listing, number_text
from engine.refusal import Refusal, quoted

BANDS = 4
EVERYTHING = "any value"  # the only band of a number that is not cut
YEARS = (1500, 2100)  # whole cuts that all lie in here are written as years are, without a comma


def equal_count_cuts(values: NDArray[np.float64], bands: int = BANDS) -> tuple[float, ...]:
    """Inner cuts of at most `bands` bands of about equally many values; no band is empty.

    values: (rows,) finite.  Equal values stay in one band, so there are fewer bands when values tie. A cut is the
    number with the fewest digits that splits the values at the same place.
    """
    distinct, counts = np.unique(values, return_counts=True)
    if distinct.size < 2:
        return ()
    below = np.cumsum(counts)[:-1]  # values under distinct[i + 1]
    targets = values.size * np.arange(1, bands) / bands
    after = np.minimum(np.searchsorted(below, targets), below.size - 1)
    before = np.maximum(after - 1, 0)
    nearest = np.where(targets - below[before] < below[after] - targets, before, after)
    return tuple(shortest_between(float(distinct[place]), float(distinct[place + 1])) for place in np.unique(nearest))


def shortest_between(low: float, high: float) -> float:
    """The number with the fewest digits in (low, high]; the largest of those."""
    exact_low, exact_high = Decimal(repr(low)), Decimal(repr(high))
    for exponent in range((exact_high - exact_low).adjusted() + 1, -400, -1):
        step = Decimal(1).scaleb(exponent)
        try:
            tried = float((exact_high / step).to_integral_value(ROUND_FLOOR) * step)
        except ArithmeticError:
            break
        if low < tried <= high:
            return tried + 0.0
        if exponent < exact_high.as_tuple().exponent:  # type: ignore[operator]
            break
    return high


def band_levels(cuts: Sequence[float]) -> tuple[str, ...]:
    """Bands in words: under 20, 20 to under 45, 45 and over."""
    if not cuts:
        return (EVERYTHING,)
    years = all(cut.is_integer() and YEARS[0] <= cut <= YEARS[1] for cut in cuts)
    words = [figure(cut, commas=not years) for cut in cuts]
    inner = [f"{low} to under {high}" for low, high in pairwise(words)]
    return (f"under {words[0]}", *inner, f"{words[-1]} and over")


def band_codes(values: NDArray[np.float64], cuts: Sequence[float]) -> NDArray[np.int32]:
    """(rows,) the band of each value, -1 where it is nan. Band i holds cuts[i-1] <= x < cuts[i]."""
    codes = np.searchsorted(np.asarray(cuts, dtype=np.float64), values, side="right").astype(np.int32)
    codes[np.isnan(values)] = -1
    return codes


def checked_cuts(name: str, cuts: Iterable[object]) -> tuple[float, ...]:
    """The user's cuts of the column `name`. Raises Refusal unless they are finite and rise."""
    given = [cuts] if isinstance(cuts, str) else list(cuts)
    found: list[float] = []
    for cut in given:
        if not _is_number(cut) or not math.isfinite(cut):  # type: ignore[arg-type]
            raise Refusal(
                f"{quoted(cut)} among the cuts of {quoted(name)} is not a number.",
                where=name,
                do="Give the cuts as numbers.",
            )
        found.append(float(cut) + 0.0)  # type: ignore[arg-type]
    for before, after in pairwise(found):
        if after <= before:
            raise Refusal(
                f"The cuts of {quoted(name)} do not rise: {figure(after)} comes after {figure(before)}.",
                where=name,
                do="Give each cut once, the smallest first.",
            )
    return tuple(found)


def level_positions(
    levels: Sequence[str], kind: str, cuts: Sequence[float], wanted: object, where: str | None = None
) -> frozenset[int]:
    """The positions in `levels` that `wanted` names.

    wanted: a level; an iterable of levels; on a number also a value, which means the band that holds it, and a
    (low, high) tuple of numbers or None: low <= x < high, open where None or infinite, which must match the cuts.
    where: the column's name, for a refusal. Raises Refusal for anything else.
    """
    try:
        return _positions(levels, kind, cuts, wanted)
    except Refusal as refusal:
        raise Refusal(refusal.message, refusal.where or where, refusal.do) from None


def _positions(levels: Sequence[str], kind: str, cuts: Sequence[float], wanted: object) -> frozenset[int]:
    if is_range(kind, wanted):
        assert isinstance(wanted, tuple)
        return _range(levels, cuts, *wanted)
    if isinstance(wanted, str) or not isinstance(wanted, Iterable):
        return frozenset([_position(levels, kind, cuts, wanted)])
    found = frozenset(_position(levels, kind, cuts, each) for each in wanted)
    if not found:
        raise Refusal("No level is named.", do=f"Name one of {listing(levels, 12)}.")
    return found


def is_range(kind: str, wanted: object) -> bool:
    """Whether `wanted` is a range of a number rather than levels."""
    return (
        kind == "number"
        and isinstance(wanted, tuple)
        and len(wanted) == 2
        and all(end is None or _is_number(end) for end in wanted)
    )


def range_ends(low: object, high: object, where: str | None = None) -> tuple[float, float]:
    """Both ends as numbers, infinite where open. Raises Refusal about the column `where` unless low < high."""
    ends = (-math.inf if low is None else float(low), math.inf if high is None else float(high))  # type: ignore[arg-type]
    if not ends[0] < ends[1]:
        raise Refusal(
            f"The range from {_end(ends[0])} to under {_end(ends[1])} holds no value.",
            where=where,
            do="Give the lower end first; None leaves an end open.",
        )
    return ends


def _range(levels: Sequence[str], cuts: Sequence[float], low: object, high: object) -> frozenset[int]:
    start, end = range_ends(low, high)
    edges = [-math.inf, *cuts, math.inf]
    if start not in edges or end not in edges:
        raise Refusal(
            f"The range from {_end(start)} to under {_end(end)} does not match the bands.",
            do=f"Choose whole bands: {listing(levels[: len(cuts) + 1], 12)}.",
        )
    return frozenset(range(edges.index(start), edges.index(end)))


def _position(levels: Sequence[str], kind: str, cuts: Sequence[float], wanted: object) -> int:
    if isinstance(wanted, str):
        if wanted in levels:
            return list(levels).index(wanted)
    elif _is_number(wanted):
        value = float(wanted)  # type: ignore[arg-type]
        if kind == "number" and not math.isnan(value):
            return int(np.searchsorted(np.asarray(cuts, dtype=np.float64), value, side="right"))
        if not math.isnan(value) and number_text(value) in levels:
            return list(levels).index(number_text(value))
    elif isinstance(wanted, bool | np.bool_) and str(wanted) in levels:
        return list(levels).index(str(wanted))
    raise Refusal(f"There is no level {quoted(wanted)}.", do=f"The levels are {listing(levels, 12)}.")


def _is_number(value: object) -> bool:
    """A number that a float can hold, infinite or nan included."""
    if not isinstance(value, int | float | np.integer | np.floating) or isinstance(value, bool):
        return False
    try:
        float(value)
    except OverflowError:
        return False
    return True


def _end(value: float) -> str:
    return figure(value) if math.isfinite(value) else "the lowest" if value < 0 else "the highest"
