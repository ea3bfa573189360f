"""Numbers as linear functions of independent standard normals: added up link by link, then given values one by one.

Every number is offset + sum over noises of coefficient x noise. A value turns the noises so that one of them alone
carries it (a Householder reflection) and fixes that one: the square-root form of the Kalman update, which subtracts
no variances and so keeps its digits (Golub & Van Loan 2013, section 5.1; Lauritzen & Jensen 2001 for the use).
All arrays broadcast over (levels of the categories..., draws).
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.answering.normal import HALF_LOG_TWO_PI

Floats = NDArray[np.float64]

TINY = 1e-12  # a spread, against what it was before any value was given, that is rounding and taken as none
NEAR = 1e-9  # how far a value may be, against the sizes involved, from what it follows exactly


@dataclass(frozen=True, eq=False)
class Line:
    """One number. size: its standard deviation before any value was given."""

    offset: Floats
    row: dict[int, Floats]  # noise -> coefficient
    size: Floats


@dataclass(frozen=True, eq=False)
class Given:
    """What values make of numbers.

    log_density: of the values.  certain: how many of the values are what their numbers could only be.
    lines: numbers given the values.
    """

    log_density: Floats
    certain: NDArray[np.int64]
    lines: dict[str, Line]


def following(offset: Floats, terms: Iterable[tuple[Floats, Line]], noise: int, sd: Floats) -> Line:
    """A number: offset + sum of slope x number + sd x a noise of its own."""
    row: dict[int, Floats] = {}
    for slope, line in terms:
        offset = offset + slope * line.offset
        for place, coefficient in line.row.items():
            part = slope * coefficient
            row[place] = row[place] + part if place in row else part
    if np.any(sd > 0.0):
        row[noise] = sd
    return Line(offset, row, spread(row))


def spread(row: dict[int, Floats]) -> Floats:
    """Standard deviation of a combination of noises."""
    total: Floats = np.zeros(1)
    for coefficient in row.values():
        total = total + coefficient * coefficient
    return np.sqrt(total)


def steady(line: Line) -> Floats:
    """Standard deviation of a number, 0 where only rounding is left."""
    found = spread(line.row)
    return np.where(found > TINY * line.size, found, 0.0)


def together(one: Line, other: Line) -> Floats:
    """Covariance of two numbers."""
    total: Floats = np.zeros(1)
    for place, coefficient in one.row.items():
        if place in other.row:
            total = total + coefficient * other.row[place]
    return total


def apart(one: Line, slope: Floats, other: Line) -> Floats:
    """Standard deviation of one - slope x other, 0 where only rounding is left."""
    row = dict(one.row)
    for place, coefficient in other.row.items():
        part = -slope * coefficient
        row[place] = row[place] + part if place in row else part
    found = spread(row)
    return np.where(found > TINY * np.maximum(one.size, np.abs(slope) * other.size), found, 0.0)


def given(lines: dict[str, Line], values: Sequence[tuple[str, float]]) -> Given:
    """Give numbers their values, one at a time. The numbers with values drop out."""
    lines = dict(lines)
    log_density: Floats = np.zeros(1)
    certain: NDArray[np.int64] = np.zeros(1, dtype=np.int64)
    for name, value in values:
        seen = lines.pop(name)
        away = value - seen.offset
        sd = steady(seen)
        fixed = sd == 0.0
        near = np.abs(away) <= NEAR * np.maximum(seen.size, np.maximum(abs(value), np.abs(seen.offset)))
        with np.errstate(over="ignore"):
            noise = away / np.where(fixed, 1.0, sd)
            density = -0.5 * noise * noise - np.log(np.where(fixed, 1.0, sd)) - HALF_LOG_TWO_PI
        log_density = log_density + np.where(fixed, np.where(near, 0.0, -np.inf), density)
        certain = certain + (fixed & near)
        lines = _turned(lines, seen.row, sd, np.where(fixed, 0.0, noise), fixed)
    return Given(log_density, certain, lines)


def _turned(
    lines: dict[str, Line], row: dict[int, Floats], sd: Floats, noise: Floats, fixed: NDArray[np.bool_]
) -> dict[str, Line]:
    """Turn the noises so that the first of `row` carries it all, and fix that one; where `fixed`, change nothing."""
    if not row:
        return lines
    pivot = next(iter(row))
    lead = row[pivot]
    sign = np.where(lead < 0.0, -1.0, 1.0)
    alone = len(row) == 1
    reflector = {} if alone else {**row, pivot: lead + sign * sd}
    with np.errstate(divide="ignore"):
        scale = np.where(fixed, 0.0, 1.0 / np.where(fixed, 1.0, sd * (sd + np.abs(lead))))
    carried = sign * noise if alone else -sign * noise
    found: dict[str, Line] = {}
    for name, line in lines.items():
        turned = dict(line.row)
        shared = [place for place in reflector if place in turned]
        if shared:
            along: Floats = np.zeros(1)
            for place in shared:
                along = along + turned[place] * reflector[place]
            along = along * scale
            for place, part in reflector.items():
                moved = -along * part
                turned[place] = turned[place] + moved if place in turned else moved
        if pivot not in turned:
            found[name] = line
            continue
        coefficient = turned.pop(pivot)
        if np.any(fixed):
            turned[pivot] = np.where(fixed, coefficient, 0.0)
        found[name] = Line(line.offset + np.where(fixed, 0.0, coefficient) * carried, turned, line.size)
    return found
