"""A number's unit behind its figures. Plurals are the user's text: the unit is repeated as it was stated."""

from __future__ import annotations

from engine.records.bands import EVERYTHING

CLOSE = ("%", "‰", "°")  # a unit that begins so follows its figure without a space
OVER = " and over"


def behind(unit: str) -> str:
    """What follows a figure in this unit: " minutes", "% of evenings", nothing where none is stated."""
    return f"{'' if unit.startswith(CLOSE) else ' '}{unit}" if unit else ""


def apart(difference: str, unit: str) -> str:
    """A difference in words, from its figure: +2 minutes; of per cent it is in points, as for shares."""
    if not unit.startswith("%"):
        return f"{difference}{behind(unit)}"
    return f"{difference} {'point' if difference.lstrip('+−') == '1' else 'points'}"


def of_change(unit: str) -> str:
    """The unit of a difference, by itself: minutes; points for per cent."""
    return "points" if unit.startswith("%") else unit


def band(level: str, unit: str) -> str:
    """A band, or a range in the same words, with its unit: 20 to under 45 minutes, 45 minutes and over."""
    if not unit or level == EVERYTHING:
        return level
    open_above = level.endswith(OVER)
    return f"{level.removesuffix(OVER)}{behind(unit)}{OVER if open_above else ''}"
