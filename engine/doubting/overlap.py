"""Were there records, among people like these, that had the value the lever would set?"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.answering.answer import Caution
from engine.answering.counting import Records
from engine.doubting.aims import Aim, Way
from engine.doubting.case import Case, Found, named
from engine.network.nodes import Node, Number
from engine.records.table import SMALL_COUNT

WEAKENS_FROM = 0.05  # share of the pinned records in thin strata; below one in twenty it cannot move the answer far
BLOCKS_OVER = 0.5
MOST_STRATA = 1_000_000


def check(case: Case) -> Found | None:
    """Compare, within strata of the lever's parents, the pinned records with those that had the lever's value.

    Weakens: at least one in twenty of the pinned are in strata with fewer than the small-count limit of records at
    the value. Blocks: over half are in strata where no record has it (positivity: Rosenbaum & Rubin 1983). A number
    is looked at by its bands, as a value to set and as a parent; of a mix or a rule, those whose value it would change.

    Each value may be common and their combination unheard of. So each column that the levers lead to is looked at by
    the same rule: were there records with its parents as set? It is told of unless a lever by itself is as bad.
    """
    if case.records is None or not case.levers:
        return None
    if not case.matching.size:
        return ()
    return (*_of(case, case.records, case.aims), *_of(case, case.records, case.aims_against))


def _of(case: Case, records: Records, aims: Mapping[str, Aim]) -> list[Caution]:
    """The cautions about one world's levers."""
    found: list[Caution] = []
    for column, aimed in aims.items():
        parents = case.network.node(column).parents
        support = _support(case, records, [aimed], parents)
        if support is not None:
            found += _caution(case, aimed, parents, support)
    together = _combined(case, records, aims)
    if not found or (together and together[0].rank == "blocks" and found[0].rank != "blocks"):
        return [*together, *found]
    return found


@dataclass(frozen=True)
class Support:
    """Of `rows` pinned records that a lever concerns, those in strata without, and with few, records at its value.

    With a mix they are expected numbers, rounded.
    """

    rows: int
    none: int
    thin: int

    @property
    def figures(self) -> dict[str, float]:
        return {"rows": self.rows, "share thin": self.thin / self.rows, "share without": self.none / self.rows}

    @property
    def rank(self) -> str | None:
        if self.none > BLOCKS_OVER * self.rows:
            return "blocks"
        return "weakens" if self.thin >= WEAKENS_FROM * self.rows else None


def _support(case: Case, records: Records, aims: list[Aim], parents: tuple[str, ...]) -> Support | None:
    """None when nobody's value would be set. `aims`: levers set together; all but one have a single way."""
    concerned = np.zeros(records.rows, dtype=np.bool_)
    for aimed in aims:
        concerned |= aimed.concerned
    asked = case.matching[concerned[case.matching]]
    if asked.size == 0:
        return None
    stratum = _stratum(records, parents)
    none = thin = people = 0.0
    for ways in _together(aims):
        changing = np.ones(asked.size, dtype=np.bool_)
        if len(aims) == 1 and len(aims[0].ways) > 1:  # of a mix, those whose value it would change
            changing = ways[0].codes[asked] != records.codes(aims[0].column)[asked]
        alike = _records_alike(records, stratum, aims, ways, asked)[changing]
        share = float(np.prod([way.share for way in ways]))
        people += share * alike.size
        none += share * int((alike == 0).sum())
        thin += share * int((alike < SMALL_COUNT).sum())
    if people < 0.5:
        return None
    return Support(round(people), round(none), round(thin))


def _together(aims: list[Aim]) -> list[tuple[Way, ...]]:
    found: list[tuple[Way, ...]] = [()]
    for aimed in aims:
        found = [(*before, way) for before in found for way in aimed.ways]
    return found


def _combined(case: Case, records: Records, aims: Mapping[str, Aim]) -> list[Caution]:
    """The worst caution about a column, on the way to one in question, whose parents would be set as never seen."""
    moved = case.network.descendants(aims)
    worst: list[Caution] = []
    for node in case.network.nodes:
        leads = {node.name, *case.network.descendants([node.name])} & set(case.asked.watch)
        if len(node.parents) > 1 and leads and set(node.parents) & aims.keys():
            worst = max(worst, _as_set(case, records, node, moved, aims), key=_weight)
    return worst


