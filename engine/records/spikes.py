"""Which numbers cannot be learned from as numbers: spikes, constants inside configurations, exact sums of others."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from itertools import combinations
from math import comb, prod

import numpy as np
from numpy.typing import NDArray

from engine.records.column import SMALL_COUNT, Column
from engine.records.joint import LARGEST
from engine.records.moments import Numbers
from engine.records.wording import figure, listing, per_cent
from engine.refusal import Refusal, quoted

SPIKE = 0.1  # share of the records in one value from which a number is no smooth amount
CONSTANT = 10  # records of one value throughout a configuration from which its density has no limit
PROBED = 20_000  # records that are looked at before all are
EXACT = 1e-6  # of the standard deviation: what rounding to float leaves of an exact sum

Floats = NDArray[np.float64]


def taken_as_bands(
    columns: Sequence[Column], size: int, tick: Callable[[float], None] = lambda part: None
) -> dict[str, str]:
    """The numbers among `columns` that are learned from as bands, and why, in a sentence each.

    A density has no limit where a number does not vary: such a number would outweigh everything else. So bands are
    taken for one with SPIKE of its records or more in one value, and for one that holds a single value throughout
    a configuration of CONSTANT records or more of up to `size` categories (bands included); and for one with blanks
    that are a level of their own, since no number stands for a blank.  tick: hears the fraction done, which ends
    early where no number holds a value often enough.
    """
    found: dict[str, str] = {}
    for column in columns:
        tick(0.0)
        why = own_reason(column) if column.kind == "number" else None
        if why is not None:
            found[column.name] = f"{quoted(column.name)} is taken as bands: {why}"
    fresh = {column.name for column in columns if column.kind != "number" or column.name in found}
    while fresh:
        constant = _constant_inside(columns, set(found), fresh, size, tick)
        found.update(constant)
        fresh = set(constant)
    return {column.name: found[column.name] for column in columns if column.name in found}


def refuse_collinear(columns: Sequence[Column], size: int, still: Callable[[], None] = lambda: None) -> None:
    """Raises Refusal naming numbers of which one follows from the others in every record, up to rounding.

    columns: all are taken as numbers.  size: columns in the largest set that is scored; a sum of more columns than
    that is never scored as a whole and does no harm.  still: called often, a chance to cancel.
    """
    held = [column for column in columns if column.kind == "number" and column.values is not None]
    if not held:
        return
    values = np.column_stack([np.asarray(column.values) for column in held])
    numbers = Numbers.standardised(range(len(held)), values, still=still)
    if len(numbers.values) <= 2 * size:
        return
    alike = numbers.values.T @ numbers.values / len(values)
    basis: list[int] = []
    for place in range(len(held)):
        still()
        sources = _sources(numbers, alike, place, basis, size - 1)
        if sources is None:
            basis.append(place)
            continue
        names = listing([quoted(held[source].name) for source in sources], 12)
        raise Refusal(
            f"{quoted(held[place].name)} follows exactly from {names} in every record, up to rounding, so they cannot "
            "all be learned from as numbers.",
            where=held[place].name,
            do="Leave one of them out.",
        )


def own_reason(column: Column) -> str | None:
    """Why the number `column` is taken as bands whatever the other columns hold, to follow a colon; None if it is not.

    A count under SMALL_COUNT, or one that leaves as few, is not given away.
    """
    values = np.asarray(column.values)
    if np.isnan(values).any() or column.has_blank:
        return "a blank is a level of its own here, which only bands can have."
    distinct, counts = np.unique(values, return_counts=True)
    common = int(counts.argmax())
    most, rows = int(counts[common]), int(values.size)
    if most < SPIKE * rows:
        return None
    if most < SMALL_COUNT:
        return f"a single value makes up {per_cent(SPIKE)} of its records or more."
    share = per_cent(most / rows) if most == rows or rows - most >= SMALL_COUNT else "nearly all"
    return f"{share} of its records hold {figure(float(distinct[common]))}."


def _most_alike(column: Column, tick: Callable[[float], None]) -> int:
    """The records in the commonest value."""
    tick(0.0)
    return int(np.unique(np.asarray(column.values), return_counts=True)[1].max())


def _constant_inside(
    columns: Sequence[Column], bands: set[str], fresh: set[str], size: int, tick: Callable[[float], None]
) -> dict[str, str]:
    """Numbers that are constant in a configuration of categories of which at least one is `fresh`."""
    categories = [column for column in columns if column.kind != "number" or column.name in bands]
    left = [column for column in columns if column.kind == "number" and column.name not in bands]
    left = [column for column in left if _most_alike(column, tick) >= CONSTANT]
    found: dict[str, str] = {}
    rows = np.arange(columns[0].codes.size)
    some = np.random.default_rng(0).permutation(rows)[:PROBED]
    probes = (rows, some, some[::-1], some[::3])
    done, whole = 0, sum(comb(len(categories), count) for count in range(1, size + 1))
    for count in range(1, size + 1):
        for chosen in combinations(categories, count):
            done += 1
            if not left:
                return found
            if not fresh.intersection(column.name for column in chosen):
                continue
            joint = prod(len(column.levels) for column in chosen)
            if joint > LARGEST:
                continue
            tick(done / whole)
            code = np.zeros(chosen[0].codes.size, dtype=np.int64)
            for column in chosen:
                code = code * len(column.levels) + column.codes
            found.update(_constant_in(code, joint, chosen, left, probes))
            left = [column for column in left if column.name not in found]
    return found


def _constant_in(
    code: NDArray[np.int64],
    joint: int,
    chosen: Sequence[Column],
    numbers: Sequence[Column],
    probes: Sequence[NDArray[np.int64]],
) -> dict[str, str]:
    """Those of `numbers` that are constant in a configuration, and why.

    probes: records of which each configuration's last is compared first; the first of them holds all records.
    """
    records = np.bincount(code, minlength=joint)
    large = records >= CONSTANT
    last = np.zeros(joint, dtype=np.int64)
    held = np.empty((len(probes), joint), dtype=np.int64)  # a few records of each configuration
    for place, rows in enumerate(probes):
        last[code[rows]] = rows
        held[place] = last
    found = {}
    for column in numbers:
        values = np.asarray(column.values)
        probed = values[held[:, large]]
        if not (probed == probed[0]).all(axis=0).any():
            continue
        different = values != values[last[code]]
        constant = np.flatnonzero(large & (np.bincount(code[different], minlength=joint) == 0))
        if constant.size:
            at = int(constant[0])
            places = np.unravel_index(at, [len(each.levels) for each in chosen])
            where = listing(
                [f"{quoted(e.name)} is {quoted(e.levels[p])}" for e, p in zip(chosen, places, strict=True)], 12
            )
            found[column.name] = (
                f"{quoted(column.name)} is taken as bands: it is {figure(float(values[last[at]]))} in all "
                f"{records[at]:,} records where {where}."
            )
    return found


def _sources(numbers: Numbers, alike: Floats, place: int, basis: Sequence[int], most: int) -> list[int] | None:
    """The fewest of `basis`, at most `most`, that the number at `place` is a linear sum of.

    alike: (numbers, numbers) correlations. They rule out nearly every number before any record is looked at.
    """
    if not basis:
        return None
    child = numbers.values[:, place]
    ridge = EXACT**2 * np.eye(len(basis))
    slopes = np.linalg.solve(alike[np.ix_(basis, basis)] + ridge, alike[basis, place])
    if 1.0 - slopes @ alike[basis, place] > 2.0 * _rounding(numbers, place, basis, slopes) ** 2 + 1e-9:
        return None
    strongest = [basis[at] for at in np.argsort(-np.abs(slopes), kind="stable")]
    for count in range(1, min(most, len(basis)) + 1):
        chosen = strongest[:count]
        slopes = np.linalg.lstsq(numbers.values[:, chosen], child, rcond=None)[0]
        if _follows(numbers, place, chosen, slopes):
            return sorted(chosen)
    return None


def _follows(numbers: Numbers, place: int, sources: Sequence[int], slopes: NDArray[np.floating]) -> bool:
    """Whether no record is further from the sum than rounding of the columns to their steps explains."""
    away = np.abs(numbers.values[:, place] - numbers.values[:, list(sources)] @ slopes).max()
    return bool(away <= max(EXACT, 1.01 * _rounding(numbers, place, sources, slopes)))


def _rounding(numbers: Numbers, place: int, sources: Sequence[int], slopes: NDArray[np.floating]) -> float:
    """The furthest that rounding of all columns to their steps takes a record from an exact sum, standardised."""
    steps = numbers.step / numbers.scale
    return float(0.5 * (steps[place] + np.abs(slopes) @ steps[list(sources)]))
