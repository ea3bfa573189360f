"""The beam of the answer: a graduated rule with a mark for every world, and the span between the two compared."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import cache
from typing import Literal

from markupsafe import Markup

from app.drawing.scale import PER_CENT, Scale, Tick
from app.drawing.svg import INK, LINE, PAPER, join, percent, tag

World = Literal["recorded", "among", "set"]
FIRST, STEP, BELOW, FIGURES = 16, 32, 34, 29  # px: the first row, between rows, under the rule, baseline of figures
COLOURS = {"recorded": LINE, "among": "#0072B2", "set": "#D55E00"}
INKS = {"recorded": INK, "among": "#005F96", "set": "#A34700"}
WIDE = 0.23  # of the width that the longest label takes on a wide page
NARROW = {"recorded": 0.46, "among": 0.46, "set": 0.27}  # and on 360 px
FIGURE = 0.18  # of 360 px that the figure alone takes
LETTERS, WIDER = 4, (0.011, 0.026)  # of a figure, all told in the above; what each more takes, wide and at 360 px
LETTER = 0.0115, 0.026  # of the width that a letter of a figure takes under the rule, wide and at 360 px
ROOM = 80  # letters of figures that stand clear of each other under the rule


@dataclass(frozen=True)
class Mark:
    """One world on the beam.

    words, figure: its label.  point, low, high: values on the scale.  inner: the narrower interval inside, where there
    is one.
    """

    world: World
    words: str
    figure: str
    point: float
    low: float
    high: float
    inner: tuple[float, float] | None = None


def answer_beam(
    marks: Sequence[Mark], told: str, compared: tuple[World, World] | None = None, scale: Scale = PER_CENT
) -> Markup:
    """The beam with its marks, first to last from above.

    told: what a screen reader says.  compared: the two worlds whose difference is shaded.  scale: of the marks.
    """
    marks = [_placed(mark, scale) for mark in marks]  # from here on every mark stands between 0 and 1
    rule = FIRST + STEP * (len(marks) - 1) + (24 if len(marks) > 1 else 26)
    places = {mark.world: (mark, FIRST + STEP * row) for row, mark in enumerate(marks)}
    drawn: list[Markup] = []
    if compared is not None:
        drawn.append(_between(places[compared[0]], places[compared[1]], rule))
    for mark, y in places.values():
        x = percent(mark.point)
        drawn.append(_line(x, x, y, rule, 1.5, COLOURS[mark.world]))
    above: list[float] = []
    for mark, y in places.values():
        drawn += [_whisker(mark, y), _shape(mark, y), _label(mark, y, above)]
        above.append(mark.point)
    drawn += [_line("0", "100%", rule, rule, 3), graduation(rule, scale)]
    return tag("svg", *drawn, class_="beam", height=rule + BELOW, role="img", aria_label=told)


@cache
def graduation(rule: int, scale: Scale = PER_CENT) -> Markup:
    """Ticks and figures under a rule at height `rule`; every other figure where they would run together."""
    drawn: list[Markup] = []
    ticks = scale.ticks()
    for tick in ticks:
        length, width, narrow = ((12, 1.5, ""), (8, 1.0, ""), (4, 1.0, "t1"))[tick.rank]
        x = f"{100 * tick.place:.6g}%"
        drawn.append(_line(x, x, rule, rule + length, width, shown=narrow))
    figures = [tick for tick in ticks if not tick.rank]
    crowded = sum(len(tick.words) + 1 for tick in figures) - len(scale.behind) > ROOM
    last = len(figures) - 1
    for place, tick in enumerate(figures):
        odd = (last - place) % 2 == 1 and place > 0
        covered = [place < last and _covered(tick, figures[last], letter) for letter in LETTER]
        if (odd and crowded) or covered[0]:
            continue
        anchor = "start" if place == 0 else "end" if place == last else "middle"
        classes = "figure t10" if odd or covered[1] else "figure"
        x = f"{100 * tick.place:.6g}%"
        drawn.append(tag("text", tick.words, class_=classes, x=x, y=rule + FIGURES, text_anchor=anchor))
    return join(drawn)


def _covered(tick: Tick, last: Tick, letter: float) -> bool:
    """Whether the last figure, which ends on the end of the rule, comes within a letter of this one."""
    own = len(tick.words) * (1.0 if tick.place == 0.0 else 0.5)
    return tick.place + (own + 1) * letter > 1.0 - len(last.words) * letter


def _line(x1: str, x2: str, y1: float, y2: float, width: float, colour: str = INK, shown: str = "") -> Markup:
    """A line; numbers and fixed words only, so that nothing in it needs escaping."""
    named = f' class="{shown}"' if shown else ""
    place = f'x1="{x1}" x2="{x2}" y1="{y1:g}" y2="{y2:g}"'
    return Markup(f'<line {place} stroke="{colour}" stroke-width="{width:g}"{named}/>')


def _between(start: tuple[Mark, int], end: tuple[Mark, int], rule: int) -> Markup:
    low, high = sorted((start[0].point, end[0].point))
    y = min(start[1], end[1])
    return tag(
        "rect",
        x=percent(low),
        y=y,
        width=percent(high - low),
        height=rule - y,
        fill=COLOURS["set"],
        fill_opacity=0.13,
    )


def _placed(mark: Mark, scale: Scale) -> Mark:
    place = scale.place
    inner = None if mark.inner is None else (place(mark.inner[0]), place(mark.inner[1]))
    return replace(mark, point=place(mark.point), low=place(mark.low), high=place(mark.high), inner=inner)


def _whisker(mark: Mark, y: int) -> Markup:
    """Ends stand on the interval that the sentence quotes; the narrower one within the model lies over it, heavier."""
    if mark.high <= mark.low:
        return Markup("")
    low, high = percent(mark.low), percent(mark.high)
    within = [] if mark.inner is None else [_line(percent(mark.inner[0]), percent(mark.inner[1]), y, y, 2.5)]
    return join(
        [
            _line(low, high, y, y, 2.5 if mark.inner is None else 1.0),
            *within,
            _line(low, low, y - 5, y + 5, 1.5),
            _line(high, high, y - 5, y + 5, 1.5),
        ]
    )


def _shape(mark: Mark, y: int) -> Markup:
    match mark.world:
        case "recorded":
            shape = tag("rect", x=-7, y=-6, width=14, height=12, fill=PAPER, stroke=LINE, stroke_width=2)
        case "among":
            shape = tag("circle", r=8, fill=COLOURS["among"])
        case _:
            shape = tag("path", d="M0-10 10 0 0 10-10 0Z", fill=COLOURS["set"])
    return tag("svg", shape, x=percent(mark.point), y=y, overflow="visible")


def _label(mark: Mark, y: int, stems: Sequence[float]) -> Markup:
    """Past the whisker, where it does not run over an end; past the stem of a mark above where one would cross it.

    Where a wide page and 360 px need different places both are drawn, and the stylesheet shows one; where 360 px are
    too tight for the words they get the figure alone.
    stems: places of the marks above, whose stems pass this row.
    """
    right, left = max(mark.high, mark.point), min(mark.low, mark.point)
    more, narrow_more = (max(len(mark.figure) - LETTERS, 0) * letter for letter in WIDER)
    wide = _place(left, right, WIDE + more, stems)
    slim, words = _place(left, right, NARROW[mark.world] + narrow_more, stems), "narrow"
    if slim is None:
        slim, words = _place(left, right, FIGURE + narrow_more, stems), "slim"
    rest = ("right", right) if 1 - right > left else ("left", left)
    wide, slim = wide or rest, slim or rest
    if wide == slim and words == "narrow":
        return _words(mark, y, *wide)
    return join([_words(mark, y, *place, shown) for shown, place in (("wide", wide), (words, slim))])


def _place(left: float, right: float, width: float, stems: Sequence[float]) -> tuple[str, float] | None:
    """Side and place where a label of this width starts clear of every stem; None where it fits on no side.

    Beside the whisker where that is clear on either side, the right one first; else past the stems, on the side where
    it stands nearer.
    """
    found = []
    for side, edge, sign in (("right", right, 1.0), ("left", left, -1.0)):
        start = edge
        for stem in sorted(stems, reverse=sign < 0):
            if 0.0 <= sign * (stem - start) < width:
                start = stem
        if (start + width <= 1.0) if sign > 0 else (start - width >= 0.0):
            found.append((abs(start - edge), side, start))
    if not found:
        return None
    _, side, start = min(found, key=lambda place: place[0])
    return side, start


def _words(mark: Mark, y: int, side: str, at: float, shown: str | None = None) -> Markup:
    figure = tag("tspan", mark.figure, font_weight=700, fill=INKS[mark.world])
    words = [] if shown == "slim" else [mark.words, " "]
    text = tag(
        "text",
        *words,
        figure,
        x=12 if side == "right" else -12,
        text_anchor=None if side == "right" else "end",
        class_="slim" if shown == "narrow" else shown,
    )
    return tag("svg", text, x=percent(at), y=y + 5.5, overflow="visible")
