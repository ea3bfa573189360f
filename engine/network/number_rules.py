"""A number's rules in plain words: its mean where configurations are alike, its slopes, and how far it spreads."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from math import floor, isfinite, log10

import numpy as np
from numpy.typing import NDArray

from engine.network.merging import RARE, Part, conditions, parts
from engine.network.network import Network
from engine.network.nodes import Node, Number
from engine.network.said import Said, Words, name, series
from engine.network.story import Rules
from engine.records.bands import YEARS
from engine.records.wording import figure

Floats = NDArray[np.float64]

UNIT = 4.0  # standard deviations that count as a share of 1 does, when configurations are merged
APART = 0.4  # standard deviations: what differs by more inside a part is told as a range
LIKE = 0.2  # standard deviations: slopes that move the number by less are told as one
WIDER = 1.5  # times: spreads that differ by less are told as one
NINE_IN_TEN = 1.6448536269514722  # standard deviations around the mean of a normal that hold 9 in 10


@dataclass(frozen=True, eq=False)
class Line:
    """A number's line in one part: its lowest and highest slope on each number parent, and sds, and the usual ones."""

    slopes: Floats  # (number parents, 3) lowest, usual, highest
    sds: tuple[float, float, float]


def number_rules(
    network: Network, column: str, weights: Floats, beside: Floats, spread: Callable[[str], float]
) -> Rules:
    """How the mean of a number differs, by how much it moves with other numbers, and how far it spreads around that.

    weights: (category parents' levels...) how common each configuration is, summing to 1.
    beside: (category parents' levels..., number parents) means of the number parents in each.
    spread: number -> its standard deviation over all; asked for only where there are number parents.
    """
    node = network.number(column)
    categories = tuple(network.node(parent) for parent in network.category_parents(column))
    numbers = network.number_parents(column)
    slopes, variance = np.asarray(node.slopes), np.asarray(node.variance)
    means = np.asarray(node.intercept) + (slopes * beside).sum(axis=-1)
    overall = float((weights * means).sum())
    around = float((weights * (variance + (means - overall) ** 2)).sum())
    sd = spread(column) if numbers else float(np.sqrt(around))
    told = _Told(node, numbers, tuple(spread(parent) for parent in numbers), sd)
    found = parts(categories, (means - overall) / (UNIT * told.scale), weights)
    found.sort(key=lambda part: (-part.share, part.held))
    lines = [_line(part, slopes, variance, weights) for part in found]
    averages = [overall + UNIT * told.scale * part.share for part in found]
    lead = Said("It is on average")
    if len(found) == 1:
        only: Words = (told.amount(averages[0]),)
        if varies := _varies(told, categories, found[0], overall):
            only = (*only, *varies)
        elif categories:
            only = (Said("about "), *only, *_whatever(categories))
        return Rules((lead,), (_joined(only, told.told(lines[0]), bool(numbers)),), "; ")
    alike_slopes, alike_sds = told.alike_slopes(lines), told.alike_sds(lines)
    common = max(found, key=lambda part: part.weight)
    clauses: list[Words] = []
    for part, line, average in zip(found, lines, averages, strict=True):
        clause: Words = (told.amount(average), Said(" where "), *conditions(categories, part))
        commonest = (Said(", the commonest case"),) if part is common and len(found) > 2 else ()
        clause = (*clause, *_varies(told, categories, part, overall), *commonest)
        own = told.told(line, not alike_slopes, not alike_sds)
        clauses.append(_joined(clause, own, bool(numbers) and not alike_slopes))
    shared = told.told(_whole(slopes, variance, weights), alike_slopes, alike_sds)
    return Rules((lead,), tuple(clauses), "; ", (Said("In each case "), *shared, Said(".")) if shared else ())