def _as_set(
    case: Case, records: Records, node: Node, moved: frozenset[str], levers: Mapping[str, Aim]
) -> list[Caution]:
    """Parents that a lever moves without setting them are not compared: they would not stay as they were recorded.

    Nor are those of a number that are numbers: its line runs on from the records it was drawn through.
    """
    compared = [
        parent
        for parent in node.parents
        if not (isinstance(node, Number) and isinstance(case.network.node(parent), Number))
    ]
    aims = [levers[parent] for parent in compared if parent in levers]
    others = tuple(parent for parent in compared if parent not in levers and parent not in moved)
    if not aims or len(aims) + len(others) < 2:
        return []
    support = _support(case, records, aims, others)
    if support is None or support.rank is None:
        return []
    together = named(aimed.value for aimed in aims)
    both = f"{together} together" if len(aims) > 1 else together
    like = f"are alike in {named(others)} to" if others else "are compared with"
    do = "Set one of them alone." if len(aims) > 1 else f"Ask about a group in which {together} was recorded."
    columns = (*(aimed.column for aimed in aims), *others, node.name)
    if support.rank == "blocks":
        text = f"records asked about {like} no record with {both}, on which {node.name} depends."
        return [Caution("blocks", "overlap", _figure(case, support.none, support), text, do, support.figures, columns)]
    text = (
        f"records asked about {like} fewer than {SMALL_COUNT} records with {both}, on which {node.name} depends. "
        "Where records are this thin the model fills in."
    )
    return [Caution("weakens", "overlap", _figure(case, support.thin, support), text, do, support.figures, columns)]


def _weight(found: list[Caution]) -> tuple[bool, float]:
    return (found[0].rank == "blocks", found[0].figures["share thin"]) if found else (False, 0.0)


def _figure(case: Case, part: int, support: Support) -> str:
    """So many of the records asked about; of those that a mix or a rule concerns only the kind of share is told."""
    if support.rows == case.matching.size:
        return case.out_of_these(part)
    return "all" if part == support.rows else "most" if 2 * part > support.rows else "some"


def _stratum(records: Records, parents: Iterable[str]) -> NDArray[np.int64]:
    """(rows,) which combination of the parents' levels each record has."""
    stratum, strata = np.zeros(records.rows, dtype=np.int64), 1
    for parent in parents:
        stratum = stratum * len(records.levels(parent)) + records.codes(parent)
        strata *= len(records.levels(parent))
        if strata > MOST_STRATA:  # keep only those that occur
            occurring, stratum = np.unique(stratum, return_inverse=True)
            strata = occurring.size
    return stratum


def _records_alike(
    records: Records,
    stratum: NDArray[np.int64],
    aims: list[Aim],
    ways: tuple[Way, ...],
    asked: NDArray[np.intp],
) -> NDArray[np.int64]:
    """(asked,) for each, how many records of the same stratum have all that the levers would make of it."""
    held, wanted = stratum, stratum
    for aimed, way in zip(aims, ways, strict=True):
        levels = len(records.levels(aimed.column))
        held = held * levels + records.codes(aimed.column)
        wanted = wanted * levels + way.codes
    both = np.concatenate([held, wanted[asked]])
    if both.max(initial=0) > MOST_STRATA:
        both = np.unique(both, return_inverse=True)[1]
    counts = np.bincount(both[: records.rows], minlength=int(both.max()) + 1)
    return np.asarray(counts[both[records.rows :]], dtype=np.int64)


def _caution(case: Case, aimed: Aim, parents: tuple[str, ...], support: Support) -> list[Caution]:
    column, value = aimed.column, aimed.value
    like_it = f"{value}" if aimed.said != "amount" else f"{column} in the band it would come into"
    if support.rank == "blocks":
        text = (
            f"records asked about are alike in {named(parents)} to no record with {like_it}."
            if parents
            else f"records asked about have nothing to be compared with: no record has {like_it}."
        )
        do = f"Ask about a group in which {like_it} was recorded, or set {column} to another {aimed.said}."
        figure = _figure(case, support.none, support)
        return [Caution("blocks", "overlap", figure, text, do, support.figures, (column, *parents))]
    if support.rank == "weakens":
        like = f"are alike in {named(parents)} to" if parents else "are compared with"
        text = (
            f"records asked about {like} fewer than {SMALL_COUNT} records with {like_it}. "
            "Where records are this thin the model fills in."
        )
        do = f"Ask about a wider group, or record more of {like_it} there first."
        figure = _figure(case, support.thin, support)
        return [Caution("weakens", "overlap", figure, text, do, support.figures, (column, *parents))]
    return []
