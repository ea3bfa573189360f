"""An open card of Ask: what the column is to the question, its rows, and where each of their marks leads."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from urllib.parse import parse_qsl

from markupsafe import Markup

from app.drawing.bars import bars
from app.pages.ask_numbers import NumberPart, number_part
from app.pages.asking import Asked
from app.question import Pin, Question, Setting, Within, query
from app.typed import per_cent
from app.wording.estimates import Estimate, level_estimates
from app.wording.figures import column_figure, matching_of
from app.wording.questions import reach_words
from app.wording.units import behind
from app.wording.values import either, held, setting_words
from engine.network.nodes import Node, Number
from engine.order import Direction
from engine.records.table import SMALL_COUNT
from engine.records.wording import figure

Address = Callable[[Question], str]
MOST_LEVELS, SHOWN_LEVELS, TOLD = 7, 5, 4


@dataclass(frozen=True)
class Act:
    """A mark or a word that can be clicked. says: the next act, its name for those who do not see it."""

    id: str
    address: str
    says: str
    on: bool = False


@dataclass(frozen=True)
class Row:
    """One level of a card. figures: as recorded, among these, if set; None where there is none.  bar: of no band."""

    level: str
    figures: tuple[str, str | None, str | None]
    bar: Markup | None
    ring: Act
    also: Act | None
    diamond: Act | None
    bold: bool


@dataclass(frozen=True)
class LeverLine:
    """The form that says for how many a lever takes. hidden: the rest of the question."""

    field: str
    reach: str
    hidden: tuple[tuple[str, str], ...]


@dataclass(frozen=True)
class Card:
    """An open card. pinned, set_to: what the state line says of them, None when it is not.  told: verb and links.

    action: where its forms are sent.  number: what it has more for a number.  unpin, unset: take out a range or a
    lever that no mark of a row stands for.
    """

    name: str
    slug: str
    action: str
    pinned: str | None
    set_to: str | None
    state: str
    told: tuple[tuple[str, tuple[tuple[str, str], ...], int], ...]
    narrow: bool
    rows: tuple[Row, ...]
    more: tuple[int, str] | None
    fold: Act
    watch: Act | None
    lever: LeverLine | None
    number: NumberPart | None
    unpin: Act | None
    unset: Act | None


def card_of(asked: Asked, address: Address, column: str) -> Card:
    question, slug = asked.question, asked.spine.names.slugs[column]
    number, node = column in asked.spine.numbers, asked.spine.nodes[column]
    shown, more = _shown_levels(asked, column)
    pinned, lever = question.pins.get(column), question.levers.get(column)
    whole = replace(question, whole=question.whole | {column})
    return Card(
        name=column,
        slug=slug,
        action=address(Question()),
        pinned=None if pinned is None else _pinned_words(asked, node, pinned),
        set_to=None if lever is None else _set_words(asked, column, *lever),
        state=_state(asked, column),
        told=_told(asked, address, column),
        narrow=pinned is not None and lever is None,
        rows=_rows(asked, address, column, shown),
        more=(more, address(whole)) if more else None,
        fold=Act(f"card-{slug}", address(question.folding(column)), f"Fold {column}"),
        watch=None
        if column == asked.watch
        else Act(f"watch-{slug}", address(question.watching(column)), f"Watch {column}"),
        lever=None if lever is None or number else _lever_line(asked, column, lever[1]),
        number=number_part(asked, column) if number else None,
        unpin=_out(f"unpin-{slug}", address(question.unpinned(column)), f"Pinned at {held(node, pinned)}")
        if isinstance(pinned, Within)
        else None,
        unset=_out(f"unset-{slug}", address(question.without_lever(column)), f"Set {setting_words(node, lever[0])}")
        if number and lever is not None
        else None,
    )


def _out(id: str, address: str, says: str) -> Act:
    return Act(id, address, f"{says}, take out", True)


def _shown_levels(asked: Asked, column: str) -> tuple[list[str], int]:
    """Of more than seven levels the five most frequent, and any pinned or set."""
    question, levels = asked.question, asked.spine.nodes[column].levels
    if len(levels) <= MOST_LEVELS or column in question.whole:
        return list(levels), 0
    point = asked.answer[column].recorded.point
    often = sorted(range(len(levels)), key=lambda place: -point[place])[:SHOWN_LEVELS]
    pin, (setting, _) = question.pins.get(column, ()), question.levers.get(column, (None, 1.0))
    touched = {*(() if isinstance(pin, Within) else pin), setting}
    shown = [level for place, level in enumerate(levels) if place in often or level in touched]
    return shown, len(levels) - len(shown)


def _rows(asked: Asked, address: Address, column: str, shown: Sequence[str]) -> tuple[Row, ...]:
    node, reading = asked.spine.nodes[column], asked.answer[column]
    if isinstance(node, Number) and not node.bands:
        return ()  # one row would say that every value is a value
    shows_set = asked.shows_set and not asked.untouched(column)
    within = asked.within.get(column)
    among = level_estimates(reading.among, None if within is None else within.among) if asked.shows_among else None
    after = None
    if shows_set and reading.set is not None:
        after = level_estimates(reading.set, None if within is None else within.set)
    return tuple(
        _row(
            *(asked, address, node, level, float(reading.recorded.point[place])),
            None if among is None else among[place],
            None if after is None else after[place],
        )
        for place, level in enumerate(node.levels)
        if level in shown
    )


def _row(
    asked: Asked,
    address: Address,
    node: Node,
    level: str,
    recorded: float,
    among: Estimate | None,
    after: Estimate | None,
) -> Row:
    question, column, names = asked.question, node.name, asked.spine.names
    place = f"{names.slugs[column]}-{names.level_slugs[column][level]}"
    pin = question.pins.get(column, ())
    pinned = () if isinstance(pin, Within) else pin
    ring = Act(f"pin-{place}", address(question.pinned(column, (level,))), f"Pin {level}")
    also = None
    if level in pinned:
        rest = tuple(other for other in pinned if other != level)
        without = question.pinned(column, rest) if rest else question.unpinned(column)
        ring = Act(f"pin-{place}", address(without), f"Pinned at {level}, take out", True)
    elif pinned:
        wider = tuple(each for each in node.levels if each in pinned or each == level)
        also = Act(f"also-{place}", address(question.pinned(column, wider)), f"Also pin {level}")
    diamond = _diamond(asked, address, column, level, place)
    return Row(
        level=level,
        figures=(
            column_figure(recorded),
            None if among is None else column_figure(among.point),
            None if after is None else column_figure(after.point),
        ),
        bar=None if isinstance(node, Number) else bars(recorded, among, after),
        ring=ring,
        also=also,
        diamond=diamond,
        bold=ring.on or (diamond is not None and diamond.on),
    )


def _diamond(asked: Asked, address: Address, column: str, level: str, place: str) -> Act | None:
    if column not in asked.spine.changeable or column in asked.spine.numbers:
        return None
    question, lever = asked.question, asked.question.levers.get(column)
    if lever is not None and lever[0] == level:
        return Act(f"set-{place}", address(question.without_lever(column)), f"Set to {level}, take out", True)
    reach = 1.0 if lever is None else lever[1]
    return Act(f"set-{place}", address(question.with_lever(column, level, reach)), f"Set to {level}")


def _pinned_words(asked: Asked, node: Node, pin: Pin) -> str:
    """The count stands here only for a single pin: with more of them one count could give another away."""
    words = f"at {held(node, pin)}"
    matching = asked.answer.matching
    if matching is None or len(asked.question.pins) > 1 or asked.refusal is not None:
        return words
    return f"{words} · {matching_of(matching, asked.spine.records, SMALL_COUNT, asked.answer.matching_told)}"


def _set_words(asked: Asked, column: str, setting: Setting, reach: float) -> str:
    words = f"{setting_words(asked.spine.nodes[column], setting)} for {reach_words(reach)}"
    if asked.beyond(column, setting):
        usual, unit = asked.usual(column), behind(asked.spine.nodes[column].unit)
        words += f" · beyond every record, which run from {figure(usual.least)} to {figure(usual.most)}{unit}"
    return f"{words} · its effect is withheld" if asked.blocked else words


def _state(asked: Asked, column: str) -> str:
    """What the column is to the question: watched, an outcome, changeable; else its kind."""
    better = asked.spine.order.outcomes.get(column)
    words = []
    if column == asked.watch or column in asked.spine.outcomes:
        words.append("watched outcome" if better is not None else "watched")
    if column in asked.watched and asked.blocked:
        words.append("if set: withheld")
    elif isinstance(better, Direction):
        words.append("more is better" if better is Direction.MORE else "less is better")
    elif better is not None:
        words.append(f"{either(better)} is better")
    if column in asked.spine.changeable and column not in asked.question.levers:
        words.append("changeable")
    if not words and column not in asked.question.pins and column not in asked.question.levers:
        kind = asked.spine.nodes[column].kind
        words.append("number, in bands" if kind == "number" and column not in asked.spine.numbers else kind)
    return " · ".join(words)


def _told(asked: Asked, address: Address, column: str) -> tuple[tuple[str, tuple[tuple[str, str], ...], int], ...]:
    spine, told = asked.spine, []
    for verb, found in (
        ("comes from", spine.comes_from(column)),
        ("leads to", spine.leads_to(column)),
        ("goes with", spine.goes_with(column)),
    ):
        links = tuple(
            (name, f"{address(asked.question.opening(name))}#card-{spine.names.slugs[name]}") for name in found[:TOLD]
        )
        if links:
            told.append((verb, links, max(len(found) - TOLD, 0)))
    return tuple(told)


def _lever_line(asked: Asked, column: str, reach: float) -> LeverLine:
    names = asked.spine.names
    setting = asked.question.levers[column][0]
    rest = query(asked.question.with_lever(column, setting), names)
    return LeverLine(f"reach.{names.slugs[column]}", per_cent(reach), tuple(parse_qsl(rest)))
