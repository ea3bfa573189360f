"""Links as arcs down a list of names: earlier columns above, every arc running downward."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from markupsafe import Markup

from app.drawing.svg import FAR, INK, PAPER, RULE, join, percent, tag

WIDTH, NAMES, DOTS = 404, 184, 196  # px: the drawing, where names end, where the dots stand
ROW, HEAD, FIRST = 34, 44, 6
WIDEST = 200
LONGEST_NAME = 22
STROKES = {"your order": None, "the data": "10 4", "nobody": "2 5"}
KEY = (
    ("your order", "your order settled it"),
    ("the data", "the data did, if nothing unrecorded"),
    ("nobody", "nobody did: the two go together"),
)


@dataclass(frozen=True)
class Arc:
    """One link. settled: a key of STROKES.  support: posterior probability, 0 to 1, told by the width."""

    source: str
    target: str
    settled: str
    support: float = 1.0


def arcs(
    stages: Sequence[tuple[str, Sequence[str]]],
    links: Sequence[Arc],
    addresses: Mapping[str, str],
    picked: str | None = None,
) -> Markup:
    """Stages with their columns, each in the order to draw; every link must run downward in it.

    addresses: column -> where its name leads.  picked: its arcs are drawn in ink, the rest quieter.
    """
    heads, places, height = _layout(stages)
    parts = [_head(number, name, y) for number, (name, y) in enumerate(heads, start=1)]
    ordered = sorted(links, key=lambda arc: picked in (arc.source, arc.target))  # picked ones on top
    parts += [_arc(places[arc.source], places[arc.target], arc, picked) for arc in ordered]
    parts += [_name(name, y, addresses[name], name == picked) for name, y in places.items()]
    return tag(
        "svg",
        join(parts),
        class_="arc",
        viewBox=f"0 0 {WIDTH} {height}",
        role="group",
        aria_label="Links drawn as arcs from earlier to later columns; the table lists them",
    )


def key() -> list[tuple[Markup, str]]:
    """A sample of each stroke with its words."""
    return [
        (
            tag(
                "svg",
                tag("path", d="M0 5h44", stroke=INK, stroke_width=2.5, stroke_dasharray=STROKES[settled]),
                width=44,
                height=10,
                aria_hidden="true",
            ),
            words,
        )
        for settled, words in KEY
    ]


def support_bar(share: float) -> Markup:
    """How sure of a link, as a bar; the figure beside it says the same."""
    return tag(
        "svg",
        tag("rect", x=0, y=0, width=percent(share), height=8, fill=INK),
        tag("path", d="M0 7.5H32", stroke=RULE, stroke_width=1),
        class_="supbar",
        width=32,
        height=8,
        aria_hidden="true",
    )


def _layout(stages: Sequence[tuple[str, Sequence[str]]]) -> tuple[list[tuple[str, int]], dict[str, int], int]:
    heads, places, y = [], {}, FIRST
    for name, columns in stages:
        heads.append((name, y))
        y += HEAD + 7
        for column in columns:
            places[column] = y
            y += ROW
        y += 3
    return heads, places, y


def _head(number: int, name: str, y: int) -> Markup:
    words = tag("text", tag("tspan", number, class_="si"), " ", _short(name, 30), x=10, y=y + 22, class_="sn")
    return join([tag("path", d=f"M0 {y}H{DOTS + 4}M1.5 {y - 7}v14", class_="st"), words])


def _arc(start: int, end: int, arc: Arc, picked: str | None) -> Markup:
    tall = (end - start) / 2
    wide = min(14 + 0.56 * tall, WIDEST)
    chosen = picked in (arc.source, arc.target)
    return tag(
        "path",
        d=f"M{DOTS} {start}A{wide:.1f} {tall:.1f} 0 0 1 {DOTS} {end}",
        fill="none",
        stroke=INK if chosen else FAR,
        stroke_width=1.0 + 3.0 * arc.support,
        stroke_dasharray=STROKES[arc.settled],
    )


def _name(name: str, y: int, address: str, picked: bool) -> Markup:
    dot = tag(
        "circle", cx=DOTS, cy=y, r=5.0 if picked else 3.5, fill=INK if picked else PAPER, stroke=INK, stroke_width=1.5
    )
    area = tag("rect", x=0, y=y - 15, width=DOTS + 8, height=30, fill="none", pointer_events="all")
    words = tag(
        "text", _short(name, LONGEST_NAME), x=NAMES, y=y + 5, text_anchor="end", class_="pk" if picked else None
    )
    full = tag("title", name) if len(name) > LONGEST_NAME else ""
    return tag("a", full, area, words, dot, href=address, aria_current="true" if picked else None)


def _short(name: str, longest: int) -> str:
    return name if len(name) <= longest else name[: longest - 1].rstrip() + "…"
