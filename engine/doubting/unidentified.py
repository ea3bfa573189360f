"""Does what a lever does follow from these records, beside the unrecorded causes that were stated?"""

from __future__ import annotations

import numpy as np

from engine.answering.answer import Caution
from engine.answering.settings import MixSetting, Setting
from engine.doubting.bounds import no_assumption_bounds, reached
from engine.doubting.case import Case, Found, named, per_cent
from engine.doubting.identification import Hedge
from engine.doubting.rereading import Rereading
from engine.doubting.told import told, would_let_it_follow
from engine.refusal import Refusal


def check(case: Case) -> Found | None:
    """Blocks where no method can tell (Shpitser & Pearl 2006); where one can, says how it is read.

    With no assumption bounds are given (Manski 1990), and what could be recorded. Each column in question has a
    caution of its own when it does not follow; else the first that is read otherwise than by the links alone is told.
    """
    beside = case.beside
    if beside is None or not case.levers:
        return None
    found: list[Caution] = []
    for column in case.asked.watch:
        hedges = [
            by[1]
            for by in (beside.read_by(world, (column,)) for world in beside.worlds)
            if by is not None and isinstance(by[1], Hedge)
        ]
        if hedges:
            found.append(_blocks(case, beside, column, hedges[0]))
    if found:
        return tuple(found)
    otherwise = [column for column in case.asked.watch if beside.matters("set", column)]
    return (_tells(case, beside, otherwise[0]),) if otherwise else ()


def _blocks(case: Case, beside: Rereading, column: str, hedge: Hedge) -> Caution:
    pairs = hedge.pairs
    causes = "1 unrecorded cause" if len(pairs) == 1 else f"{len(pairs)} unrecorded causes"
    between = "; ".join(named(pair) for pair in pairs)
    text = (
        f"that you stated, of {between}, cannot be told apart from what {named(case.levers)} does, so what setting it "
        f"would do to {column} does not follow from these records by any method."
    )
    figures: dict[str, float] = {"causes": float(len(pairs))}
    bounds = _bounds(case, column)
    if bounds is not None:
        figures |= {"low": bounds[0], "high": bounds[1]}
        text += (
            f" With no assumption at all, {named(case.in_question(column), 'or')} in {column} lies between "
            f"{per_cent(bounds[0])} and {per_cent(bounds[1])}."
        )
    enough = would_let_it_follow(beside.graph, [column], case.levers, case.asked.pinned)
    record = f"Record what drives both {named(enough[0])}" if enough else "Record what drives these columns"
    do = f"{record}, or give places by lot where that is fair and allowed."
    return Caution("blocks", "unidentified", causes, text, do, figures, (*hedge.columns,))


def _tells(case: Case, beside: Rereading, column: str) -> Caution:
    by = told(beside.graph, column, tuple(case.levers), case.asked.pinned)
    pairs = sorted(beside.graph.sorted(pair) for pair in beside.graph.pairs)
    causes = "1 unrecorded cause" if len(pairs) == 1 else f"{len(pairs)} unrecorded causes"
    text = f"stated: what is set is read for {column} {by.text}. It holds only if nothing else drives them."
    do = "Ask somebody who knows the work whether the links left out are truly not there; the records cannot tell."
    columns = tuple(dict.fromkeys((*case.levers, column, *by.columns)))
    return Caution("know", "unrecorded", causes, text, do, {"causes": float(len(pairs))}, columns)


def _bounds(case: Case, column: str) -> tuple[float, float] | None:
    """The least and the most that the levels in question can be, for one lever fixed or mixed, at the point."""
    if len(case.levers) != 1 or case.answer.joints is None or case.asked.after.columns:
        return None
    ((lever, setting),) = case.levers.items()
    if not isinstance(setting, Setting | MixSetting):
        return None
    try:
        joint = case.answer.joints((lever, column))["among"][0][..., :1]
    except Refusal:
        return None
    node = case.network.node(column)
    good = [node.levels.index(level) for level in case.in_question(column)]
    two = np.stack([joint[:, good].sum(axis=1), np.delete(joint, good, axis=1).sum(axis=1)], axis=1)
    low, high = no_assumption_bounds(two)
    taken = np.eye(len(joint))[setting.position] if isinstance(setting, Setting) else np.array(setting.shares)
    among = two.sum(axis=0)
    ends = [float(reached(np.tensordot(taken, end, 1), among, setting.reach)[0, 0]) for end in (low, high)]
    return ends[0], ends[1]
