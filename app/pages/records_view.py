"""What the Records page shows: a headline, a card a column, the first rows."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np
from markupsafe import Markup

from app.drawing import histogram
from app.pages.records_pictures import picture
from app.store import Study
from app.wording import columns as wording
from app.wording.amounts import count, listing, people, plural
from engine.order import Better, Direction
from engine.records.cells import level_text
from engine.records.table import SMALL_COUNT, Column, Table
from engine.records.wording import figure
from engine.refusal import Refusal

KINDS = ("category", "grade", "number", "left out", "weight", "group")
BLANK_KEPT = {  # what a blank is whose row stays, where that is no level
    "group": "a case by itself",
    "weight": "to be mended in the file",
    "number": "a level of its own, which makes bands",
}
FIRST_ROWS = 5
SHOWS = (("look", "Wants a look first"), ("file", "As in the file"), ("out", "Left out"))


@dataclass(frozen=True)
class Level:
    """A level as it can be ticked: place in the column's levels, name, whether it counts as better."""

    place: int
    name: str
    better: bool


@dataclass(frozen=True)
class Typed:
    """The values in a card's form: as saved, or as typed when they were refused."""

    kind: str
    blank: str
    cuts: str
    unit: str
    grades: str
    changeable: bool
    direction: str
    better: frozenset[int]


@dataclass(frozen=True)
class Card:
    """One column. place: in file order.  mark: changes when the column does.  typed: the values of its form."""

    place: int
    name: str
    column: Column
    mark: str
    histogram: Markup
    told: str
    acts: str
    blanks: str
    warnings: tuple[str, ...]
    chosen: bool
    levels: tuple[Level, ...]
    typed: Typed
    changeable: bool
    outcome: str | None
    refusal: Refusal | None = None
    open: bool = False

    @property
    def flagged(self) -> bool:
        return bool(self.warnings)

    @property
    def ranked(self) -> bool:
        """Whether more or less of it can be better."""
        return self.column.kind in ("grade", "number")


@dataclass(frozen=True)
class RecordsView:
    """The whole page. cards: those shown.  rows: the first rows, one tuple of (text, is a number) a row."""

    records: str
    used: int
    left_out: int
    flagged: int
    deck: tuple[str, ...]
    cards: tuple[Card, ...]
    all: int
    names: tuple[tuple[str, bool], ...]
    rows: tuple[tuple[tuple[str, bool], ...], ...]
    find: str = ""
    show: str = "look"
    hatching: Markup = field(default_factory=histogram.hatching)


def view(
    study: Study,
    table: Table,
    find: str = "",
    show: str = "look",
    opened: int | None = None,
    refused: Mapping[int, tuple[Typed, Refusal]] | None = None,
) -> RecordsView:
    """The page for `study`. find, show: what to show first.  opened: the card whose form stands open.

    refused: place -> what was typed into that card's form and why it was not saved.
    """
    refused = refused or {}
    cards = [_card(study, table, place, name, opened, refused.get(place)) for place, name in enumerate(table.columns)]
    shown = [card for card in cards if find.lower().strip() in card.name.lower() or card.place in refused]
    if show == "out":
        shown = [card for card in shown if card.column.kind == "left out" or card.place in refused]
    elif show == "look":
        shown.sort(key=lambda card: not card.flagged)
    numbers = [column.kind in ("number", "weight") for column in table.columns.values()]
    return RecordsView(
        records=count(table.rows),
        used=sum(card.column.used for card in cards),
        left_out=sum(card.column.kind == "left out" for card in cards),
        flagged=sum(card.flagged for card in cards),
        deck=_deck(table),
        cards=tuple(shown),
        all=len(cards),
        names=tuple(zip(table.columns, numbers, strict=True)),
        rows=_first_rows(table, numbers),
        find=find,
        show=show,
    )


