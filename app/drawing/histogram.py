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


def number(values: np.ndarray, small: int, cuts: Sequence[float] = ()) -> Markup:
    """Equal-width bins over the values, (rows,) float64, blanks as nan; dotted lines where bands are cut.

    Bins with under `small` rows are hatched.
    """
    present = values[np.isfinite(values)]
    if present.size == 0:
        return _frame(())
    counts, high = _bins(present, min(BINS, max(4, present.size // small)))
    top = max(int(counts.max()), small)
    heights = [max(1, round(TALLEST * count / top)) if count >= small else 0 for count in counts.tolist()]
    drawn = [_outline(heights)]
    for place, count in enumerate(counts.tolist()):
        if 0 < count < small:
            drawn.append(_bar(place / counts.size, 1 / counts.size, round(TALLEST * small / 2 / top), True))
    low = float(present.min())
    wide = high / 2 - low / 2  # halves, so that no difference overflows
    return _frame([*drawn, *(_cut((cut / 2 - low / 2) / wide) for cut in cuts if wide > 0 and low < cut < high)])


def _bins(present: np.ndarray, most: int) -> tuple[np.ndarray, float]:
    """Counts in at most `most` bins of one width, from the smallest value on, and where the last bin ends.

    Whole numbers get bins that hold equally many of them.
    """
    low, high = float(present.min()), float(present.max())
    if high <= low:
        return np.array([present.size]), high
    if high - low < WHOLE and bool((present == np.round(present)).all()):
        held = int(high - low) // most + 1  # whole numbers in a bin
        counts = np.bincount((present - low).astype(np.int64) // held)
        return counts, low + float(counts.size * held)
    along = (present / 2 - low / 2) / (high / 2 - low / 2)  # halves, so that no difference overflows
    return np.bincount(np.minimum((along * most).astype(np.int64), most - 1), minlength=most), high


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


def _outline(heights: Sequence[int]) -> Markup:
    """Bins that touch, as one stepped shape; a number knows no gaps. Stretched to the width by the browser."""
    steps = "".join(f"V{BASE - height:g}H{place + 1}" for place, height in enumerate(heights))
    shape = tag(
        "path",
        d=f"M0 {BASE:g}{steps}V{BASE:g}",
        fill=TINT,
        stroke=LINE,
        stroke_width=1.5,
        vector_effect="non-scaling-stroke",
    )
    box = f"0 0 {len(heights)} {HEIGHT}"
    return tag("svg", shape, width="100%", height=HEIGHT, viewBox=box, preserveAspectRatio="none", overflow="visible")


def _cut(x: float) -> Markup:
    """Where one band ends and the next begins."""
    return line(percent(x), percent(x), 0, BASE, stroke=INK, stroke_dasharray="1.5 3", class_="cut")


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
