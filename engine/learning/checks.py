"""What cannot be learned from: records, orders and limits that are refused before any work is done."""

from __future__ import annotations

from collections.abc import Callable
from functools import partial
from numbers import Integral

import numpy as np

from engine.learning.folds import FOLDS
from engine.learning.search import check_widths
from engine.order import Direction, Order
from engine.records.spikes import refuse_collinear, taken_as_bands
from engine.records.table import SMALL_COUNT, Coded, Column, Table
from engine.records.wording import people
from engine.refusal import Refusal, quoted, whole

FEWEST_ROWS = 30
MOST_LEVELS = 50
MOST_PARENTS = 5
SMALLEST, LARGEST = 1e-100, 1e100
DIGITS = 1e-10  # of its mean that a number must vary by: a float has 16 digits, and products of it need some
KEEP = "Bring more records, or keep those that blanks have dropped."
CHOSEN = "You chose it."  # all that a column says of why it is left out when only the user's choice speaks for it


def check_table(table: Table, order: Order) -> None:
    """Raises Refusal for what is no table or no order, and for an order that the table's columns do not fit."""
    if not isinstance(table, Table):
        raise Refusal(
            "What is to be learned from is no table of records.",
            where="table",
            do="Make one with engine.read_table(file) or engine.Table.from_frame(frame).",
        )
    if not isinstance(order, Order):
        raise Refusal(
            "The order is none.", where="order", do="State it as engine.Order([(stage, [column, ...]), ...])."
        )
    for name in order.columns:
        if name not in table.columns:
            raise Refusal(
                f"The order names the column {quoted(name)}, which the records do not have.",
                where=name,
                do="Take it out of the order.",
            )
        if table.columns[name].kind == "left out":
            why = table.columns[name].why
            raise Refusal(
                f"The column {quoted(name)} is left out of the records but stands in the order. {why}",
                where=name,
                do="Take it out of the order, or give it a kind." if why == CHOSEN else "Take it out of the order.",
            )
        if not table.columns[name].used:
            raise Refusal(
                f"The column {quoted(name)} is taken as the {table.columns[name].kind} of the records but stands in "
                "the order.",
                where=name,
                do="Take it out of the order, or give it another kind.",
            )


def check_limits(max_links: int | None, max_parents: int, graphs: int, seed: int) -> None:
    """Raises Refusal for limits that are no whole numbers or out of range."""
    if isinstance(max_parents, bool) or not isinstance(max_parents, Integral) or not 1 <= max_parents <= MOST_PARENTS:
        raise Refusal(
            f"A column may have at most 1 to {MOST_PARENTS} parents, not {max_parents}.",
            where="max_parents",
            do="The usual number is 3.",
        )
    if max_links is not None:
        whole(max_links, "max_links", 0, "Leave it out for no limit.")
    whole(graphs, "graphs", 0, "The usual number is 200.")
    whole(seed, "seed", 0, "Give a whole number, 0 or more.")


def check_rows(table: Table) -> None:
    """Raises Refusal for fewer records than FEWEST_ROWS, and for records whose weights make them worth fewer."""
    _check_count(table.rows, "Bring more records." if not any(table.dropped.values()) else KEEP)
    weight = next((name for name, column in table.columns.items() if column.kind == "weight"), "weight")
    _check_worth(table.weights, weight)


def _check_count(rows: int, do: str) -> None:
    if rows < FEWEST_ROWS:
        raise Refusal(
            f"There are {people(rows, SMALL_COUNT)} records to learn from; at least {FEWEST_ROWS} are needed.",
            where="records",
            do=do,
        )


def _check_worth(weights: np.ndarray, where: str) -> None:
    """By Kish's effective size, which the scale of the weights does not change."""
    shares = weights / weights.max()
    worth = float(shares.sum() ** 2 / (shares**2).sum())
    if worth < FEWEST_ROWS * (1.0 - 1e-9):
        raise Refusal(
            f"By their weights the {weights.size:,} records are worth {people(int(worth), SMALL_COUNT)} of equal "
            f"weight; at least {FEWEST_ROWS} are needed to learn from.",
            where=where,
            do="Bring more records, or give them weights that are nearer to each other.",
        )