def mark(column: Column) -> str:
    """Changes whenever what a card's form can tick or would overwrite has changed."""
    words = json.dumps([column.name, column.kind, list(column.levels), column.unit])
    return hashlib.sha256(words.encode()).hexdigest()[:12]


def grade_levels(column: Column) -> tuple[str, ...]:
    """The levels that have an order: all but the blank."""
    return column.levels[:-1] if column.has_blank else column.levels


def saved(study: Study, column: Column) -> Typed:
    """What the form of this column shows when nothing was refused."""
    wanted = study.plan.outcomes.get(column.name)
    return Typed(
        kind=column.kind,
        blank=column.blank,
        cuts=", ".join(f"{cut:.12g}" for cut in column.cuts),
        unit=column.unit,
        grades="\n".join(grade_levels(column)),
        changeable=column.name in study.plan.changeable,
        direction=wanted.value if isinstance(wanted, Direction) else "",
        better=_better_places(wanted, column),
    )


def _card(
    study: Study, table: Table, place: int, name: str, opened: int | None, refused: tuple[Typed, Refusal] | None
) -> Card:
    column = table.columns[name]
    wanted = study.plan.outcomes.get(name)
    typed = refused[0] if refused else saved(study, column)
    drawn = picture(table, name)
    chosen = name in study.choices.kinds
    warnings = [*column.warnings, *drawn.warnings]
    if column.kind == "left out" and not chosen and not warnings:
        warnings.append(column.why)
    return Card(
        place=place,
        name=name,
        column=column,
        mark=mark(column),
        histogram=drawn.histogram,
        told=drawn.told,
        acts=drawn.acts,
        blanks=wording.blanks(column, len(table.kept), SMALL_COUNT),
        warnings=tuple(dict.fromkeys(warnings)),
        chosen=chosen,
        levels=tuple(Level(i, level, i in typed.better) for i, level in enumerate(column.levels)),
        typed=typed,
        changeable=name in study.plan.changeable,
        outcome=_outcome_words(wanted),
        refusal=refused[1] if refused else None,
        open=refused is not None or opened == place,
    )


def _better_places(wanted: Better | None, column: Column) -> frozenset[int]:
    if wanted is None or isinstance(wanted, Direction):
        return frozenset()
    return frozenset(place for place, level in enumerate(column.levels) if level in wanted)


def _outcome_words(wanted: Better | None) -> str | None:
    if wanted is None:
        return None
    if isinstance(wanted, Direction):
        return f"outcome, {wanted.value} is better"
    return f"outcome, {listing(wanted)} is better"


def _deck(table: Table) -> tuple[str, ...]:
    said = []
    for name, rows in table.dropped.items():
        if rows:
            amount = people(rows, SMALL_COUNT)
            said.append(f"{amount} {plural(rows, 'row is', 'rows are')} left out because {name} is blank there.")
    if not said:
        said.append("No row has been dropped.")
    if any(column.has_blank for column in table.columns.values()):
        said.append("A blank is a level of its own; change that column by column below.")
    if any(column.kind == "number" for column in table.columns.values()):
        said.append(
            "A number that varies smoothly is learned as a number, any other as bands; its card says which. Bands hold "
            "about equally many records unless you move the cuts."
        )
    return tuple(sentence[:1].upper() + sentence[1:] for sentence in said)


def _first_rows(table: Table, numbers: list[bool]) -> tuple[tuple[tuple[str, bool], ...], ...]:
    first = table.frame.head(FIRST_ROWS)
    return tuple(
        tuple((_cell(value, is_number), is_number) for value, is_number in zip(row, numbers, strict=True))
        for row in first.itertuples(index=False, name=None)
    )


def _cell(value: object, is_number: bool) -> str:
    """A cell as its column's amounts are written, or its levels."""
    if value is None or (isinstance(value, float) and np.isnan(value)) or str(value) in ("<NA>", "NaT"):
        return ""
    if is_number and isinstance(value, int | float | np.integer | np.floating):
        return figure(float(value))
    return level_text(value)
