"""The beam: a graduated rule. Here it carries the share of a job that is done."""

from __future__ import annotations

from markupsafe import Markup

from app.drawing.svg import INK, RULE, join, line, percent, tag

RULE_AT = 22  # y of the rule, px


def ticks(start: float, end: float, steps: int, at: float, unit: str = "t1") -> Markup:
    """Graduation from `start` to `end` (shares of the width): `steps` steps, longer at every fifth and tenth."""
    drawn = []
    for step in range(steps + 1):
        x = percent(start + (end - start) * step / steps)
        length, width, hidden = (12, 1.5, None) if step % 10 == 0 else (8, 1, None) if step % 5 == 0 else (4, 1, unit)
        drawn.append(line(x, x, at, at + length, stroke_width=width, class_=hidden))
    return join(drawn)


def progress(fraction: float, words: str) -> Markup:
    """A job under way: the diamond at the share done. `fraction` is clipped to 0..1."""
    done = min(max(fraction, 0.0), 1.0)
    at = percent(done)
    diamond = tag(
        "svg", tag("path", d="M0 -9 9 0 0 9 -9 0Z", fill=INK), x=at, y=RULE_AT - 11, overflow="visible", class_="weight"
    )
    return tag(
        "svg",
        line(0, "100%", RULE_AT, RULE_AT, stroke=RULE, stroke_width=3),
        line(0, at, RULE_AT, RULE_AT, stroke_width=3),
        ticks(0, 1, 100, RULE_AT),
        diamond,
        class_="beam progress",
        height=40,
        role="img",
        aria_label=f"{int(100 * done)} of 100 done: {words}",
    )
