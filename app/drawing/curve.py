"""The size curve: score against links, with the beam as its axis."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from markupsafe import Markup

from app.drawing.svg import INK, LINE, PAPER, RULE, join, line, percent, tag

HEIGHT, TOP, BOTTOM, AXIS = 300.0, 40.0, 245.0, 260.0
LEFT, RIGHT = 0.13, 0.985  # of the width


@dataclass(frozen=True)
class Point:
    """One budget: links, score and held-out score in nats a record (held_out and its error None when not measured)."""

    links: int
    score: float
    held_out: float | None = None
    error: float | None = None


def size_curve(points: Sequence[Point], recommended: int | None, shown: int | None = None) -> Markup:
    """The best model of each size on these records (line) and on held-out records (dots with bars).

    recommended: gets the diamond.  shown: the budget looked at, marked by a thin rule when it is another.
    """
    scale = _Scale.around(points)
    parts: list[Markup] = []
    for value, words in scale.grid():
        y = scale.y(value)
        parts += [
            tag("text", words, x=0, y=y + 5),
            line(percent(LEFT), percent(RIGHT), y, y, stroke=RULE),
        ]
    path = " ".join(f"{100 * scale.x(point.links):.2f} {scale.y(point.score):.1f}" for point in points)
    if len(points) > 1:
        drawn = tag("path", d=f"M{path}", fill="none", stroke=INK, stroke_width=2, vector_effect="non-scaling-stroke")
        box = f"0 0 100 {HEIGHT:.0f}"
        parts.append(tag("svg", drawn, viewBox=box, preserveAspectRatio="none", width="100%", height=HEIGHT))
    parts.append(_axis(scale))
    if shown is not None and shown != recommended:
        x = percent(scale.x(shown))
        parts.append(line(x, x, TOP - 8, AXIS, stroke=LINE, stroke_width=1.5, stroke_dasharray="2 3"))
    if recommended is not None:
        parts.append(_recommended(scale.x(recommended), recommended))
    parts += [_held_out(scale, point) for point in _thinned(points, recommended)]
    return tag(
        "svg",
        join(parts),
        class_="plot",
        height=HEIGHT,
        role="img",
        aria_label="Size curve. Its numbers are in the table.",
    )


def figure(points: Sequence[Point], recommended: int | None) -> dict[str, object]:
    """The same curve for exploring in the browser, as plain data. It holds numbers and our own words only."""
    measured = [point for point in points if point.held_out is not None]
    mark: list[dict[str, object]] = [
        {
            "type": "line",
            "x0": recommended,
            "x1": recommended,
            "yref": "paper",
            "y0": 0,
            "y1": 1,
            "line": {"width": 2, "color": INK},
        }
    ]
    axis: dict[str, object] = {"gridcolor": RULE, "zeroline": False, "linecolor": INK, "ticks": "outside"}
    return {
        "data": [
            {
                "type": "scatter",
                "mode": "lines",
                "name": "on these records",
                "x": [point.links for point in points],
                "y": [point.score for point in points],
                "line": {"width": 2, "color": INK},
            },
            {
                "type": "scatter",
                "mode": "markers",
                "name": "on held-out records",
                "x": [point.links for point in measured],
                "y": [point.held_out for point in measured],
                "error_y": {
                    "type": "data",
                    "array": [point.error or 0.0 for point in measured],
                    "color": LINE,
                    "width": 3,
                },
                "marker": {"size": 8, "color": PAPER, "line": {"width": 1.5, "color": INK}},
            },
        ],
        "layout": {
            "paper_bgcolor": PAPER,
            "plot_bgcolor": PAPER,
            "font": {
                "size": 14,
                "color": INK,
                "family": "Segoe UI, Avenir Next, Helvetica Neue, Noto Sans, sans-serif",
            },
            "height": 460,
            "margin": {"l": 70, "r": 20, "t": 20, "b": 60},
            "xaxis": {**axis, "title": {"text": "links"}},
            "yaxis": {**axis, "title": {"text": "score a record"}},
            "legend": {"orientation": "h", "y": 1.08},
            "shapes": mark if recommended is not None else [],
        },
    }


@dataclass(frozen=True)
class _Scale:
    low: float
    high: float
    most: int  # links at the right end of the beam

    @classmethod
    def around(cls, points: Sequence[Point]) -> _Scale:
        values = [point.score for point in points]
        for point in points:
            if point.held_out is not None:
                values += [point.held_out - (point.error or 0.0), point.held_out + (point.error or 0.0)]
        low, high = (min(values), max(values)) if values else (-1.0, 0.0)
        if high - low < 1e-9:
            low, high = low - 0.5, high + 0.5
        return cls(low, high, max((point.links for point in points), default=0) or 1)

    def x(self, links: float) -> float:
        return LEFT + (RIGHT - LEFT) * links / self.most

    def y(self, score: float) -> float:
        return BOTTOM - (BOTTOM - TOP) * (score - self.low) / (self.high - self.low)

    def grid(self) -> list[tuple[float, str]]:
        """Two to six round scores inside the range, with their words."""
        step = _round_step((self.high - self.low) / 2.5, up=False)
        digits = max(0, -math.floor(math.log10(step)))
        first = math.ceil(self.low / step)
        return [(step * i, figure_words(step * i, digits)) for i in range(first, math.floor(self.high / step) + 1)]


def figure_words(value: float, digits: int) -> str:
    """A number for the eye: a true minus sign, so many decimals."""
    return f"{value:.{digits}f}".replace("-", "−")


def _round_step(rough: float, up: bool = True) -> float:
    """The next 1, 2 or 5 times a power of ten, upward or downward."""
    power = 10.0 ** math.floor(math.log10(rough))
    if up:
        return next(power * factor for factor in (1, 2, 5, 10) if power * factor >= rough * 0.999)
    return next(power * factor for factor in (5, 2, 1) if power * factor <= rough * 1.001)


def _axis(scale: _Scale) -> Markup:
    every = next(step for step in (1, 2, 5, 10, 20, 50, 100, 200, 500) if scale.most / step <= 64)
    figures = max(every, int(_round_step(scale.most / 6))) if scale.most > 6 else every
    parts = [line(percent(LEFT), percent(RIGHT), AXIS, AXIS, stroke_width=3)]
    for links in range(0, scale.most + 1, every):
        long = links % figures == 0
        x = percent(scale.x(links))
        parts.append(
            line(x, x, AXIS, AXIS + (10 if long else 5), stroke_width=1.5 if long else 1, class_=None if long else "t1")
        )
        if long:
            parts.append(tag("text", links, x=x, y=AXIS + 28, text_anchor="middle"))
    return join(parts)


def _recommended(x: float, links: int) -> Markup:
    at = percent(x)
    words = tag(
        "text",
        f"recommended, {links}",
        x=-16 if x > 0.4 else 16,
        y=5,
        text_anchor="end" if x > 0.4 else "start",
        font_weight=600,
    )
    diamond = tag("path", d="M0 -8 8 0 0 8 -8 0Z", fill=INK)
    return join([line(at, at, 14, AXIS, stroke_width=2), tag("svg", diamond, words, x=at, y=14, overflow="visible")])


def _held_out(scale: _Scale, point: Point) -> Markup:
    assert point.held_out is not None
    x, y, error = percent(scale.x(point.links)), scale.y(point.held_out), point.error or 0.0
    return join(
        [
            line(x, x, scale.y(point.held_out + error), scale.y(point.held_out - error), stroke=LINE, stroke_width=1.5),
            tag("circle", cx=x, cy=y, r=3.5, fill=PAPER, stroke=INK, stroke_width=1.5),
        ]
    )


def _thinned(points: Sequence[Point], recommended: int | None) -> list[Point]:
    """At most about forty dots, so that they stay apart; the recommended one is always among them."""
    measured = [point for point in points if point.held_out is not None]
    step = max(1, math.ceil(len(measured) / 40))
    return [point for place, point in enumerate(measured) if place % step == 0 or point.links == recommended]
