"""Were there records, among people like these, that had the value the lever would set?"""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from engine.answering.answer import Caution
from engine.answering.counting import Records
from engine.answering.question import Setting
from engine.doubting.case import Case, Found, named
from engine.network.nodes import Node
from engine.records.table import SMALL_COUNT

WEAKENS_FROM = 0.05  # share of the pinned records in thin strata; below one in twenty it cannot move the answer far
BLOCKS_OVER = 0.5
MOST_STRATA = 1_000_000


def check(case: Case) -> Found | None:
    """Compare, within strata of the lever's parents, the pinned records with those that had the lever's value.

    Weakens: at least one in twenty of the pinned are in strata with fewer than the small-count limit of records at
    the value. Blocks: over half are in strata where no record has it (positivity: Rosenbaum & Rubin 1983).

    Each value may be common and their combination unheard of. So each column that the levers lead to is looked at by
    the same rule: were there records with its parents as set? It is told of unless a lever by itself is as bad.
    """
    if case.records is None or not case.levers:
        return None
    found: list[Caution] = []
    if case.matching.size:
        for column, setting in case.levers.items():
            parents = case.network.node(column).parents
            alike = _records_alike(case.records, {column: setting}, parents)[case.matching]
            found += _caution(case, column, setting, parents, alike)
        together = _combined(case, case.records)
        if not found or (together and together[0].rank == "blocks" and found[0].rank != "blocks"):
            found = [*together, *found]
    return tuple(found)


def _combined(case: Case, records: Records) -> list[Caution]:
    """The worst caution about a column, on the way to one in question, whose parents would be set as never seen."""
    moved = case.network.descendants(case.levers)
    worst: list[Caution] = []
    for node in case.network.nodes:
        leads = {node.name, *case.network.descendants([node.name])} & set(case.asked.watch)
        if len(node.parents) > 1 and leads and set(node.parents) & case.levers.keys():
            worst = max(worst, _as_set(case, records, node, moved), key=_weight)
    return worst


def _as_set(case: Case, records: Records, node: Node, moved: frozenset[str]) -> list[Caution]:
    """Parents that a lever moves without setting them are not compared: they would not stay as they were recorded."""
    values = {parent: case.levers[parent] for parent in node.parents if parent in case.levers}
    others = tuple(parent for parent in node.parents if parent not in values and parent not in moved)
    if len(values) + len(others) < 2:
        return []
    alike = _records_alike(records, values, others)[case.matching]
    rows, none, thin = alike.size, int((alike == 0).sum()), int((alike < SMALL_COUNT).sum())
    together = named(f"{column} = {setting.level}" for column, setting in values.items())
    both = f"{together} together" if len(values) > 1 else together
    like = f"are alike in {named(others)} to" if others else "are compared with"
    do = "Set one of them alone." if len(values) > 1 else f"Ask about a group in which {together} was recorded."
    figures = {"rows": rows, "share thin": thin / rows, "share without": none / rows}
    columns = (*values, *others, node.name)
    if none > BLOCKS_OVER * rows:
        text = f"records asked about {like} no record with {both}, on which {node.name} depends."
        return [Caution("blocks", "overlap", case.out_of_these(none), text, do, figures, columns)]
    if thin >= WEAKENS_FROM * rows:
        text = (
            f"records asked about {like} fewer than {SMALL_COUNT} records with {both}, on which {node.name} depends. "
            "Where records are this thin the model fills in."
        )
        return [Caution("weakens", "overlap", case.out_of_these(thin), text, do, figures, columns)]
    return []


def _weight(found: list[Caution]) -> tuple[bool, float]:
    return (found[0].rank == "blocks", found[0].figures["share thin"]) if found else (False, 0.0)


def _records_alike(records: Records, values: Mapping[str, Setting], parents: tuple[str, ...]) -> np.ndarray:
    """(rows,) for each record, how many records of the same stratum of `parents` have all of the levers' values."""
    stratum, strata = np.zeros(records.rows, dtype=np.int64), 1
    for parent in parents:
        stratum = stratum * len(records.levels(parent)) + records.codes(parent)
        strata *= len(records.levels(parent))
        if strata > MOST_STRATA:  # keep only those that occur
            occurring, stratum = np.unique(stratum, return_inverse=True)
            strata = occurring.size
    held = np.ones(records.rows, dtype=bool)
    for column, setting in values.items():
        held &= records.codes(column) == setting.position
    return np.bincount(stratum, weights=held)[stratum]


def _caution(case: Case, column: str, setting: Setting, parents: tuple[str, ...], alike: np.ndarray) -> list[Caution]:
    rows, none, thin = alike.size, int((alike == 0).sum()), int((alike < SMALL_COUNT).sum())
    value = f"{column} = {setting.level}"
    figures = {"rows": rows, "share thin": thin / rows, "share without": none / rows}
    if none > BLOCKS_OVER * rows:
        text = (
            f"records asked about are alike in {named(parents)} to no record with {value}."
            if parents
            else f"records asked about have nothing to be compared with: no record has {value}."
        )
        do = f"Ask about a group in which {value} was recorded, or set {column} to another level."
        return [Caution("blocks", "overlap", case.out_of_these(none), text, do, figures, (column, *parents))]
    if thin >= WEAKENS_FROM * rows:
        like = f"are alike in {named(parents)} to" if parents else "are compared with"
        text = (
            f"records asked about {like} fewer than {SMALL_COUNT} records with {value}. "
            "Where records are this thin the model fills in."
        )
        do = f"Ask about a wider group, or record more of {value} there first."
        return [Caution("weakens", "overlap", case.out_of_these(thin), text, do, figures, (column, *parents))]
    return []
