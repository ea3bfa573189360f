"""What an open card of Ask has more where its column is a number: the strip, the means, and forms for what is typed."""

from __future__ import annotations

from dataclasses import dataclass, fields, replace
from urllib.parse import parse_qsl

import numpy as np
from markupsafe import Markup

from app.drawing.answer_beam import World
from app.drawing.strip import Curve, Drawn, places, strip
from app.pages.asking import Asked
from app.question import By, Question, To, Within, query
from app.typed import per_cent, written
from app.wording.estimates import Estimate
from app.wording.numbers import round_value
from app.wording.units import of_change
from engine.answering.answer import Marginal
from engine.answering.cutting import Gate
from engine.answering.mixture import Mixture

Hidden = tuple[tuple[str, str], ...]


@dataclass(frozen=True)
class Field:
    """A field of a form. name: as the address reads it.  says: its label for those who do not see the words around."""

    name: str
    value: str
    says: str


@dataclass(frozen=True)
class PinForm:
    """From where to under where a number is seen. hidden: the rest of the question."""

    low: Field
    high: Field
    hidden: Hidden


@dataclass(frozen=True)
class LeverForm:
    """Set to a value, or shift by an amount, for some of them. on: whether the question has this lever."""

    kind: str
    typed: Field
    reach: Field
    hidden: Hidden
    on: bool


@dataclass(frozen=True)
class NumberPart:
    """means: as recorded, among these, if set; None where there is none.  levers: empty where it is not changeable.

    unit, shift_unit: what follows a value, and the amount of a shift; empty where none is stated.
    """

    strip: Markup
    means: tuple[str, str | None, str | None]
    pin: PinForm
    levers: tuple[LeverForm, ...]
    unit: str
    shift_unit: str


def number_part(asked: Asked, column: str) -> NumberPart:
    unit = asked.spine.nodes[column].unit
    return NumberPart(
        strip=_strip(asked, column),
        means=means(asked, column),
        pin=_pin_form(asked, column),
        levers=_lever_forms(asked, column) if column in asked.spine.changeable else (),
        unit=unit,
        shift_unit=of_change(unit),
    )


def means(asked: Asked, column: str) -> tuple[str, str | None, str | None]:
    """The mean of a number in every world that is shown."""
    found = asked.estimates(column)
    among = found.figure(found.among) if asked.shows_among else None
    after = found.figure(found.set) if asked.shows_set and found.set is not None else None
    return found.figure(found.recorded), among, None if asked.untouched(column) else after


def _strip(asked: Asked, column: str) -> Markup:
    reading, found, scale = asked.answer[column], asked.estimates(column), asked.scale(column)
    worlds: list[tuple[World, Marginal, Estimate]] = [("recorded", reading.recorded, found.recorded)]
    if asked.shows_among:
        worlds.append(("among", reading.among, found.among))
    if asked.shows_set and reading.set is not None and found.set is not None and not asked.untouched(column):
        worlds.append(("set", reading.set, found.set))
    grid = places(scale)

    def drawn(world: World, marginal: Marginal) -> Drawn:
        if world != "recorded":
            return _drawn(marginal, grid)
        return asked.spine.curves.get((column, scale), lambda: _drawn(marginal, grid))

    curves = [
        Curve(world, *drawn(world, marginal), estimate.point, estimate.low, estimate.high, estimate.inner)
        for world, marginal, estimate in worlds
    ]
    return strip(curves, asked.spine.nodes[column].cuts, scale)


def _pin_form(asked: Asked, column: str) -> PinForm:
    slug, pin = asked.spine.names.slugs[column], asked.question.pins.get(column)
    low, high = (pin.low, pin.high) if isinstance(pin, Within) and pin.value is None else (None, None)
    return PinForm(
        Field(f"from.{slug}", "" if low is None else written(low), f"{column} from"),
        Field(f"under.{slug}", "" if high is None else written(high), f"{column} to under"),
        _hidden(asked, asked.question.unpinned(column)),
    )


def _lever_forms(asked: Asked, column: str) -> tuple[LeverForm, ...]:
    slug, usual = asked.spine.names.slugs[column], asked.usual(column)
    setting, reach = asked.question.levers.get(column, (None, 1.0))
    to = setting.value if isinstance(setting, To) else round_value(usual.middle, usual.high - usual.low)
    by = setting.amount if isinstance(setting, By) else usual.step
    hidden = _hidden(asked, asked.question.without_lever(column))
    share = Field(f"reach.{slug}", per_cent(reach), f"{column}: for how many of them, in per cent")
    return (
        LeverForm("set", Field(f"set.{slug}", written(to), f"Set {column} to"), share, hidden, isinstance(setting, To)),
        LeverForm(
            "shift", Field(f"shift.{slug}", written(by), f"Shift {column} by"), share, hidden, isinstance(setting, By)
        ),
    )


def _hidden(asked: Asked, rest: Question) -> Hidden:
    return tuple(parse_qsl(query(rest, asked.spine.names)))


def _drawn(marginal: Marginal, grid: np.ndarray) -> Drawn:
    """The density on `grid`, and apart from it the values held by many at once, with their shares."""
    assert marginal.number is not None
    number = _first_draw(marginal.number)
    single = np.broadcast_to(number.sd == 0.0, number.weight.shape)
    means = np.broadcast_to(number.mean, number.weight.shape)
    shares: dict[float, float] = {}
    for value, share in zip(means[single], number.weight[single], strict=True):
        shares[float(value)] = shares.get(float(value), 0.0) + float(share)
    rest = replace(number, weight=np.where(single, 0.0, number.weight))
    return rest.density(grid)[:, 0], tuple(shares.items())


def _first_draw(number: Mixture) -> Mixture:
    """The mixture at the posterior mean alone: a curve needs no other draw, and some cost a hundred times as much."""

    def first(array: np.ndarray | None) -> np.ndarray | None:
        return None if array is None else array[:, :1]

    gate = number.gate
    if gate is not None:
        gate = Gate(**{each.name: getattr(gate, each.name)[..., :1] for each in fields(gate)})
    weight, mean, sd = number.weight[:, :1], number.mean[:, :1], number.sd[:, :1]
    return Mixture(weight, mean, sd, gate, first(number.low), first(number.high))
