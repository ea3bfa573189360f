"""The bars of one value: as recorded, among these, if set, with whiskers for doubt. Only numbers go in."""

from __future__ import annotations

from collections.abc import Callable
from typing import Protocol

from markupsafe import Markup

HEIGHT = 28
SEEN, SET, INK, LINE, RULE, PAPER = "#0072B2", "#D55E00", "#1B1E22", "#6B7077", "#D3CFC4", "#FBFAF6"
GROUND = (
    f'<line x1="0" x2="100%" y1="26" y2="26" stroke="{RULE}"/>'
    f'<line x1="100%" x2="100%" y1="21" y2="26.5" stroke="{RULE}"/>'
)
ZERO = f'<line x1=".75" x2=".75" y1="0" y2="27" stroke="{INK}" stroke-width="1.5"/>'
SURE = 0.0005  # a share this close to none or all has neither whisker nor end mark


class Bar(Protocol):
    """A share with its interval, all 0 to 1; inner: the narrower one inside it, None where there is but one."""

    @property
    def point(self) -> float: ...
    @property
    def low(self) -> float: ...
    @property
    def high(self) -> float: ...
    @property
    def inner(self) -> tuple[float, float] | None: ...


def bars(recorded: float, among: Bar | None = None, set_to: Bar | None = None) -> Markup:
    """One row's drawing; `among` without pins and `set_to` without levers are None and leave no bar."""
    drawn = [GROUND, f'<rect x="0" y="1" width="{_per_cent(recorded)}" height="25" fill="none" stroke="{LINE}" ']
    drawn.append('stroke-width="1.5"/>')
    both = among is not None and set_to is not None
    if among is not None:
        drawn.append(_bar(among, 4.5 if both else 9.0, 8 if both else 9, SEEN, _disc))
    if set_to is not None:
        drawn.append(_bar(set_to, 14.5 if both else 9.0, 8 if both else 9, SET, _diamond))
    drawn.append(ZERO)
    # numbers only were written above
    return Markup(f'<svg class="bar" height="{HEIGHT}" aria-hidden="true">{"".join(drawn)}</svg>')


def _bar(bar: Bar, y: float, height: int, colour: str, mark: Callable[[float, float], str]) -> str:
    middle = y + height / 2
    drawn = f'<rect x="0" y="{y:g}" width="{_per_cent(bar.point)}" height="{height}" fill="{colour}"/>'
    if SURE < bar.point < 1 - SURE:
        drawn += whisker(_per_cent, bar.low, bar.high, bar.inner, middle)
        drawn += mark(bar.point, middle)
    return drawn


def whisker(place: Callable[[float], str], low: float, high: float, inner: tuple[float, float] | None, y: float) -> str:
    """The interval over sampled models as a light line, and the one within the model as a heavy one over it.

    inner: None where `low` to `high` is the one within the model.  place: where a value stands.
    """
    lines = [(low, high, 2.5)] if inner is None else [(low, high, 1.0), (*inner, 2.5)]
    return "".join(
        f'<line x1="{place(start)}" x2="{place(end)}" y1="{y:g}" y2="{y:g}" stroke="{INK}" stroke-width="{width:g}"/>'
        for start, end, width in lines
        if end > start
    )


def _disc(share: float, y: float) -> str:
    return f'<circle cx="{_per_cent(share)}" cy="{y:g}" r="4.5" fill="{SEEN}" stroke="{PAPER}" stroke-width="1.25"/>'


def _diamond(share: float, y: float) -> str:
    return (
        f'<svg x="{_per_cent(share)}" y="{y:g}" overflow="visible"><path d="M0-6 6 0 0 6-6 0Z" fill="{SET}" '
        f'stroke="{PAPER}" stroke-width="1.25"/></svg>'
    )


def _per_cent(share: float) -> str:
    """A length; what lies outside 0 to 1 by rounding is drawn at the edge."""
    return f"{100 * min(max(share, 0.0), 1.0):.4g}%"