@dataclass(frozen=True)
class _Told:
    """How amounts, slopes and spreads of one number are said.

    numbers, sds: its number parents, and how far each spreads.  sd: how far it spreads itself.
    """

    node: Number
    numbers: tuple[str, ...]
    sds: tuple[float, ...]
    sd: float

    @property
    def scale(self) -> float:
        """The standard deviation to measure by; 1 for what never varies."""
        return self.sd if self.sd > 0.0 and isfinite(self.sd) else 1.0

    def amount(self, value: float) -> Said:
        """A mean, to two digits of the standard deviation."""
        return Said(_rounded(value, 1 - floor(log10(self.scale)), not _years(self.node)), "figure")

    def told(self, line: Line, slopes: bool = True, sds: bool = True) -> Words:
        """Slopes, and the spread: 2 more for each 1 more of hours, and 9 in 10 lie within 5 of that."""
        moves = [self._more(place, line.slopes[place].tolist()) for place in range(len(self.numbers))]
        clauses = [series(moves, " and ")] if slopes and moves else []
        return series([*clauses, self._within(line.sds)] if sds else clauses, ", and ")

    def alike_slopes(self, lines: Sequence[Line]) -> bool:
        """Whether every part moves alike with the number parents."""
        usual = np.stack([line.slopes[:, 1] for line in lines])
        moved = np.ptp(usual, axis=0) * np.asarray(self.sds)
        return bool(np.all(moved <= LIKE * self.scale)) and len(self.numbers) > 0

    def alike_sds(self, lines: Sequence[Line]) -> bool:
        """Whether every part spreads alike."""
        usual = [line.sds[1] for line in lines]
        return max(usual) <= WIDER * min(usual)

    def _more(self, place: int, slopes: Sequence[float]) -> Words:
        """1.4 more for each 1 more of hours; a range where the slopes of a part differ much."""
        spread = self.sds[place]
        step = 10.0 ** floor(log10(spread)) if spread > 0.0 else 1.0
        low, usual, high = (slope * step for slope in slopes)
        each = (Said(" for each "), Said(figure(step), "figure"), Said(" more of "), name(self.numbers[place]))
        if (high - low) / step * spread <= APART * self.scale:
            return (*_change(usual), *each)
        if low < 0.0 < high:
            return (Said("from "), *_change(low), Said(" to "), *_change(high), *each)
        near, far = sorted((low, high), key=abs)
        return (Said(_digits(abs(near)), "figure"), Said(" to "), *_change(far), *each)

    def _within(self, sds: tuple[float, float, float]) -> Words:
        low, usual, high = (NINE_IN_TEN * sd for sd in sds)
        if high == 0.0:
            return (Said("always exactly that"),)
        near = (Said(_digits(low), "figure"), Said(" to ")) if high > WIDER * low else ()
        width = Said(_digits(high if near else usual), "figure")
        return (Said("9 in 10", "figure"), Said(" lie within "), *near, width, Said(" of that"))


def _line(part: Part, slopes: Floats, variance: Floats, weights: Floats) -> Line:
    """The line of a part; its rare configurations make no extremes."""
    here = np.ix_(*part.held)
    common, spreads = weights[here].ravel(), np.sqrt(variance[here]).ravel()
    inside = slopes[here].reshape(common.size, slopes.shape[-1])
    seen = common >= RARE * common.sum()
    shares = common / common.sum() if common.sum() > 0.0 else np.full(common.size, 1.0 / common.size)
    told = np.stack([inside[seen].min(axis=0), shares @ inside, inside[seen].max(axis=0)], axis=1)
    usual = float(np.sqrt(shares @ spreads**2))
    return Line(told, (float(spreads[seen].min()), usual, float(spreads[seen].max())))


def _whole(slopes: Floats, variance: Floats, weights: Floats) -> Line:
    """The line of all configurations."""
    held = tuple(tuple(range(size)) for size in weights.shape)
    return _line(Part(held, 1.0, 0.0, 0.0, 0.0), slopes, variance, weights)


def _joined(clause: Words, more: Words, slopes: bool) -> Words:
    """A clause and what else is told of it, of which the slopes stand first."""
    return (*clause, Said(", " if slopes else ", and "), *more) if more else clause


def _whatever(categories: Sequence[Node]) -> Words:
    """, whatever site and shift are"""
    names = series([[name(parent.name)] for parent in categories], " and ")
    return (Said(", whatever "), *names, Said(" is" if len(categories) == 1 else " are"))


def _varies(told: _Told, categories: Sequence[Node], part: Part, overall: float) -> Words:
    """How far the configurations of a part differ, where they differ much, and with what."""
    if (part.high - part.low) * UNIT <= APART:
        return ()
    with_what = [[name(each.name)] for each, held in zip(categories, part.held, strict=True) if len(held) > 1]
    low, high = (told.amount(overall + UNIT * told.scale * end) for end in (part.low, part.high))
    return (Said(" ("), low, Said(" to "), high, Said(" depending on "), *series(with_what, " and "), Said(")"))


def _change(moved: float) -> Words:
    """1.4 more; 2 less; no more where nothing moves."""
    if moved == 0.0:
        return (Said("no more", "figure"),)
    return (Said(_digits(abs(moved)), "figure"), Said(" more" if moved > 0.0 else " less"))


def _digits(value: float) -> str:
    """Two digits of a value of 0 or more."""
    return _rounded(value, 1 - floor(log10(value))) if value > 0.0 else "0"


def _rounded(value: float, decimals: int, commas: bool = True) -> str:
    return figure(round(value, decimals), commas)


def _years(node: Number) -> bool:
    """Whether the number is a year, as its bands are told."""
    return bool(node.bands) and all(cut.is_integer() and YEARS[0] <= cut <= YEARS[1] for cut in node.bands)
