"""Ask a checked question: every reading, and how it was come by."""

from __future__ import annotations

import time
from functools import partial

from engine.answering.answer import Answer, Marginal, Reading
from engine.answering.counting import Records
from engine.answering.planner import Planner
from engine.answering.question import Question
from engine.answering.scenes import Seen
from engine.refusal import Refusal, whole

FEWEST_DRAWS = 20  # below these the ends of a 90 % interval are the outermost draws


def ask(
    planner: Planner,
    records: Records | None,
    asked: Question,
    draws: int = 200,
    seed: int = 0,
    exact: bool | None = None,
) -> Answer:
    """The answer to `asked`, without cautions.

    draws: parameter draws behind every interval; none are made for a network known exactly.
    exact: True: never sampled; False: always sampled; None: sampled where summing exactly would cost too much.
    Raises Refusal for pins that contradict each other, for a question too wide to sum when it has to be exact, and for
    draws that are neither 0 nor FEWEST_DRAWS or more.
    """
    if exact is not None and not isinstance(exact, bool):
        raise Refusal(f"exact = {exact} is no choice.", where="exact", do="Give True, False or None.")
    draws = whole(draws, "draws", 0, f"Give 0 for points alone, or at least {FEWEST_DRAWS}.")
    seed = whole(seed, "seed", 0, "Give a whole number, 0 or more.")
    if 0 < draws < FEWEST_DRAWS:
        raise Refusal(
            f"From {draws} {'draw' if draws == 1 else 'draws'} no interval can be told.",
            where="draws",
            do=f"Give 0 for points alone, or at least {FEWEST_DRAWS}.",
        )
    started = time.perf_counter()
    worlds = planner.worlds(asked, draws, seed, exact)
    matching, told, counted = None, True, {}
    if records is not None:
        rows = records.matching(asked.before)
        matching, counted = int(rows.size), records.counted(asked.columns, asked.before, rows)
        told = records.tellable(asked.before, rows)
    readings = {}
    for column in asked.columns:
        levels = planner.network.node(column).levels
        recorded, among = _marginal(levels, column, worlds.recorded), _marginal(levels, column, worlds.among)
        assert recorded is not None and among is not None
        readings[column] = Reading(
            column,
            recorded=recorded,
            among=among,
            set=_marginal(levels, column, worlds.set),
            had=_marginal(levels, column, worlds.had),
            counted=counted.get(column),
            against=_marginal(levels, column, worlds.against),
        )
    return Answer(
        watch=asked.watch,
        readings=readings,
        method=worlds.method,
        cost=worlds.cost,
        milliseconds=(time.perf_counter() - started) * 1000.0,
        log_evidence=worlds.log_evidence,
        matching=matching,
        matching_told=told,
        mc_error=worlds.mc_error,
        effective=worlds.effective,
        pinned_after=asked.after.columns,
        joints=partial(planner.joints, asked, draws, seed, exact),
    )


def _marginal(levels: tuple[str, ...], column: str, seen: Seen | None) -> Marginal | None:
    if seen is None or column not in seen.shares:
        return None
    shares = seen.shares[column]
    number = seen.numbers.get(column)
    means = None if number is None else number.means[1:]
    return Marginal(levels, shares[:, 0], shares[:, 1:], number, means)
