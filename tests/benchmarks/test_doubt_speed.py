"""Doubt over fifty sampled models against the one model's answer, in the same process, on thirty-seven columns."""

import statistics
import time

import pytest

import engine
from engine.learning.learn import learn_coded
from engine.model import Learned
from tests.benchmarks.many_columns import staged_records

COLUMNS, ROWS, STAGES = 37, 300, 5
GRAPHS, EACH = 50, 20
AIM, MARGIN = 25.0, 3.0  # times what the one model's answer takes, plans known; what other work on the machine may cost


def seconds(ask):
    started = time.perf_counter()
    found = ask()
    return time.perf_counter() - started, found


def questions(learned):
    """Three pins in the first stage, two levers after it that lead to the watched outcome, other levels each time."""
    network = learned.model().network
    levels = dict(zip(learned.coded.names, learned.coded.levels, strict=True))
    earliest = learned.order.stages[0].columns
    later = [name for name in network.names if name not in earliest]
    _, watch, levers = max(
        (len(before), watch, before[:2])
        for watch in learned.order.stages[-1].columns
        for before in [[name for name in later if watch in network.descendants([name])]]
    )
    for turn in range(6):
        yield {
            "pins": {name: levels[name][turn % 2] for name in earliest[:3]},
            "levers": {name: engine.Fix(levels[name][(turn // 2) % 2]) for name in levers},
            "watch": [watch],
        }


@pytest.mark.benchmark
def test_doubt_over_fifty_models_costs_a_few_answers_of_one(capsys):
    coded, order = staged_records(COLUMNS, ROWS, STAGES)
    order = engine.Order([(stage.name, stage.columns) for stage in order.stages], changeable=order.columns)
    found = learn_coded(coded, order, folds=False)
    learned = Learned(**vars(found))
    model = learned.model()
    first, *others = questions(learned)
    model.ask(**first)
    at_first, answer = seconds(lambda: model.ask(**first).with_doubt(GRAPHS, EACH))
    alone, with_doubt = [], []
    for question in others:
        time_alone, plain = seconds(lambda: model.ask(**question))  # noqa: B023
        alone.append(time_alone)
        with_doubt.append(seconds(lambda: plain.with_doubt(GRAPHS, EACH))[0])  # noqa: B023
    ratio = statistics.median(with_doubt) / statistics.median(alone)
    with capsys.disabled():
        print(
            f"\n{COLUMNS} columns, {len(model.links)} links, {answer.doubt.different} different graphs of {GRAPHS} x "
            f"{EACH} draws: with doubt {1000 * at_first:.0f} ms at first (aim 1,000), "
            f"{1000 * statistics.median(with_doubt):.0f} ms with plans known (aim 300), {ratio:.0f} times the one "
            f"model's {1000 * statistics.median(alone):.1f} ms (aim {AIM:.0f})"
        )
    assert answer.doubt.different > GRAPHS / 2
    assert ratio < AIM * MARGIN
