"""What the Records page says of a column: its levels, its range, its blanks, without giving small counts away."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from app.wording.amounts import count, listing, number, people, plural
from app.wording.figures import share
from app.wording.units import behind
from engine.records.small_counts import hidden_levels
from engine.records.spikes import own_reason
from engine.records.steps import recording_step
from engine.records.table import Column

SHOWN_LEVELS = 6


@dataclass(frozen=True)
class Shown:
    """Counts of a column's levels as they may be shown.

    counts: one a level, None where hidden.  hidden: positions hidden.  together: their sum.  under: positions whose
    own count is under the limit; the others in `hidden` would give them away.
    """

    counts: tuple[int | None, ...]
    hidden: tuple[int, ...]
    together: int
    under: tuple[int, ...]


def shown(counts: Sequence[int], small: int) -> Shown:
    """Hide counts under `small`, and as many of the next smallest as it takes so that none can be worked out."""
    hidden = hidden_levels(counts, small)
    under = tuple(place for place in hidden if counts[place] < small)
    kept = tuple(None if place in hidden else int(each) for place, each in enumerate(counts))
    return Shown(kept, hidden, int(sum(counts[place] for place in hidden)), under)


def level_counts(column: Column) -> list[int]:
    """Kept records at each level."""
    return [int(each) for each in np.bincount(column.codes, minlength=len(column.levels))]


def levels(column: Column, counts: Shown, small: int) -> str:
    """The levels with their shares; counts instead of shares where a share would give a hidden one away."""
    total = sum(each or 0 for each in counts.counts) + counts.together
    if len(column.levels) > SHOWN_LEVELS:
        by_count = sorted(range(len(column.levels)), key=lambda place: -(counts.counts[place] or 0))
        first = [place for place in by_count if counts.counts[place] is not None][:SHOWN_LEVELS]
        said = [f"{column.levels[place]} {share((counts.counts[place] or 0) / max(total, 1))}" for place in first]
        return f"{count(len(column.levels))} levels: {', '.join(said)} and {len(column.levels) - len(first)} more"
    if not counts.hidden:
        return ", ".join(
            f"{level} {share((each or 0) / max(total, 1))}"
            for level, each in zip(column.levels, counts.counts, strict=True)
        )
    said = [
        f"{level} {count(each)}" for level, each in zip(column.levels, counts.counts, strict=True) if each is not None
    ]
    names = [column.levels[place] for place in counts.hidden]
    together = f"{listing(names)} {people(counts.together, small)}" + (" together" if len(names) > 1 else "")
    return ", ".join([*said, together])


def small_levels(column: Column, counts: Shown, small: int) -> str | None:
    """The warning that goes with hidden counts, or None."""
    if not counts.under:
        return None
    last = len(column.levels) - 1
    names = [column.levels[place] for place in counts.under if not (column.has_blank and place == last)]
    told = []
    if names:
        told.append(f"{listing(names, 4)} {'has' if len(names) == 1 else 'have'} under {small} records.")
    if len(names) < len(counts.under):
        told.append(f"Under {small} are blank, few for a level of their own; leaving those rows out may serve better.")
    if beside := [column.levels[place] for place in counts.hidden if place not in counts.under]:
        told.append(f"The count of {listing(beside)} is hidden too, or one would give the other away.")
    return " ".join(told)


def span(column: Column) -> str:
    """A number's range in its unit, middle, the step it was recorded to, and its bands if it has any."""
    present = np.asarray(column.values, dtype=np.float64)
    present = present[np.isfinite(present)]
    if present.size == 0:
        return "no values"
    low, high, middle = number(float(present.min())), number(float(present.max())), number(float(np.median(present)))
    said = f"{low} to {high}{behind(column.unit)}, middle {middle}" + (f", {_steps(present)}" if low != high else "")
    bands = column.levels[: len(column.cuts) + 1] if column.kind == "number" else ()
    return f"{said}; bands: {', '.join(bands)}" if bands else said


def _steps(present: np.ndarray) -> str:
    step = recording_step(present)
    if step == 0.0:
        return "in fine steps"
    if step == 1.0 and bool((present == np.round(present)).all()):
        return "in whole numbers"
    return f"in steps of {number(step)}"


def acts(column: Column) -> str:
    """Whether a number is learned from as one or as bands, and why."""
    why = own_reason(column)
    return "learned as a number; on categories it acts by its bands" if why is None else f"learned as bands: {why[:-1]}"


WEIGHT = "how much each record counts; not learned from"
GROUP = "which records belong together; not learned from"


def groups(column: Column, small: int) -> str:
    """How many groups there are and how large they get."""
    sizes = np.bincount(column.codes)
    said = f"{count(sizes.size)} {plural(int(sizes.size), 'group')}"
    largest = int(sizes.max())
    return f"{said}, the largest of {people(largest, small)} records" if largest > 1 else f"{said} of one record each"


def blanks(column: Column, rows: int, small: int) -> str:
    """How many of the `rows` read are blank there, and what is made of them."""
    if column.blanks == 0:
        return "no blanks"
    amount = f"under {small} blank" if column.blanks < small else f"{share(column.blanks / max(rows, 1))} blank"
    if column.kind in ("left out", "weight") and column.blank == "level":
        return amount
    if column.kind == "group" and column.blank == "level":
        return f"{amount}, each a case by itself"
    if column.blank == "drop row":
        return f"{amount}, those rows are left out"
    return f"{amount}, a level of its own" if column.kind == "number" else "a blank is a level of its own"
