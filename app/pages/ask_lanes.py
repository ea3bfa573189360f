"""The lanes of Ask: every column of the study as a card or as one folded line, with where each click leads."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from app.pages.ask_cards import Act, Address, Card, card_of
from app.pages.ask_numbers import means
from app.pages.asking import Asked
from app.wording.figures import column_figure, share
from app.wording.values import yes_level


@dataclass(frozen=True)
class Fold:
    """A folded card: one line. word: the level that the figures are shares of, empty for yes and for means."""

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
    """Whether any figure of the column, as written, differs from the one as recorded."""
    reading = asked.answer[column]
    if column in asked.spine.numbers:
        recorded, *others = means(asked, column)
        if any(mean not in (None, recorded) for mean in others):
            return True
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
        cards=tuple(card_of(asked, address, column) for column in opened),
        folds=tuple(_fold(asked, address, column) for column in found if column not in opened),
        hidden=len(columns) - len(found),
    )


def _lane_told(asked: Asked, columns: Sequence[str]) -> str:
    told = f"{len(columns)} {'column' if len(columns) == 1 else 'columns'}"
    if all(column in asked.spine.changeable for column in columns):
        return f"{told}, changeable" if len(columns) == 1 else f"{told}, all changeable"
    return told


def _fold(asked: Asked, address: Address, column: str) -> Fold:
    word, before, seen, then = _figures(asked, column)
    among = before if seen is None else seen
    after = among if then is None else then
    moved = (before, among if among != before else None, after if after != among else None)
    slug = asked.spine.names.slugs[column]
    return Fold(
        name=column,
        changeable=column in asked.spine.changeable,
        word=word,
        figures=moved,
        open=Act(f"card-{slug}", address(asked.question.opening(column)), f"Open {column}"),
    )


def _figures(asked: Asked, column: str) -> tuple[str, str, str | None, str | None]:
    """The level told of, empty for yes and for a mean; its figure as recorded, among these and if set."""
    if column in asked.spine.numbers:
        return "", *means(asked, column)
    node, reading = asked.spine.nodes[column], asked.answer[column]
    yes = yes_level(node)
    level = yes or node.levels[int(reading.recorded.point.argmax())]
    among = share(reading.among.share(level)) if asked.shows_among else None
    after = share(reading.set.share(level)) if asked.shows_set and reading.set is not None else None
    return "" if yes else level, share(reading.recorded.share(level)), among, after
