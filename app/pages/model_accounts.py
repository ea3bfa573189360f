"""How each column comes about, on the Model page: its rules in words, and the table behind them on demand."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from app.wording.amounts import listing, plural, small_word
from app.wording.figures import share, span
from engine.model import Model
from engine.network.conditional import Row
from engine.network.said import Said, Words, series
from engine.network.story import Rules

ROWS = 24  # commonest configurations in a table; the program holds all
LEVELS = 7  # columns of shares in a table; further levels are added up


@dataclass(frozen=True)
class Line:
    """A row of the table. given: a level for each parent.  shares: (share, interval) for each level shown."""

    given: tuple[str, ...]
    common: str
    shares: tuple[tuple[str, str], ...]


@dataclass(frozen=True)
class Account:
    """One column. leads: what it leads to, a sentence, or nothing.  note: what the table leaves out."""

    name: str
    picked: bool
    touches: Words
    rules: Rules
    leads: Words
    parents: tuple[str, ...]
    levels: tuple[str, ...]
    lines: tuple[Line, ...]
    note: str


def accounts(model: Model, picked: str | None) -> tuple[Account, ...]:
    """Every column: the picked one, outcomes, those that may be changed, and the others, parents before children."""
    outcomes = () if model.order is None else tuple(model.order.outcomes)

    def rank(name: str) -> tuple[bool, bool, bool]:
        return name != picked, name not in outcomes, model.order is not None and name not in model.changeable

    return tuple(_account(model, name, picked) for name in sorted(model.network.names, key=rank))


def _account(model: Model, name: str, picked: str | None) -> Account:
    told, node = model.account(name, ROWS), model.network.node(name)
    leads = [target for source, target in model.links if source == name and (source, target) not in model.unsettled]
    shown = _shown(told.rows, len(node.levels))
    return Account(
        name=name,
        picked=name == picked,
        touches=told.touches,
        rules=told.rules,
        leads=(Said("It leads to "), *series([[Said(target, "name")] for target in leads], " and "), Said("."))
        if leads
        else (),
        parents=node.parents,
        levels=tuple(node.levels[place] for place in shown),
        lines=tuple(_line(row, shown) for row in told.rows),
        note=_note(told.left_out, len(node.levels) - len(shown)),
    )


def _shown(rows: tuple[Row, ...], levels: int) -> list[int]:
    """Positions of the levels shown: all, or the commonest of many."""
    if levels <= LEVELS:
        return list(range(levels))
    overall = sum(row.weight * row.shares for row in rows)
    return sorted(np.argsort(-np.asarray(overall), kind="stable")[:LEVELS].tolist())


def _line(row: Row, shown: list[int]) -> Line:
    return Line(
        given=row.given,
        common=share(row.weight),
        shares=tuple((share(row.shares[place]), span(row.low[place], row.high[place])) for place in shown),
    )


def _note(rows: int, levels: int) -> str:
    left = [
        words
        for words, number in (
            (f"{small_word(rows)} rarer {plural(rows, 'combination')}", rows),
            (f"{small_word(levels)} rarer {plural(levels, 'level')}", levels),
        )
        if number
    ]
    return f"Not shown: {listing(left)}; the program holds them." if left else ""
