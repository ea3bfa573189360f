"""Were there records, among people like these, that had the value the lever would set?"""

from __future__ import annotations

import numpy as np

from engine.answering.answer import Caution
from engine.answering.counting import Records
from engine.answering.question import Setting
from engine.doubting.case import Case, Found, named, out_of
from engine.records.table import SMALL_COUNT

WEAKENS_FROM = 0.05  # share of the pinned records in thin strata; below one in twenty it cannot move the answer far
BLOCKS_OVER = 0.5
MOST_STRATA = 1_000_000


def check(case: Case) -> Found | None:
    """Compare, within strata of the lever's parents, the pinned records with those that had the lever's value.

    Weakens: at least one in twenty of the pinned are in strata with fewer than the small-count limit of records at
    the value. Blocks: over half are in strata where no record has it (positivity: Rosenbaum & Rubin 1983).
    """
    if case.records is None or not case.levers:
        return None
    found = []
    if case.matching.size:
        for column, setting in case.levers.items():
            parents = case.network.node(column).parents
            alike = _records_alike(case.records, column, setting, parents)[case.matching]
            found += _caution(column, setting, parents, alike)
    return tuple(found)


def _records_alike(records: Records, column: str, setting: Setting, parents: tuple[str, ...]) -> np.ndarray:
    """(rows,) for each record, how many records of the same stratum of `parents` have the lever's value."""
    stratum, strata = np.zeros(records.rows, dtype=np.int64), 1
    for parent in parents:
        stratum = stratum * len(records.levels(parent)) + records.codes(parent)
        strata *= len(records.levels(parent))
        if strata > MOST_STRATA:  # keep only those that occur
            occurring, stratum = np.unique(stratum, return_inverse=True)
            strata = occurring.size
    return np.bincount(stratum, weights=records.codes(column) == setting.position)[stratum]


def _caution(column: str, setting: Setting, parents: tuple[str, ...], alike: np.ndarray) -> list[Caution]:
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
        return [Caution("blocks", "overlap", out_of(none, rows), text, do, figures, (column, *parents))]
    if thin >= WEAKENS_FROM * rows:
        like = f"are alike in {named(parents)} to" if parents else "are compared with"
        text = (
            f"records asked about {like} fewer than {SMALL_COUNT} records with {value}. "
            "Where records are this thin the model fills in."
        )
        do = f"Ask about a wider group, or record more of {value} there first."
        return [Caution("weakens", "overlap", out_of(thin, rows), text, do, figures, (column, *parents))]
    return []
