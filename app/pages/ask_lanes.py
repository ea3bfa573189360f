"""The lanes of Ask: every column of the study as a card or as one folded line, with where each click leads."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from urllib.parse import parse_qsl

from markupsafe import Markup

from app.drawing.bars import Bar, bars
from app.pages.asking import Asked
from app.question import Question, per_cent, query
from app.wording.figures import column_figure, counted, share
from app.wording.questions import reach_words
from app.wording.values import either, yes_level
from engine.answering.answer import Marginal
from engine.network.network import Category
from engine.order import Direction
from engine.records.table import SMALL_COUNT

Address = Callable[[Question], str]
MOST_LEVELS, SHOWN_LEVELS, TOLD = 7, 5, 4
COVERAGE = 0.90


@dataclass(frozen=True)
class Act:
    """A mark or a word that can be clicked. says: the next act, its name for those who do not see it."""

    id: str
    address: str
    says: str
    on: bool = False


@dataclass(frozen=True)
class Row:
    """One level of a card. figures: as recorded, among these, if set; None where there is none."""

    level: str
    figures: tuple[str, str | None, str | None]
    bar: Markup
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
    """An open card. pinned, set_to: what the state line says of them, None when it is not.  told: verb and links."""

    name: str
    slug: str
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


@dataclass(frozen=True)
class Fold:
    """A folded card: one line. word: the level that the figures are shares of, empty for yes."""

    name: str
    changeable: bool
    word: str
    figures: tuple[str, str | None, str | None]
    open: Act


@dataclass(frozen=True)
class Lane:
    number: int
    name: str
    told: str
    cards: tuple[Card, ...]
    folds: tuple[Fold, ...]
    hidden: int


def lanes(asked: Asked, address: Address) -> list[Lane]:
    """Every stage with its columns, in the order of the study; the filter never hides a pinned or set card."""
    return [_lane(asked, address, place, name, columns) for place, (name, columns) in enumerate(asked.spine.stages)]


def is_open(asked: Asked, column: str) -> bool:
    """Watched, pinned, set, or opened by hand; and the first changeable column, which shows what can be set."""
    question = asked.question
    if column in question.pins or column in question.levers:
        return True
    if column in question.folded:
        return False
    first = next((name for name in asked.spine.columns if name in asked.spine.changeable), None)
    return question.show == "all" or column in asked.watched or column in question.opened or column == first


def has_moved(asked: Asked, column: str) -> bool:
    """Whether any share of the column, as written, differs from the one as recorded."""
    reading = asked.answer[column]
    before = [column_figure(part) for part in reading.recorded.point]
    shown = [reading.among] if asked.shows_among else []
    shown += [reading.set] if asked.shows_set and reading.set is not None else []
    return any([column_figure(part) for part in world.point] != before for world in shown)


def is_found(asked: Asked, column: str) -> bool:
    """Whether the filter shows the column."""
    question = asked.question
    if column in question.pins or column in question.levers:
        return True
    if question.find:
        wanted = question.find.casefold()
        return any(wanted in text.casefold() for text in (column, *asked.spine.nodes[column].levels))
    return question.show != "moved" or has_moved(asked, column)


def _lane(asked: Asked, address: Address, place: int, name: str, columns: Sequence[str]) -> Lane:
    found = [column for column in columns if is_found(asked, column)]
    opened = [column for column in found if is_open(asked, column)]
    return Lane(
        number=place + 1,
        name=name,
        told=_lane_told(asked, columns),
        cards=tuple(_card(asked, address, column) for column in opened),
        folds=tuple(_fold(asked, address, column) for column in found if column not in opened),
        hidden=len(columns) - len(found),
    )


def _lane_told(asked: Asked, columns: Sequence[str]) -> str:
    told = f"{len(columns)} {'column' if len(columns) == 1 else 'columns'}"
    if all(column in asked.spine.changeable for column in columns):
        return f"{told}, changeable" if len(columns) == 1 else f"{told}, all changeable"
    return told


def _fold(asked: Asked, address: Address, column: str) -> Fold:
    node, reading = asked.spine.nodes[column], asked.answer[column]
    yes = yes_level(node)
    level = yes or node.levels[int(reading.recorded.point.argmax())]
    before = share(reading.recorded.share(level))
    among = share(reading.among.share(level)) if asked.shows_among else before
    after = share(reading.set.share(level)) if asked.shows_set and reading.set is not None else among
    moved = (before, among if among != before else None, after if after != among else None)
    slug = asked.spine.names.slugs[column]
    return Fold(
        name=column,
        changeable=column in asked.spine.changeable,
        word="" if yes else level,
        figures=moved,
        open=Act(f"card-{slug}", address(asked.question.opening(column)), f"Open {column}"),
    )


def _card(asked: Asked, address: Address, column: str) -> Card:
    question, node = asked.question, asked.spine.nodes[column]
    slug = asked.spine.names.slugs[column]
    shown, more = _shown_levels(asked, column)
    pinned, lever = question.pins.get(column), question.levers.get(column)
    whole = replace(question, whole=question.whole | {column})
    return Card(
        name=column,
        slug=slug,
        pinned=None if pinned is None else _pinned_words(asked, pinned),
        set_to=None
        if lever is None
        else f"to {lever[0]} for {reach_words(lever[1])}" + _withheld(asked, "its effect is"),
        state=_state(asked, column),
        told=_told(asked, address, column),
        narrow=pinned is not None and lever is None,
        rows=tuple(_row(asked, address, node, level) for level in shown),
        more=(more, address(whole)) if more else None,
        fold=Act(f"card-{slug}", address(question.folding(column)), f"Fold {column}"),
        watch=None
        if column == asked.watch
        else Act(f"watch-{slug}", address(question.watching(column)), f"Watch {column}"),
        lever=None if lever is None else _lever_line(asked, column, lever[1]),
    )


def _shown_levels(asked: Asked, column: str) -> tuple[list[str], int]:
    """Of more than seven levels the five most frequent, and any pinned or set."""
    question, levels = asked.question, asked.spine.nodes[column].levels
    if len(levels) <= MOST_LEVELS or column in question.whole:
        return list(levels), 0
    point = asked.answer[column].recorded.point
    often = sorted(range(len(levels)), key=lambda place: -point[place])[:SHOWN_LEVELS]
    touched = {*question.pins.get(column, ()), *question.levers.get(column, ())[:1]}
    shown = [level for place, level in enumerate(levels) if place in often or level in touched]
    return shown, len(levels) - len(shown)


def _row(asked: Asked, address: Address, node: Category, level: str) -> Row:
    question, column, reading = asked.question, node.name, asked.answer[node.name]
    names = asked.spine.names
    place = f"{names.slugs[column]}-{names.level_slugs[column][level]}"
    pinned = question.pins.get(column, ())
    recorded = reading.recorded.share(level)
    among = reading.among if asked.shows_among else None
    untouched = column in question.pins and column not in question.levers  # a pinned column comes before the levers
    after = reading.set if asked.shows_set and not untouched else None
    if level in pinned:
        rest = tuple(other for other in pinned if other != level)
        next_question = question.pinned(column, rest) if rest else question.unpinned(column)
        ring = Act(f"pin-{place}", address(next_question), f"Pinned at {level}, take out", True)
    else:
        ring = Act(f"pin-{place}", address(question.pinned(column, (level,))), f"Pin {level}")
    also = None
    if pinned and level not in pinned:
        wider = tuple(each for each in node.levels if each in pinned or each == level)
        also = Act(f"also-{place}", address(question.pinned(column, wider)), f"Pin {level} as well")
    diamond = _diamond(asked, address, column, level, place)
    return Row(
        level=level,
        figures=(
            column_figure(recorded),
            None if among is None else column_figure(among.share(level)),
            None if after is None else column_figure(after.share(level)),
        ),
        bar=bars(recorded, _bar(among, level), _bar(after, level)),
        ring=ring,
        also=also,
        diamond=diamond,
        bold=ring.on or (diamond is not None and diamond.on),
    )


def _diamond(asked: Asked, address: Address, column: str, level: str, place: str) -> Act | None:
    if column not in asked.spine.changeable:
        return None
    question, lever = asked.question, asked.question.levers.get(column)
    if lever is not None and lever[0] == level:
        return Act(f"set-{place}", address(question.without_lever(column)), f"Set to {level}, take out", True)
    reach = 1.0 if lever is None else lever[1]
    return Act(f"set-{place}", address(question.with_lever(column, level, reach)), f"Set to {level}")


def _bar(marginal: Marginal | None, level: str) -> Bar | None:
    return None if marginal is None else Bar(marginal.share(level), *marginal.interval(level, COVERAGE))


def _pinned_words(asked: Asked, levels: Sequence[str]) -> str:
    """The count stands here only for a single pin: with more of them one count could give another away."""
    words = f"at {either(levels)}"
    matching = asked.answer.matching
    if matching is None or len(asked.question.pins) > 1 or asked.refusal is not None:
        return words
    return f"{words} · {counted(matching, asked.spine.records, SMALL_COUNT)} records"


def _set_words(asked: Asked, level: str, reach: float) -> str:
    return f"to {level} for {reach_words(reach)}{_withheld(asked, 'its effect is')}"


def _watch(asked: Asked, address: Address, column: str) -> Act | None:
    """Make this the column of the answer sentence; None where it is."""
    if column == asked.watch:
        return None
    slug = asked.spine.names.slugs[column]
    return Act(f"watch-{slug}", address(asked.question.watching(column)), f"Watch {column}")


def _state(asked: Asked, column: str) -> str:
    """What the column is to the question: watched, an outcome, changeable; else its kind."""
    better = asked.spine.order.outcomes.get(column)
    words = []
    if column == asked.watch or column in asked.spine.outcomes:
        words.append("watched outcome" if better is not None else "watched")
    if isinstance(better, Direction):
        words.append("more is better" if better is Direction.MORE else "less is better")
    elif better is not None:
        words.append(f"{either(better)} is better")
    if column in asked.spine.changeable and column not in asked.question.levers:
        words.append("changeable")
    if column in asked.watched:
        words += [text for text in [_withheld(asked, "if set:").removeprefix(" · ")] if text]
    if not words and column not in asked.question.pins and column not in asked.question.levers:
        kind = asked.spine.nodes[column].kind
        words.append("number, in bands" if kind == "number" else kind)
    return " · ".join(words)


def _withheld(asked: Asked, words: str) -> str:
    return f" · {words} withheld" if asked.blocked else ""


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
    level = asked.question.levers[column][0]
    rest = query(asked.question.with_lever(column, level), names)
    return LeverLine(f"reach.{names.slugs[column]}", per_cent(reach), tuple(parse_qsl(rest)))
