"""What a column and its parents must be like before they are taken into a network."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from engine.network.nodes import Category, Node, Number
from engine.refusal import Refusal, quoted

ROUNDING = 1e-8  # how far a row of a table may be from 1: tables are often written with nine or more digits


def check_family(node: Node, by_name: Mapping[str, Node]) -> None:
    """Raises Refusal unless the parameters of `node` fit its parents, which are among `by_name`."""
    _check_parents(node, by_name)
    if isinstance(node, Category):
        _check_levels(node)
        _check_table(node, by_name)
    else:
        _check_regression(node, by_name)


def number_parents(node: Node, by_name: Mapping[str, Node]) -> tuple[str, ...]:
    """The parents that are numbers, in order: each has a slope where `node` is a number, bands where a category."""
    return tuple(parent for parent in node.parents if isinstance(by_name[parent], Number))


def category_parents(node: Node, by_name: Mapping[str, Node]) -> tuple[str, ...]:
    """The parents that are categories, in order: each has an axis in the parameters of `node`."""
    return tuple(parent for parent in node.parents if isinstance(by_name[parent], Category))


def _check_levels(node: Category) -> None:
    if not node.levels or not all(isinstance(level, str) for level in node.levels):
        raise Refusal(
            f"{quoted(node.name)} needs levels, each a text.", where=node.name, do='Give them as ["no", "yes"].'
        )
    if len(set(node.levels)) < len(node.levels):
        raise Refusal(f"{quoted(node.name)} has a level twice.", where=node.name, do="Give each level once.")


def _check_parents(node: Node, by_name: Mapping[str, Node]) -> None:
    if not all(isinstance(parent, str) for parent in node.parents):
        raise Refusal(f"A parent of {quoted(node.name)} is not a text.", where=node.name, do="Give columns by name.")
    if len(set(node.parents)) < len(node.parents):
        raise Refusal(f"{quoted(node.name)} has a parent twice.", where=node.name, do="Give each parent once.")
    for parent in node.parents:
        if parent not in by_name:
            raise Refusal(
                f"{quoted(node.name)} has the parent {quoted(parent)}, which is no column of this network.",
                where=node.name,
                do=f"Add {quoted(parent)}, or take it out of the parents.",
            )


def _check_table(node: Category, by_name: Mapping[str, Node]) -> None:
    for parent in number_parents(node, by_name):
        if not by_name[parent].cuts:
            raise Refusal(
                f"{quoted(parent)} leads to the category {quoted(node.name)} and has no bands to act through.",
                where=parent,
                do="Give it bands: at least one cut, such as bands=[20].",
            )
    expected = (*(len(by_name[parent].levels) for parent in node.parents), len(node.levels))
    table = np.asarray(node.table)
    if table.shape != expected:
        raise Refusal(
            f"The table of {quoted(node.name)} has the shape {table.shape}; its parents and levels ask for {expected}.",
            where=node.name,
            do="Give one axis per parent in order, and the column's own levels last.",
        )
    if not np.all(np.isfinite(table)) or np.any(table < 0.0):
        raise Refusal(
            f"The table of {quoted(node.name)} holds an entry that is no probability.",
            where=node.name,
            do="Every entry is 0 or more, and each row sums to 1.",
        )
    off = np.abs(table.sum(axis=-1) - 1.0)
    if np.any(off > ROUNDING):
        row = np.unravel_index(int(np.argmax(off)), off.shape)
        at = ", ".join(
            f"{quoted(parent)} = {quoted(by_name[parent].levels[place])}"
            for parent, place in zip(node.parents, row, strict=True)
        )
        raise Refusal(
            f"The table of {quoted(node.name)} sums to {table[row].sum():.6g} instead of 1"
            f"{f' where {at}' if at else ''}.",
            where=node.name,
            do="Correct that row; nothing is rescaled here.",
        )
    if node.dirichlet is not None and node.dirichlet.shape != expected:
        raise Refusal(f"The Dirichlet parameters of {quoted(node.name)} do not fit its table.", where=node.name)


def _check_regression(node: Number, by_name: Mapping[str, Node]) -> None:
    levels = tuple(len(by_name[parent].levels) for parent in category_parents(node, by_name))
    numbers = len(number_parents(node, by_name))
    for what, given, expected in (
        ("intercept", node.intercept, levels),
        ("slopes", node.slopes, (*levels, numbers)),
        ("variance", node.variance, levels),
    ):
        array = np.asarray(given)
        if array.shape != expected:
            verb = "have" if what == "slopes" else "has"
            raise Refusal(
                f"The {what} of {quoted(node.name)} {verb} the shape {array.shape}; its parents ask for {expected}.",
                where=node.name,
                do="Give one axis per category parent in order, and for slopes one last axis of number parents.",
            )
        if not np.all(np.isfinite(array)):
            raise Refusal(
                f"The {what} of {quoted(node.name)} {'hold' if what == 'slopes' else 'holds'} an entry that is "
                "no finite number.",
                where=node.name,
                do="Give finite numbers.",
            )
    if np.any(np.asarray(node.variance) < 0.0):
        raise Refusal(
            f"The variance of {quoted(node.name)} is below 0 somewhere.",
            where=node.name,
            do="Give 0 for a number that follows its parents exactly, else a number above 0.",
        )
    posterior = node.regression
    if posterior is not None and (posterior.levels, len(posterior.centre)) != (levels, numbers + 1):
        raise Refusal(f"The regression of {quoted(node.name)} does not fit its parents.", where=node.name)
