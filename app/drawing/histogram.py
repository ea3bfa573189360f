"""Histograms of one column as recorded: hollow, on an ink base line. Small counts are hatched and tell nothing."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from markupsafe import Markup

from app.drawing.svg import FAR, INK, LINE, TINT, join, line, percent, tag

HEIGHT, BASE, TALLEST = 64, 55.0, 50.0
GAP = 0.024  # between the bars of two levels, share of the width
BINS = 24
WHOLE = 1e9  # a wider range of whole numbers is binned like any other


def levels(counts: Sequence[int | None], hidden_total: int = 0) -> Markup:
    """One bar a level. A count that is None is hidden; the hidden ones share `hidden_total` evenly."""
    if not counts:
        return _frame(())
    hidden = sum(count is None for count in counts)
    hidden_height = hidden_total / hidden if hidden else 0.0
    heights = [hidden_height if count is None else float(count) for count in counts]
    top = max(max(heights), 1.0)
    gap = GAP if len(counts) <= 12 else 0.0
    width = (1 - gap * (len(counts) - 1)) / len(counts)
    bars = []
    for place, (count, height) in enumerate(zip(counts, heights, strict=True)):
        bars.append(_bar(place * (width + gap), width, TALLEST * height / top, count is None))
    return _frame(bars)


def number(values: np.ndarray, small: int) -> Markup:
    """Equal-width bins over the values, (rows,) float64, blanks as nan. Bins with under `small` rows are hatched."""
    present = values[np.isfinite(values)]
    if present.size == 0:
        return _frame(())
    counts = _bins(present, min(BINS, max(4, present.size // small)))
    top = max(int(counts.max()), small)
    bars = []
    for place, count in enumerate(counts.tolist()):
        if count == 0:
            continue
        shown = float(count) if count >= small else small / 2
        bars.append(_bar(place / counts.size, 1 / counts.size, round(TALLEST * shown / top), count < small))
    return _frame(bars)


def _bins(present: np.ndarray, most: int) -> np.ndarray:
    """Counts in at most `most` bins of one width. Whole numbers get bins that hold equally many of them."""
    low, high = float(present.min()), float(present.max())
    if high <= low:
        return np.array([present.size])
    if high - low < WHOLE and bool((present == np.round(present)).all()):
        held = int(high - low) // most + 1  # whole numbers in a bin
        return np.bincount((present - low).astype(np.int64) // held)
    along = (present / 2 - low / 2) / (high / 2 - low / 2)  # halves, so that no difference overflows
    return np.bincount(np.minimum((along * most).astype(np.int64), most - 1), minlength=most)


def plain() -> Markup:
    """A column that is left out: one even block, since its values are not counted."""
    return _frame([_bar(0.0, 1.0, TALLEST / 2, False)])


def hatching() -> Markup:
    """The pattern of hidden bars, once a page."""
    pattern = tag(
        "pattern",
        tag("path", d="M0 0V6", stroke=FAR, stroke_width=1.5),
        id="hidden-count",
        width=6,
        height=6,
        patternUnits="userSpaceOnUse",
        patternTransform="rotate(45)",
    )
    return tag("svg", tag("defs", pattern), width=0, height=0, aria_hidden="true", class_="defs")


def _bar(x: float, width: float, height: float, hidden: bool) -> Markup:
    return tag(
        "rect",
        x=percent(x),
        width=percent(width),
        y=BASE - height,
        height=height,
        fill="url(#hidden-count)" if hidden else TINT,
        stroke=LINE,
        stroke_width=1.5,
        stroke_dasharray="3 3" if hidden else None,
    )


def _frame(bars: Sequence[Markup]) -> Markup:
    base = line(0, "100%", BASE, BASE, stroke=INK, stroke_width=1.5)
    return tag("svg", join(bars), base, class_="hist", height=HEIGHT, aria_hidden="true")
