"""Does an answer follow from what is seen? Against models that hold the unrecorded causes, on every small graph.

The criterion owes nothing to the method: an answer follows when, at a model drawn at random, its slope is 0 along
every move of the shares that leaves all that is seen as it is.
"""

import itertools

import numpy as np
import pytest

from engine.doubting.graph import graph
from engine.doubting.identification import Hedge, identify
from engine.doubting.identified import Joint, identified_shares
from engine.network.network import Category, network
from engine.refusal import Refusal
from tests.doubting.tied import LEVELS, Tied, graphs

FLAT = 1e-9  # a slope that is rounding; those that are not were above 1e-4
APART = 1e-5  # answers of models alike to 1e-12 in all that is seen


def joint_of(model, shares):
    fitted = model.fitted(shares)
    return Joint(fitted, dict(zip(fitted.names, fitted.draws(0, 0), strict=True)))


def read(found, joint, levers, pins=None):
    pinned = {column: frozenset((level,)) for column, level in (pins or {}).items()}
    return identified_shares(found, joint, levers, pinned)[1, 0]


@pytest.mark.parametrize("count", [2, 3, 4])
def test_verdict_and_value_on_every_graph_with_one_unrecorded_cause(count):
    rng = np.random.default_rng(count)
    followed = refused = 0
    for columns, links in graphs(count):
        for pair in itertools.combinations(columns, 2):
            model = Tied(columns, links, [pair])
            shares = model.some(rng)
            moves = model.unseen_moves(shares)
            other = model.alike(shares, moves @ rng.standard_normal(moves.shape[1]) / np.sqrt(moves.shape[1]))
            assert other is not None and np.abs(other - shares).max() > 1e-3
            joint, declared = joint_of(model, shares), graph(columns, links, [pair])
            for lever, outcome in itertools.combinations(columns, 2):
                if count == 4 and outcome != "d":
                    continue  # d does not lead there: a question about three columns
                found = identify(declared, [outcome], [lever])
                slope = model.answer_slope(shares, outcome, {lever: 1}) @ moves
                if isinstance(found, Hedge):
                    refused += 1
                    assert np.linalg.norm(slope) > FLAT, (links, pair, lever, outcome)
                    twin = model.alike(shares, moves @ slope / np.linalg.norm(slope))
                    assert np.abs(model.cells(twin) - model.cells(shares)).max() < 1e-12
                    answers = model.answer(np.hstack([shares, twin]), outcome, {lever: 1})
                    assert abs(answers[0] - answers[1]) > APART, (links, pair, lever, outcome)
                else:
                    followed += 1
                    assert np.linalg.norm(slope) < FLAT, (links, pair, lever, outcome)
                    for level in (0, 1):
                        value = read(found, joint, {lever: level})
                        for each in (shares, other):
                            assert abs(value - model.answer(each, outcome, {lever: level})[0]) < 1e-9
    assert (followed, refused) == {2: (1, 1), 3: (58, 14), 4: (1004, 148)}[count]


@pytest.mark.parametrize("causes", [1, 2, 3])
def test_verdict_and_value_among_the_pinned(causes):
    """Pins before the lever, after it, and on the lever's own column, on every graph of three columns."""
    rng = np.random.default_rng(causes)
    for columns, links in graphs(3):
        for pairs in itertools.combinations(itertools.combinations(columns, 2), causes):
            model = Tied(columns, links, pairs)
            shares = model.some(rng)
            moves, joint, declared = model.unseen_moves(shares), joint_of(model, shares), graph(columns, links, pairs)
            for lever, outcome in itertools.permutations(columns, 2):
                others = [column for column in columns if column != outcome]
                for pinned in [[column] for column in others] + [others]:
                    pins = {column: int(column != lever and rng.integers(2)) for column in pinned}
                    found = identify(declared, [outcome], [lever], pins)
                    slope = np.linalg.norm(model.answer_slope(shares, outcome, {lever: 1}, pins) @ moves)
                    case = (links, pairs, lever, outcome, pins)
                    assert (slope < FLAT) == (not isinstance(found, Hedge)), case
                    if not isinstance(found, Hedge):
                        value = read(found, joint, {lever: 1}, pins)
                        assert abs(value - model.answer(shares, outcome, {lever: 1}, pins)[0]) < 1e-9, case


