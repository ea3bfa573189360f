"""The beam: a graduated rule. Here it carries the share of a job that is done."""

from __future__ import annotations

from markupsafe import Markup

from app.drawing.svg import INK, RULE, join, line, percent, tag

RULE_AT = 22  # y of the rule, px


def ticks(steps: int, at: float) -> Markup:
    """Graduation of the whole width in `steps` steps, longer at every fifth and tenth, hanging from y = `at`."""
    kinds: dict[tuple[int, float, str | None], list[int]] = {}
    for step in range(steps + 1):
        kind = (12, 1.5, None) if step % 10 == 0 else (8, 1.0, None) if step % 5 == 0 else (4, 1.0, "t1")
        kinds.setdefault(kind, []).append(step)
    drawn = [
        tag(
            "path",
            d="".join(f"M{place} 0v{length}" for place in places),
            stroke=INK,
            stroke_width=width,
            class_=hidden,
            vector_effect="non-scaling-stroke",
        )
        for (length, width, hidden), places in kinds.items()
    ]
    return tag(
        "svg",
        join(drawn),
        y=at,
        width="100%",
        height=12,
        viewBox=f"0 0 {steps} 12",
        preserveAspectRatio="none",
        overflow="visible",
    )


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
        ticks(100, RULE_AT),
        diamond,
        class_="beam progress",
        height=40,
        role="img",
        aria_label=f"{int(100 * done)} of 100 done: {words}",
    )
