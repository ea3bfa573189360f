"""How each column comes about, on the Model page: its rules in words, and the table behind them on demand."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from app.wording.amounts import listing, plural, small_word
from app.wording.figures import share, span
from app.wording.numbers import amount, decimals_for
from engine.model import Model
from engine.network.conditional import NumberRow, Row
from engine.network.number_rules import NINE_IN_TEN
from engine.network.said import Said, Words, series
from engine.network.story import Rules
from engine.records.wording import figure

ROWS = 24  # commonest configurations in a table; the program holds all
LEVELS = 7  # columns of shares in a table; further levels are added up


@dataclass(frozen=True)
class Line:
    """A row of the table. given: a level for each parent.  shares: (share, interval) for each level shown; of a number
    its mean, its spread and its slopes, with an interval where one is told."""

    given: tuple[str, ...]
    common: str
    shares: tuple[tuple[str, str], ...]


@dataclass(frozen=True)
class Account:
    """One column. leads: what it leads to, a sentence, or nothing.  note: what the table leaves out.

    first: whether it is told before others that may be folded.
    number: whether its table tells means; then `parents` are its category parents, and `levels` what is told of it.
    held: the values of its number parents at which its means are told; nothing without such.
    """

    name: str
    picked: bool
    touches: Words
    rules: Rules
    leads: Words
    parents: tuple[str, ...]
    levels: tuple[str, ...]
    held: Words
    lines: tuple[Line, ...]
    note: str
    first: bool = False
    number: bool = False


def accounts(model: Model, picked: str | None) -> tuple[Account, ...]:
    """Every column: the picked one, outcomes, those with links, of these first those that may be changed.

    Parents before children.
    """
    outcomes = () if model.order is None else tuple(model.order.outcomes)
    linked = {name for link in model.links for name in link}

    def rank(name: str) -> tuple[bool, bool, bool, bool]:
        fixed = model.order is not None and name not in model.changeable
        return name != picked, name not in outcomes, name not in linked, fixed

    return tuple(_account(model, name, picked, outcomes) for name in sorted(model.network.names, key=rank))


def _account(model: Model, name: str, picked: str | None, outcomes: tuple[str, ...]) -> Account:
    told, node = model.account(name, ROWS), model.network.node(name)
    leads = [target for source, target in model.links if source == name and (source, target) not in model.unsettled]
    said = (Said("It leads to "), *series([[Said(target, "name")] for target in leads], " and "), Said("."))
    number = name in model.network.numbers
    if number:
        parents = model.network.category_parents(name)
        heads, lines, hidden = _heads(model.network.number_parents(name)), _number_lines(told.means), 0
    else:
        shown = _shown(told.rows, len(node.levels))
        parents, heads = node.parents, tuple(node.levels[place] for place in shown)
        lines, hidden = tuple(_line(row, shown) for row in told.rows), len(node.levels) - len(shown)
    return Account(
        name=name,
        picked=name == picked,
        touches=told.touches,
        rules=told.rules,
        leads=said if leads else (),
        parents=parents,
        levels=heads,
        held=told.held,
        lines=lines,
        note=_note(told.left_out, hidden),
        first=name == picked or name in outcomes,
        number=number,
    )


def _heads(numbers: tuple[str, ...]) -> tuple[str, ...]:
    """What is told of a number in each row."""
    return ("on average", "9 in 10 expected within", *(f"for each 1 more of {number}" for number in numbers))


def _number_lines(rows: tuple[NumberRow, ...]) -> tuple[Line, ...]:
    found = []
    for row in rows:
        decimals = decimals_for(row.high - row.low, 50.0 * row.sd)
        interval = f"{amount(row.low, decimals)} to {amount(row.high, decimals)}" if row.low < row.high else ""
        told = [(amount(row.mean, decimals), interval), (f"{_two_digits(NINE_IN_TEN * row.sd)} of that", "")]
        told += [(f"{'+' if slope > 0.0 else ''}{_two_digits(slope)}", "") for slope in row.slopes]
        found.append(Line(row.given, share(row.weight), tuple(told)))
    return tuple(found)


def _two_digits(value: float) -> str:
    return figure(float(f"{value:.2g}"))


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
        shares=tuple((share(row.shares[place]), _interval(row.low[place], row.high[place])) for place in shown),
    )


def _interval(low: float, high: float) -> str:
    """Once where both ends read alike: under 1%."""
    return share(low) if share(low) == share(high) else span(low, high)


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
