"""SVG as text: every attribute and every word in it is escaped here, and nowhere else."""

from __future__ import annotations

from collections.abc import Iterable

from markupsafe import Markup, escape

INK, LINE, FAR, RULE, PAPER, TINT = "#1B1E22", "#6B7077", "#8A8F96", "#D3CFC4", "#FBFAF6", "#F3F1EA"


def tag(name: str, *children: object, **attributes: object) -> Markup:
    """One element. `stroke_width` becomes stroke-width, `class_` class; an attribute that is None is left out."""
    written = Markup("").join(
        Markup(' {}="{}"').format(_attribute(key), _number(value))
        for key, value in attributes.items()
        if value is not None
    )
    if not children:
        return Markup("<{0}{1}/>").format(Markup(name), written)
    return Markup("<{0}{1}>{2}</{0}>").format(Markup(name), written, join(children))


def join(parts: Iterable[object]) -> Markup:
    """The parts after one another; what is not markup yet is escaped."""
    return Markup("").join(escape(part) for part in parts)


def percent(share: float) -> str:
    """A share of the width, 0 to 1, as an attribute."""
    return f"{100 * share:.2f}%"


def line(x1: object, x2: object, y1: object, y2: object, **attributes: object) -> Markup:
    return tag("line", x1=x1, x2=x2, y1=y1, y2=y2, **{"stroke": INK, **attributes})


def _attribute(key: str) -> Markup:
    special = {"viewBox", "preserveAspectRatio", "patternUnits", "patternTransform"}
    return Markup(key if key in special else key.rstrip("_").replace("_", "-"))


def _number(value: object) -> object:
    return f"{value:.2f}".rstrip("0").rstrip(".") if isinstance(value, float) else value
