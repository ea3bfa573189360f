"""Reliability: what was said against what was seen, ten dots over a beam."""

from __future__ import annotations

from collections.abc import Sequence

from markupsafe import Markup

from app.drawing.beam import ticks
from app.drawing.scale import Scale, rounded_outward
from app.drawing.svg import INK, LINE, PAPER, RULE, join, line, percent, tag
from engine.judging.calibration import Tenth

LEFT, RIGHT = 0.09, 0.99  # of the width, where the rule begins and ends
TOP, BOTTOM = 12.0, 300.0  # y of the highest share and of the rule, px
SHARES = Scale(0, 5, 0.2, 4, 100.0)


def reliability(tenths: Sequence[Tenth], words: str) -> Markup:
    """Said along, seen up, both 0 to 100.  words: the same for who cannot see it."""
    diagonal = line(percent(LEFT), percent(RIGHT), BOTTOM, TOP, stroke=LINE, stroke_width=1.5)
    dots = [_dot(LEFT + (RIGHT - LEFT) * each.said, each, SHARES) for each in tenths]
    figures = [
        tag(
            "text",
            str(share),
            x=percent(LEFT + (RIGHT - LEFT) * share / 100),
            y=BOTTOM + 30,
            text_anchor=_anchor(share),
        )
        for share in range(0, 101, 20)
    ]
    rule = tag("svg", ticks(100, 0), x=percent(LEFT), width=percent(RIGHT - LEFT), y=BOTTOM, overflow="visible")
    return _plot(_grid(SHARES), diagonal, *dots, rule, *figures, words=words)


def spread(tenths: Sequence[Tenth], words: str) -> Markup:
    """Shares of the records in each tenth of what was foreseen, over a line at one tenth."""
    up = rounded_outward(0.0, max(each.high for each in tenths))
    up = Scale(0, up.last, up.step, up.fine, 100.0)
    even = BOTTOM - (BOTTOM - TOP) * up.place(0.1)
    level = line(percent(LEFT), percent(RIGHT), even, even, stroke=LINE, stroke_width=1.5)
    width = RIGHT - LEFT
    dots = [_dot(LEFT + width * (place + 0.5) / len(tenths), each, up) for place, each in enumerate(tenths)]
    figures = [
        tag("text", words, x=percent(LEFT + width * at), y=BOTTOM + 30, text_anchor=anchor)
        for at, words, anchor in ((0.0, "lowest", "start"), (0.5, "middle", "middle"), (1.0, "highest", "end"))
    ]
    rule = tag("svg", ticks(10, 0), x=percent(LEFT), width=percent(width), y=BOTTOM, overflow="visible")
    return _plot(_grid(up), level, *dots, rule, *figures, words=words)


def _plot(*parts: Markup, words: str) -> Markup:
    base = line(percent(LEFT), percent(RIGHT), BOTTOM, BOTTOM, stroke_width=3)
    return tag("svg", join(parts), base, class_="plot", height=BOTTOM + 36, role="img", aria_label=words)


def _grid(up: Scale) -> Markup:
    drawn = []
    for tick in up.ticks():
        if tick.rank == 0:
            y = BOTTOM - (BOTTOM - TOP) * tick.place
            drawn.append(line(percent(LEFT), percent(RIGHT), y, y, stroke=RULE))
            drawn.append(tag("text", tick.words, x=percent(LEFT - 0.015), y=y + 5, text_anchor="end"))
    return join(drawn)


def _dot(x: float, tenth: Tenth, up: Scale) -> Markup:
    low, seen, high = (BOTTOM - (BOTTOM - TOP) * up.place(each) for each in (tenth.low, tenth.seen, tenth.high))
    return join(
        [
            line(percent(x), percent(x), low, high, stroke_width=1.5),
            tag("circle", cx=percent(x), cy=seen, r=5.5, fill=INK, stroke=PAPER, stroke_width=1.25),
        ]
    )


def _anchor(share: int) -> str:
    return "start" if share == 0 else "end" if share == 100 else "middle"
