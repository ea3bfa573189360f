"""Doubt: the same question asked of many plausible models, each with draws of its own parameters.

A graph drawn from the posterior n times gives n times as many parameter draws as one drawn once, so that every pooled
draw counts the same and its plain quantiles are those of the posterior over graphs and parameters together (Bayesian
model averaging: Hoeting, Madigan, Raftery & Volinsky 1999). Within one graph all worlds share their draws.
"""

from __future__ import annotations

import time
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, fields, replace
from typing import Any

import numpy as np

from engine.answering.answer import Answer, Doubt, Marginal, Reading
from engine.answering.asking import FEWEST_DRAWS, ask
from engine.answering.planner import Planner
from engine.answering.question import Question
from engine.answering.summing import Plans
from engine.learning.learned import Learned
from engine.network.network import Network
from engine.refusal import Refusal, whole

PLANS = 4096  # kept together for all plausible graphs of one study
STRIDE = 1_000_003  # between the seeds of two graphs, so that each has parameter draws of its own


@dataclass(frozen=True, eq=False)
class Plausible:
    """Different graphs drawn from the posterior, as planners, and how often each was drawn.

    effective: how many independent draws they are worth together.
    """

    planners: tuple[Planner, ...]
    times: tuple[int, ...]
    effective: float

    @property
    def graphs(self) -> int:
        return sum(self.times)


def plausible(learned: Learned, graphs: int) -> Plausible:
    """So many of the graphs that were drawn from the posterior while learning, in proportion to their weights.

    Raises Refusal where none were drawn.
    """
    drawn = learned.posterior
    if not drawn.weights.size:
        raise Refusal(
            "No graphs were drawn when this was learned, so the doubt over models cannot be told.",
            where="graphs",
            do="Learn it again with graphs=200.",
        )
    times: dict[bytes, int] = {}
    parents = {}
    for graph, taken in zip(drawn.graphs, drawn_in_proportion(drawn.weights, graphs), strict=True):
        if taken:
            key = graph.tobytes()
            times[key] = times.get(key, 0) + int(taken)
            parents[key] = tuple(tuple(np.flatnonzero(into).tolist()) for into in graph.T)
    plans = Plans(PLANS)
    planners = tuple(Planner(learned.network_of(parents[key]), plans, whole=False) for key in times)
    return Plausible(planners, tuple(times.values()), min(float(graphs), drawn.effective))


def drawn_in_proportion(weights: np.ndarray, count: int) -> np.ndarray:
    """(weights,) how often each is taken when `count` are taken in proportion to their weights.

    Evenly spaced along the summed weights (systematic resampling: Kitagawa 1996), so that none is off by one or more.
    """
    ends = np.cumsum(np.asarray(weights, dtype=np.float64))
    places = np.searchsorted(ends / ends[-1], (np.arange(count) + 0.5) / count, side="left")
    return np.bincount(np.minimum(places, ends.size - 1), minlength=ends.size)


def doubtable(
    answer: Answer,
    plausible: Callable[[int], Plausible],
    question_in: Callable[[Network], Question],
    seed: int,
    exact: bool | None,
    checked: Callable[[Answer], Answer],
) -> Answer:
    """`answer` with a way to be asked again `with_doubt`.  checked: puts the cautions on an answer anew."""

    def again(graphs: int, draws: int) -> Answer:
        graphs = whole(graphs, "graphs", 1, "Give how many graphs to ask, such as 50.")
        doubted = pooled(answer, plausible(graphs), question_in, draws, seed, exact)
        return replace(checked(doubted), again=again)

    return replace(checked(answer), again=again)


def pooled(
    answer: Answer,
    plausible: Plausible,
    question_in: Callable[[Network], Question],
    draws: int,
    seed: int,
    exact: bool | None = None,
) -> Answer:
    """`answer` with its draws pooled over the plausible graphs; points, counts and cautions stay as they are.

    question_in: the question checked against a network. A graph that refuses it, because a pin follows from a lever
    there, is left out and counted: in that graph the same words would ask for something else.
    draws: of the parameters, for each graph drawn.
    Raises Refusal for fewer than FEWEST_DRAWS draws.
    """
    draws = whole(draws, "draws", FEWEST_DRAWS, f"Give at least {FEWEST_DRAWS}.")
    started = time.perf_counter()
    found: list[Answer] = []
    left_out, why = 0, None
    apart = dict.fromkeys(answer.watch, 0)
    for place, (planner, times) in enumerate(zip(plausible.planners, plausible.times, strict=True)):
        try:
            asked = question_in(planner.network)
            found.append(ask(planner, None, asked, draws * times, seed + STRIDE * (1 + place), exact))
        except Refusal as refusal:
            left_out += times
            why = why or refusal.message
            continue
        reached = planner.network.descendants(asked.working) | asked.working.keys()
        for column in answer.watch:
            apart[column] += 0 if column in reached else times
    return replace(
        answer,
        readings={column: _pooled(answer[column], [each[column] for each in found]) for column in answer},
        doubt=Doubt(plausible.graphs, len(plausible.planners), plausible.effective, left_out, why, apart),
        cost=answer.cost + sum(each.cost for each in found),
        milliseconds=answer.milliseconds + (time.perf_counter() - started) * 1000.0,
    )


def _pooled(reading: Reading, others: Sequence[Reading]) -> Reading:
    """`reading` with every world's draws replaced by those of `others`, one after the other."""
    if not others:
        return reading
    worlds: dict[str, Marginal | None] = {}
    for each in fields(reading):
        own = getattr(reading, each.name)
        if isinstance(own, Marginal):
            there = [getattr(other, each.name) for other in others]
            known = [marginal for marginal in there if marginal is not None]
            worlds[each.name] = _together(own, known) if len(known) == len(there) else None
    return replace(reading, **worlds)  # type: ignore[arg-type]


def _together(own: Marginal, others: Sequence[Marginal]) -> Marginal:
    draws = np.concatenate([marginal.draws for marginal in others], axis=-1)
    means = [marginal.mean_draws for marginal in others if marginal.mean_draws is not None]
    return replace(own, draws=draws, mean_draws=np.concatenate(means) if means else None)


def held(given: object) -> Any:
    """What was given as part of a question, copied so that asking again reads the same."""
    if isinstance(given, Mapping):
        return {column: held(wanted) for column, wanted in given.items()}
    if isinstance(given, set):
        return frozenset(given)
    if isinstance(given, tuple):
        return tuple(held(each) for each in given)
    return list(given) if isinstance(given, Iterator | list) else given