def check_coded(coded: Coded, order: Order) -> None:
    """Raises Refusal for columns that hold one value or too many levels, unfit outcomes, and stages too wide."""
    if coded.names != order.columns:
        raise AssertionError("the coded columns are not those of the order")
    if not coded.names:
        raise Refusal("The order holds no column.", where="stages", do="Put at least one column into a stage.")
    _check_count(coded.codes.shape[0], "Bring more records.")
    _check_worth(coded.weights, "weight")
    for place, (name, levels) in enumerate(zip(coded.names, coded.levels, strict=True)):
        if place in coded.numbers:
            _check_values(name, coded.values[:, coded.numbers.index(place)])
        else:
            _check_levels(name, levels, coded.codes[:, place])
        better = order.outcomes.get(name, ())
        if isinstance(better, Direction) and coded.kinds[place] == "category":
            raise Refusal(
                f"The outcome {quoted(name)} is a category: its levels have no order, so more of it "
                "can be neither better nor worse.",
                where=name,
                do="Name its better level or levels, or make it a grade with its levels from low to high.",
            )
        for level in () if isinstance(better, Direction) else better:
            if level not in levels:
                raise Refusal(
                    f"The outcome {quoted(name)} has no level {quoted(level)}.",
                    where=name,
                    do=f"Choose from: {', '.join(levels)}.",
                )
    check_widths([(stage.name, len(stage.columns)) for stage in order.stages])


def check_groups(group: np.ndarray | None) -> None:
    """Raises Refusal for fewer groups than parts that are held out, since a group stays whole."""
    groups = FOLDS if group is None else int(np.unique(group).size)
    if groups < FOLDS:
        raise Refusal(
            f"The records belong to too few groups to hold out {FOLDS} parts of them.",
            where="group",
            do=f"Take a column of at least {FOLDS} groups, or none.",
        )


def numbers_to_learn(
    table: Table, order: Order, max_parents: int, tick: Callable[[float], None] = lambda part: None
) -> tuple[tuple[str, ...], tuple[str, ...]]:
    """The columns learned as numbers, and a sentence for each number that is taken as bands instead.

    tick: hears the fraction done, which may end early.
    Raises Refusal for numbers too large or too alike to square, and for one that follows exactly from others.
    """
    columns = [table.columns[name] for name in order.columns]
    if not any(column.kind == "number" for column in columns):
        return (), ()
    bands = taken_as_bands(columns, max_parents, tick)
    kept = [column for column in columns if column.kind == "number" and column.name not in bands]
    for column in kept:
        _check_size(column)
    refuse_collinear(kept, max_parents + 1, partial(tick, 0.0))
    return tuple(column.name for column in kept), tuple(bands.values())


def _check_size(column: Column) -> None:
    """Raises Refusal where squares of a number, or of its differences, leave what a float holds or its digits."""
    values = np.asarray(column.values)
    apart, largest = float(values.max() / 2 - values.min() / 2), float(np.abs(values).max())
    if apart < SMALLEST or largest > LARGEST:
        raise Refusal(
            f"The values of {quoted(column.name)} are too {'large' if largest > LARGEST else 'close together'} to be "
            "learned from as numbers.",
            where=column.name,
            do="Give them in another unit.",
        )
    if 0.0 < float(values.std()) < DIGITS * abs(float(values.mean())):
        raise Refusal(
            f"The values of {quoted(column.name)} are too close together for their size to be learned from as numbers.",
            where=column.name,
            do="Take the same amount off each of them.",
        )


def _check_values(name: str, values: np.ndarray) -> None:
    if not np.isfinite(values).all():
        raise AssertionError("a number that is blank or infinite in a record is not learned as a number")
    if values.min() == values.max():
        _refuse_one_value(name)


def _check_levels(name: str, levels: tuple[str, ...], codes: np.ndarray) -> None:
    if len(levels) < 2 or codes.min() == codes.max():
        _refuse_one_value(name)
    if len(levels) > MOST_LEVELS:
        raise Refusal(
            f"The column {quoted(name)} has {len(levels)} levels; at most {MOST_LEVELS} can be learned from.",
            where=name,
            do="Merge rare levels, or leave the column out.",
        )


def _refuse_one_value(name: str) -> None:
    raise Refusal(
        f"Every record has the same value in {quoted(name)}, so nothing can be learned from it.",
        where=name,
        do="Take it out of the order.",
    )