def test_several_levers_and_outcomes_on_every_graph_of_three_columns():
    rng = np.random.default_rng(5)
    for columns, links in graphs(3):
        for pair in itertools.combinations(columns, 2):
            model, declared = Tied(columns, links, [pair]), graph(columns, links, [pair])
            shares = model.some(rng)
            moves, joint = model.unseen_moves(shares), joint_of(model, shares)
            for outcome in columns:
                levers = {column: 1 for column in columns if column != outcome}
                found = identify(declared, [outcome], levers)
                slope = np.linalg.norm(model.answer_slope(shares, outcome, levers) @ moves)
                assert (slope < FLAT) == (not isinstance(found, Hedge))
                if not isinstance(found, Hedge):
                    assert abs(read(found, joint, levers) - model.answer(shares, outcome, levers)[0]) < 1e-9
            first, *outcomes = columns
            found = identify(declared, outcomes, [first])
            truth = model.cells(shares, {first: 1})[..., 0].sum(axis=0)
            if not isinstance(found, Hedge):
                assert identified_shares(found, joint, {first: 1})[..., 0] == pytest.approx(truth, abs=1e-9)


# The graph of the front door: Pearl 1995, Causal diagrams for empirical research, Biometrika 82.
FRONT_DOOR = ("abc", [("a", "b"), ("b", "c")], [("a", "c")])


def test_the_front_door_weighs_what_lies_between_by_the_lever_and_the_outcome_by_both():
    found = identify(graph(*FRONT_DOOR), ["c"], ["a"])
    assert str(found.shares) == "Σ_{b} [{P(b | a); set a} Σ_{a} [P(a) P(c | a, b)]]"


def test_a_hedge_names_the_columns_and_the_unrecorded_cause_at_fault():
    columns, links, pairs = FRONT_DOOR
    found = identify(graph(columns, [*links, ("a", "c")], pairs), ["c"], ["a"])
    assert found == Hedge(columns=("a", "c"), ends=("c",), pairs=(("a", "c"),))


def test_an_answer_far_from_the_unrecorded_cause_is_read_as_if_there_were_none():
    links = [("a", "b"), ("b", "c"), ("a", "c"), ("c", "d"), ("d", "e")]
    tied, plain = (identify(graph("abcde", links, pairs), ["c"], ["b"]) for pairs in ([("d", "e")], []))
    assert tied == plain and str(tied.shares) == "Σ_{a} [P(a) {P(c | a, b); set b}]"


def test_several_pinned_levels_are_weighed_by_how_common_they_are():
    rng = np.random.default_rng(8)
    columns, links = "abc", [("a", "b"), ("a", "c"), ("b", "c")]
    model = Tied(columns, links, [("a", "b")])
    shares = model.some(rng)
    found = identify(graph(columns, links, [("a", "b")]), ["c"], ["b"], ["a"])
    value = identified_shares(found, joint_of(model, shares), {"b": 1}, {"a": frozenset((0, 1))})
    assert value[1, 0] == pytest.approx(model.answer(shares, "c", {"b": 1})[0], abs=1e-9)


def test_every_draw_is_read_by_itself():
    rng = np.random.default_rng(3)
    model = Tied(*FRONT_DOOR)
    several = rng.uniform(0.2, 0.8, (model.size, 3))
    found = identify(graph(*FRONT_DOOR), ["c"], ["a"])
    fitted = [model.fitted(several[:, [draw]]) for draw in range(3)]
    tables = {name: np.stack([each.node(name).table for each in fitted], axis=-1) for name in fitted[0].names}
    value = identified_shares(found, Joint(fitted[0], tables), {"a": 1})
    assert value[1] == pytest.approx(model.answer(several, "c", {"a": 1}), abs=1e-9)


def test_cases_that_cannot_be_are_refused():
    links = [("a", "b"), ("a", "c"), ("b", "c")]
    none = [[[1.0, 0.0]] * 2] * 2
    a = Category("a", LEVELS, [], [0.5, 0.5])
    seen = network([a, Category("c", LEVELS, ["a"], [[0.3, 0.7], [0.6, 0.4]]), Category("b", LEVELS, ["a", "c"], none)])
    joint = Joint(seen, dict(zip(seen.names, seen.draws(0, 0), strict=True)))
    found = identify(graph("abc", links), ["c"], ["b"])
    with pytest.raises(Refusal, match="cannot be") as refused:
        identified_shares(found, joint, {"b": 1})
    assert refused.value.where == "b" and refused.value.do


def test_links_in_a_circle_are_refused():
    with pytest.raises(Refusal, match="circle"):
        graph("abc", [("a", "b"), ("b", "a")])
