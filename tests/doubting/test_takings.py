"""Reach, mixes, rules and several pinned levels beside unrecorded causes: against the model with the causes in it."""

import numpy as np
import pytest

import engine
from engine.answering.question import question
from engine.doubting.graph import graph
from engine.doubting.identification import Hedge
from engine.doubting.takings import Asked, shares, ways
from engine.refusal import Refusal
from tests.doubting.tied import CAUSE_LEVELS, LEVELS, Tied

FRONT_DOOR = ("abc", [("a", "b"), ("b", "c")], [("a", "c")])
# w leads to all; an unrecorded cause of the lever and the outcome, with the way through b
WIDER = ("wabc", [("w", "a"), ("w", "b"), ("w", "c"), ("a", "b"), ("b", "c")], [("a", "c")])
SEQUENCE = ("abcd", [("a", "b"), ("b", "c"), ("c", "d"), ("a", "d")], [("b", "d")])


def whole(model, entries):
    """The engine's own model with the unrecorded causes as columns of it."""
    causes = [f"cause {i}" for i in range(len(model.pairs))]
    levels = [str(level) for level in range(CAUSE_LEVELS)]
    nodes = [engine.Category(cause, levels, [], [1 / CAUSE_LEVELS] * CAUSE_LEVELS) for cause in causes]
    start = 0
    for column in model.columns:
        shape = model.shapes[column]
        count = int(np.prod(shape))
        yes = entries[start : start + count, 0].reshape(shape)
        start += count
        parents = [*model.parents[column], *(causes[i] for i in model.causes[column])]
        nodes.append(engine.Category(column, LEVELS, parents, np.stack([1.0 - yes, yes], axis=-1)))
    return engine.Model.from_network(nodes)


def both_ways(case, seed, outcome, levers, pins=None, after=None):
    """(read beside the declared causes, or a Hedge; the truth) of the share of a yes in `outcome`."""
    columns, links, pairs = case
    model = Tied(columns, links, pairs)
    entries = model.some(np.random.default_rng(seed))
    truth = whole(model, entries).ask(pins, levers, watch=[outcome], pins_after=after)[outcome].set.shares["yes"]
    fitted = model.fitted(entries)
    put = question(fitted, None, levers, [outcome])

    def positions(given):
        every = {column: [wanted] if isinstance(wanted, str) else wanted for column, wanted in (given or {}).items()}
        return {column: frozenset(map(LEVELS.index, wanted)) for column, wanted in every.items()}

    asked = Asked((outcome,), put.levers, positions(pins), positions(after), dict.fromkeys(columns, 2))
    found = ways(graph(columns, links, pairs), asked)
    if isinstance(found, Hedge):
        return found, truth
    return shares(found, asked, fitted, dict(zip(fitted.names, fitted.draws(0, 0), strict=True)))[1, 0], truth


@pytest.mark.parametrize("seed", range(3))
@pytest.mark.parametrize(
    ("case", "outcome", "levers", "pins", "after"),
    [
        (FRONT_DOOR, "c", {"a": engine.Fix("yes", reach=0.3)}, {}, {}),
        (FRONT_DOOR, "c", {"a": engine.Mix({"no": 0.2, "yes": 0.8}, reach=0.7)}, {}, {}),
        (FRONT_DOOR, "c", {"b": engine.Fix("yes", reach=0.4)}, {"a": "no"}, {}),
        (WIDER, "c", {"a": engine.Fix("yes", reach=0.6)}, {"w": "no"}, {}),
        (WIDER, "c", {"a": engine.Fix("yes", reach=0.6)}, {"w": {"no", "yes"}}, {}),
        (WIDER, "c", {"a": engine.Rule("w", {"no": "yes", "yes": "no"}, reach=0.8)}, {}, {}),
        (WIDER, "c", {"a": engine.Rule("w", {"no": "yes"})}, {}, {}),
        (WIDER, "c", {"a": engine.Rule("w", {"no": "yes"}, reach=0.5)}, {"w": "no"}, {}),
        (WIDER, "c", {"a": engine.Rule("w", {"no": "yes"}), "w": engine.Fix("no", reach=0.5)}, {}, {}),
        (WIDER, "c", {"b": engine.Fix("yes")}, {"a": "yes"}, {}),
        (WIDER, "c", {"a": engine.Fix("yes")}, {"a": "yes"}, {}),
        (WIDER, "c", {"a": engine.Fix("yes", reach=0.5)}, {}, {"b": "yes"}),
        (WIDER, "c", {"a": engine.Fix("yes", reach=0.5)}, {"w": "no"}, {"a": "yes"}),
        (WIDER, "c", {"a": engine.Mix({"no": 0.5, "yes": 0.5}, reach=0.5), "w": engine.Fix("yes", 0.5)}, {}, {}),
        (WIDER, "b", {"a": engine.Fix("yes", reach=0.5)}, {"a": {"no", "yes"}}, {}),
        (SEQUENCE, "d", {"a": engine.Fix("yes"), "c": engine.Fix("no", reach=0.5)}, {}, {}),
        (SEQUENCE, "d", {"c": engine.Rule("b", {"no": "yes"}, reach=0.5)}, {"b": {"no", "yes"}}, {}),
    ],
)
def test_every_world_is_read_by_itself_and_weighed(case, outcome, levers, pins, after, seed):
    value, truth = both_ways(case, seed, outcome, levers, pins, after)
    assert not isinstance(value, Hedge) and value == pytest.approx(truth, abs=1e-9)


def test_one_world_that_does_not_follow_is_enough_to_refuse():
    """What ties a to b does not matter where both are set, but does where b is left as it comes."""
    case = ("abc", [("a", "b"), ("b", "c"), ("a", "c")], [("a", "b")])
    surely, perhaps = ({"a": engine.Fix("yes"), "b": engine.Fix("yes", reach)} for reach in (1.0, 0.5))
    value, truth = both_ways(case, 0, "c", surely)
    assert value == pytest.approx(truth, abs=1e-9)
    assert both_ways(case, 0, "c", perhaps)[0] == Hedge(("a", "b"), ("b",), (("a", "b"),))


def test_too_many_worlds_are_refused():
    columns = [f"lever {i}" for i in range(12)]
    levers = {column: engine.Fix("yes", 0.5) for column in columns}
    links = [(column, "z") for column in columns]
    nodes = [engine.Category(column, LEVELS, [], [0.5, 0.5]) for column in (*columns, "z")]
    put = question(engine.Model.from_network(nodes).network, None, levers, ["z"])
    with pytest.raises(Refusal, match="too many ways"):
        ways(graph([*columns, "z"], links), Asked(("z",), put.levers, {}, {}, dict.fromkeys([*columns, "z"], 2)))
