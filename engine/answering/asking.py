"""Ask a checked question: every reading, and how it was come by."""

from __future__ import annotations

import time

import numpy as np

from engine.answering.answer import Answer, Marginal, Reading
from engine.answering.counting import Records
from engine.answering.planner import Planner
from engine.answering.question import Question
from engine.network.network import Network
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
    exact: True or None; what cannot be summed exactly is refused.
    Raises Refusal for pins that contradict each other, for a question too wide to sum, and for draws that are neither
    0 nor FEWEST_DRAWS or more.
    """
    if exact is False:
        raise Refusal("Answers are summed exactly here, never sampled.", where="exact", do="Leave exact out.")
    draws = whole(draws, "draws", 0, f"Give 0 for points alone, or at least {FEWEST_DRAWS}.")
    seed = whole(seed, "seed", 0, "Give a whole number, 0 or more.")
    if 0 < draws < FEWEST_DRAWS:
        raise Refusal(
            f"From {draws} {'draw' if draws == 1 else 'draws'} no interval can be told.",
            where="draws",
            do=f"Give 0 for points alone, or at least {FEWEST_DRAWS}.",
        )
    started = time.perf_counter()
    worlds = planner.worlds(asked, draws, seed)
    matching, told, counted = None, True, {}
    if records is not None:
        rows = records.matching(asked.pins)
        matching, counted = int(rows.size), records.counted(asked.columns, asked.pins, rows)
        told = records.tellable(asked.pins, rows)
    readings = {}
    for column in asked.columns:
        readings[column] = Reading(
            column,
            recorded=_marginal(planner.network, column, worlds.recorded[column]),
            among=_marginal(planner.network, column, worlds.among[column]),
            set=None if worlds.set is None else _marginal(planner.network, column, worlds.set[column]),
            had=(
                None
                if worlds.had is None or column not in worlds.had
                else _marginal(planner.network, column, worlds.had[column])
            ),
            counted=counted.get(column),
        )
    return Answer(
        watch=asked.watch,
        readings=readings,
        method="exact, by one tree over the columns that bear on the question",
        cost=worlds.cost,
        milliseconds=(time.perf_counter() - started) * 1000.0,
        log_evidence=worlds.log_evidence,
        matching=matching,
        matching_told=told,
    )


def _marginal(network: Network, column: str, shares: np.ndarray) -> Marginal:
    return Marginal(network.node(column).levels, shares[:, 0], shares[:, 1:])
