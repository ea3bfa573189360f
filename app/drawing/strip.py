"""The strip of a number: its distribution in every world, the cuts of its bands, its means. Only numbers go in."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from markupsafe import Markup

from app.drawing.answer_beam import World
from app.drawing.bars import INK, LINE, PAPER, SEEN, SET, whisker
from app.drawing.scale import Scale

HEIGHT, BASE, TALLEST = 68, 44.0, 40.0  # px: of the strip, down to the base, from there up to the top of a curve
DISC, DIAMOND = 52, 61  # heights of the means
POINTS = 97  # of a curve
LEAST = 0.01  # of the whole: a single value held by fewer is not drawn
Drawn = tuple[np.ndarray, tuple[tuple[float, float], ...]]  # density and spikes of a Curve
STROKES = {
    "recorded": f'stroke="{LINE}" stroke-width="1.5"',
    "among": f'stroke="{SEEN}" stroke-width="2"',
    "set": f'stroke="{SET}" stroke-width="2.25" stroke-dasharray="6 2.5"',
}


@dataclass(frozen=True, eq=False)
class Curve:
    """A number in one world.

    density: (POINTS,) at `places` of the scale.  spikes: (value, share of the whole) of values held by many at once.
    mean, low, high, inner: its mean with the interval, and the narrower one inside it, in its own unit.
    """

    world: World
    density: np.ndarray
    spikes: Sequence[tuple[float, float]]
    mean: float
    low: float
    high: float
    inner: tuple[float, float] | None = None


def places(scale: Scale) -> np.ndarray:
    """(POINTS,) the values at which curves are drawn."""
    return np.linspace(scale.low, scale.high, POINTS)


def strip(curves: Sequence[Curve], cuts: Sequence[float], scale: Scale) -> Markup:
    """The drawing. curves: as recorded first, then among these and if set where they are shown; cuts: of its bands."""
    top = max((float(curve.density.max()) for curve in curves), default=0.0)
    drawn = ['<svg viewBox="0 0 100 44" width="100%" height="44" preserveAspectRatio="none">']
    outlines = [(curve, _outline(curve.density, top)) for curve in curves]
    drawn += [
        f'<path d="M0 44 L{outline} L100 44Z" fill="{SEEN}" fill-opacity=".16"/>'
        for curve, outline in outlines
        if curve.world == "among" and outline
    ]
    drawn += [
        f'<path d="M{outline}" fill="none" {STROKES[curve.world]} vector-effect="non-scaling-stroke"/>'
        for curve, outline in outlines
        if outline
    ]
    drawn.append("</svg>")
    for cut in cuts:
        if scale.low < cut < scale.high:
            x = _x(cut, scale)
            drawn.append(f'<line x1="{x}" x2="{x}" y1="6" y2="44" stroke="{LINE}" stroke-dasharray="1 3"/>')
    for curve in curves:
        for value, share in curve.spikes:
            if share >= LEAST:
                x, y = _x(value, scale), BASE - TALLEST * min(share, 1.0)
                drawn.append(f'<line x1="{x}" x2="{x}" y1="44" y2="{y:.1f}" {STROKES[curve.world]}/>')
    drawn.append(f'<line x1="0" x2="100%" y1="44" y2="44" stroke="{INK}" stroke-width="1.5"/>')
    drawn += [_mean(curve, scale) for curve in curves if curve.world != "recorded"]
    # numbers only were written above
    return Markup(f'<svg class="strip" height="{HEIGHT}" aria-hidden="true">{"".join(drawn)}</svg>')


def _outline(density: np.ndarray, top: float) -> str:
    """The curve as points of a path; empty where there is none."""
    if not top > 0.0 or not density.any():
        return ""
    heights = BASE - TALLEST * density / top
    return " ".join(f"{x:.4g} {y:.1f}" for x, y in zip(np.linspace(0.0, 100.0, POINTS), heights, strict=True))


def _mean(curve: Curve, scale: Scale) -> str:
    y, x = DISC if curve.world == "among" else DIAMOND, _x(curve.mean, scale)
    drawn = whisker(lambda value: _x(value, scale), curve.low, curve.high, curve.inner, y)
    look = f'stroke="{PAPER}" stroke-width="1.25"'
    if curve.world == "among":
        return f'{drawn}<circle cx="{x}" cy="{y}" r="4" fill="{SEEN}" {look}/>'
    return f'{drawn}<svg x="{x}" y="{y}" overflow="visible"><path d="M0-5 5 0 0 5-5 0Z" fill="{SET}" {look}/></svg>'


def _x(value: float, scale: Scale) -> str:
    return f"{100 * scale.place(value):.4g}%"
