"""Score gains over the base rate: a zero line, a dot with its whisker, a notch for the yardstick."""

from __future__ import annotations

from collections.abc import Sequence

from markupsafe import Markup

from app.drawing.scale import Scale, rounded_outward
from app.drawing.svg import INK, PAPER, RULE, join, line, percent, tag
from engine.judging.judgement import ColumnScore

DOTS = "#B9B5AA"


def scale(scores: Sequence[ColumnScore]) -> Scale:
    """An axis in score points that holds every gain, its interval and its yardstick."""
    ends = [0.0, 1.0]
    for each in scores:
        ends += [100 * each.gain.low, 100 * each.gain.high]
        if each.yardstick is not None:
            ends.append(100 * each.yardstick.mean)
    return rounded_outward(min(ends), max(ends))


def axis(points: Scale) -> Markup:
    """The rule over the rows with its figures."""
    drawn = [line(0, "100%", 28.5, 28.5, stroke_width=3)]
    for tick in points.ticks():
        at = percent(tick.place)
        drawn.append(line(at, at, 18 if tick.rank == 0 else 23, 28, stroke_width=1.5 if tick.rank == 0 else 1))
        if tick.words:
            anchor = "start" if tick.place == 0 else "end" if tick.place == 1 else "middle"
            whole = round(points.low / points.step + tick.place * (points.last - points.first))
            hidden = "t10" if whole % 2 else None
            drawn.append(tag("text", tick.words, x=at, y=13, text_anchor=anchor, class_=hidden))
    return tag("svg", join(drawn), class_="wplot", height=30, aria_hidden="true")


def row(score: ColumnScore, points: Scale) -> Markup:
    """One column's gain; its figures stand beside it."""
    at, zero = points.place(100 * score.gain.mean), points.place(0.0)
    drawn = []
    for tick in points.ticks():
        if tick.rank == 0:
            x = percent(tick.place)
            own = abs(tick.place - zero) < 1e-9
            drawn.append(line(x, x, 0, "100%", stroke=INK if own else RULE, stroke_width=2 if own else 1))
    drawn.append(
        line(percent(zero), percent(at), "50%", "50%", stroke=DOTS, stroke_width=1.5, stroke_dasharray="1.5 3")
    )
    low, high = points.place(100 * score.gain.low), points.place(100 * score.gain.high)
    drawn.append(line(percent(low), percent(high), "50%", "50%", stroke_width=1.5))
    if score.yardstick is not None:
        notch = tag("path", d="M0-10V10", stroke=INK, stroke_width=3)
        drawn.append(
            tag("svg", notch, x=percent(points.place(100 * score.yardstick.mean)), y="50%", overflow="visible")
        )
    dot = tag("circle", r=5.5, fill=INK, stroke=PAPER, stroke_width=1.25)
    drawn.append(tag("svg", dot, x=percent(at), y="50%", overflow="visible"))
    return tag("svg", join(drawn), class_="wplot", height=34, aria_hidden="true")
