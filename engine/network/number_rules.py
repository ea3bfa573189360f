"""A number's rules in plain words: its mean where configurations are alike, its slopes, and how far it spreads."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from math import floor, isfinite, log10

import numpy as np
from numpy.typing import NDArray

from engine.network.merging import RARE, Part, conditions, parts, varying, whatever
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
DIGITS = 14  # most digits of a value that is told: no record is kept with many more
NINE_IN_TEN = 1.6448536269514722  # standard deviations around the mean of a normal that hold 9 in 10


@dataclass(frozen=True, eq=False)
class Line:
    """A number's line in one part: its lowest and highest slope on each number parent, and sds, and the usual ones."""

    slopes: Floats  # (number parents, 3) lowest, usual, highest
    sds: tuple[float, float, float]


def held_at(network: Network, column: str, at: Floats, spread: Callable[[str], float]) -> Words:
    """The values at which the means of a number are told: hours at 12 and age at 45 (their means).

    at: (number parents,) the mean of each.  spread: number -> its standard deviation over all.
    """
    numbers = network.number_parents(column)
    told = [
        (name(parent), Said(" at "), _amount(network.number(parent), value, spread(parent)))
        for parent, value in zip(numbers, at.tolist(), strict=True)
    ]
    return (*series(told, " and "), Said(" (its mean)" if len(told) == 1 else " (their means)")) if told else ()


def number_rules(
    network: Network,
    column: str,
    weights: Floats,
    at: Floats,
    spread: Callable[[str], float],
    reach: tuple[float, float] | None = None,
) -> Rules:
    """How the mean of a number differs, by how much it moves with other numbers, and how far it spreads around that.

    Configurations are told at the same values of the number parents: what differs between them is then theirs alone.
    weights: (category parents' levels...) how common each configuration is, summing to 1.
    at: (number parents,) the mean of each over all.
    spread: number -> its standard deviation over all; asked for only where there are number parents.
    reach: between which two values 9 in 10 records lie, told of a number without parents; None without records.
    """
    node = network.number(column)
    categories = tuple(network.node(parent) for parent in network.category_parents(column))
    numbers = network.number_parents(column)
    slopes, variance = np.asarray(node.slopes), np.asarray(node.variance)
    means = np.asarray(node.intercept) + slopes @ at
    first = float(means.flat[0])  # far from 0 the rounding of the weights' sum would count
    overall = first + float((weights * (means - first)).sum())
    around = float((weights * (variance + (means - overall) ** 2)).sum())
    sd = spread(column) if numbers else float(np.sqrt(around))
    told = _Told(node, numbers, tuple(spread(parent) for parent in numbers), sd)
    if reach is not None and not node.parents and around > 0.0:
        return Rules((Said("It is on average"),), ((told.amount(overall), *told.between(*reach, overall)),))
    found = parts(categories, (means - overall) / (UNIT * told.scale), weights)
    found.sort(key=lambda part: (-part.share, part.held))
    lines = [_line(part, slopes, variance, weights) for part in found]
    averages = [overall + UNIT * told.scale * part.share for part in found]
    lead: Words = (Said("It is on average"),)
    if numbers and categories:
        lead = (Said("With "), *held_at(network, column, at, spread), Said(" it is on average"))
    if len(found) == 1:
        only: Words = (told.amount(averages[0]),)
        if varies := _varies(told, categories, found[0], overall):
            only = (*only, *varies)
        elif categories:
            only = (Said("about "), *only, *whatever(categories))
        return Rules(lead, (_joined(only, told.told(lines[0]), bool(numbers)),), "; ")
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
    return Rules(lead, tuple(clauses), "; ", (Said("In each case "), *shared, Said(".")) if shared else ())


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
        return _amount(self.node, value, self.scale)

    def told(self, line: Line, slopes: bool = True, sds: bool = True) -> Words:
        """Slopes, and the spread: 2 more for each 1 more of hours, and the model expects 9 in 10 within 5."""
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

    def between(self, low: float, high: float, mean: float) -> Words:
        """, and 9 in 10 records lie between 2 and 40; within 1 of the mean where both read alike, far from 0."""
        ends, most = (self.amount(low), self.amount(high)), (Said(", and "), Said("9 in 10", "figure"))
        if low == high:
            return (*most, Said(" records are "), ends[0])
        if ends[0] == ends[1]:
            width = Said(_digits(max(high - mean, mean - low)), "figure")
            return (*most, Said(" records lie within "), width, Said(" of that"))
        return (*most, Said(" records lie between "), ends[0], Said(" and "), ends[1])

    def _within(self, sds: tuple[float, float, float]) -> Words:
        low, usual, high = (NINE_IN_TEN * sd for sd in sds)
        if high == 0.0:
            return (Said("always exactly that"),)
        near = (Said(_digits(low), "figure"), Said(" to ")) if high > WIDER * low else ()
        width = Said(_digits(high if near else usual), "figure")
        return (Said("the model expects "), Said("9 in 10", "figure"), Said(" within "), *near, width, Said(" of that"))


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


def _varies(told: _Told, categories: Sequence[Node], part: Part, overall: float) -> Words:
    """How far the configurations of a part differ, where they differ much, and with what."""
    if (part.high - part.low) * UNIT <= APART:
        return ()
    low, high = (told.amount(overall + UNIT * told.scale * end).text for end in (part.low, part.high))
    return varying(categories, part, low, high)


def _amount(node: Number, value: float, sd: float) -> Said:
    """A value, to two digits of the standard deviation, but never to more digits than are read."""
    scale = sd if sd > 0.0 and isfinite(sd) else 1.0
    decimals = 1 - floor(log10(scale))
    if value != 0.0:
        decimals = min(decimals, DIGITS - 1 - floor(log10(abs(value))))
    return Said(_rounded(value, decimals, not _years(node)), "figure")


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
