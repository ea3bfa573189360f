"""Exact means 1e-10 against counting out every case."""

import math

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

import engine
from engine.model import Model
from engine.network.network import Category, network
from tests import plainly
from tests.answering.generated import networks, questions

EXACT = dict(rtol=0.0, atol=1e-10)


def fixes(levers):
    return {column: engine.Fix(level, reach) for column, (level, reach) in levers.items()}


@settings(max_examples=60, deadline=None)
@given(questions())
def test_every_world_agrees_with_counting_out_every_case(asked):
    net, pinned, levers = asked
    tables = net.draws(20, seed=7)
    natural = plainly.cases(net, tables=tables)
    assume(plainly.total(natural, pinned) > 0.0)
    answer = Model(net).ask(pinned, fixes(levers), watch=net.names, draws=20, seed=7)
    draws = range(3) if net.drawable else range(1)
    for draw in draws:
        natural = plainly.cases(net, draw=draw, tables=tables)
        split = plainly.cases(net, levers, draw=draw, tables=tables)
        had = pinned | {column: {level} & pinned.get(column, {level}) for column, (level, _) in levers.items()}
        for column in net.names:
            reading = answer[column]
            np.testing.assert_allclose(at(reading.recorded, draw), plainly.shares(net, natural, {}, column), **EXACT)
            np.testing.assert_allclose(at(reading.among, draw), plainly.shares(net, natural, pinned, column), **EXACT)
            if not levers:
                assert reading.set is None and reading.had is None
                continue
            np.testing.assert_allclose(at(reading.set, draw), plainly.shares(net, split, pinned, column), **EXACT)
            if plainly.total(natural, had) > 0.0:
                np.testing.assert_allclose(at(reading.had, draw), plainly.shares(net, natural, had, column), **EXACT)
            else:
                assert reading.had is None
    assert answer.log_evidence == pytest.approx(math.log(plainly.total(plainly.cases(net), pinned)), abs=1e-9)
    assert len(answer[net.names[0]].among.draws[0]) == (20 if net.drawable else 0)


def at(marginal, draw):
    return marginal.point if draw == 0 else marginal.draws[:, draw - 1]


@settings(max_examples=50, deadline=None)
@given(st.data())
def test_impossible_pins_are_refused_by_their_smallest_contradiction(data):
    net = data.draw(networks(certain=True, holes=True))
    chosen = data.draw(st.lists(st.sampled_from(sorted(net.names)), min_size=1, max_size=4, unique=True))
    pinned = {column: {data.draw(st.sampled_from(net.node(column).levels))} for column in chosen}
    every = plainly.cases(net)
    if plainly.total(every, pinned) > 0.0:
        assert Model(net).ask(pinned, watch=net.names).log_evidence <= 0.0
        return
    with pytest.raises(engine.Refusal, match="No record in this model can have") as refused:
        Model(net).ask(pinned, watch=net.names)
    named = refused.value.where.split(", ")
    assert len(named) == plainly.smallest_contradiction(every, pinned)
    assert plainly.total(every, {column: pinned[column] for column in named}) == 0.0


@settings(max_examples=60, deadline=None)
@given(questions())
def test_columns_that_no_lever_moves_read_as_among_these_to_the_last_digit(asked):
    net, pinned, levers = asked
    assume(levers and plainly.total(plainly.cases(net), pinned) > 0.0)
    answer = Model(net).ask(pinned, fixes(levers), watch=net.names, draws=20)
    for column in set(net.names) - net.descendants(levers) - set(levers):
        np.testing.assert_array_equal(answer[column].set.point, answer[column].among.point)
        np.testing.assert_array_equal(answer[column].set.draws, answer[column].among.draws)


@settings(max_examples=60, deadline=None)
@given(questions())
def test_a_lever_that_reaches_nobody_changes_nothing(asked):
    net, pinned, levers = asked
    assume(levers and plainly.total(plainly.cases(net), pinned) > 0.0)
    nobody = {column: engine.Fix(level, reach=0.0) for column, (level, _) in levers.items()}
    answer = Model(net).ask(pinned, nobody, watch=net.names, draws=20)
    for column in net.names:
        np.testing.assert_array_equal(answer[column].set.point, answer[column].among.point)


@settings(max_examples=60, deadline=None)
@given(questions(), st.data())
def test_setting_what_is_pinned_equals_among_these(asked, data):
    net, pinned, _ = asked
    column = data.draw(st.sampled_from(sorted(net.names)))
    level = data.draw(st.sampled_from(net.node(column).levels))
    before = {name: wanted for name, wanted in pinned.items() if name not in net.descendants([column])}
    before[column] = {level}
    assume(plainly.total(plainly.cases(net), before) > 0.0)
    answer = Model(net).ask(before, {column: engine.Fix(level)}, watch=net.names, draws=20)
    for name in net.names:
        np.testing.assert_allclose(answer[name].set.point, answer[name].among.point, **EXACT)
        np.testing.assert_allclose(answer[name].set.draws, answer[name].among.draws, **EXACT)


@settings(max_examples=60, deadline=None)
@given(networks(), st.data())
def test_setting_a_column_without_parents_equals_pinning_it(net, data):
    column = data.draw(st.sampled_from([node.name for node in net.nodes if not node.parents]))
    level = data.draw(st.sampled_from(net.node(column).levels))
    model = Model(net)
    assume(plainly.total(plainly.cases(net), {column: {level}}) > 0.0)
    pinned = model.ask({column: level}, watch=net.names, draws=20)
    lifted = model.ask({}, {column: engine.Fix(level)}, watch=net.names, draws=20)
    for name in net.names:
        np.testing.assert_allclose(lifted[name].set.point, pinned[name].among.point, **EXACT)
        np.testing.assert_allclose(lifted[name].set.draws, pinned[name].among.draws, **EXACT)


@settings(max_examples=40, deadline=None)
@given(questions())
def test_columns_read_beside_read_the_same_as_watched(asked):
    net, pinned, levers = asked
    assume(plainly.total(plainly.cases(net), pinned) > 0.0)
    model = Model(net)
    watched = model.ask(pinned, fixes(levers), watch=net.names, draws=20)
    beside = model.ask(pinned, fixes(levers), watch=net.names[:1], beside=net.names[1:], draws=20)
    alone = model.ask(pinned, fixes(levers), watch=net.names[-1:], draws=20)
    assert list(beside) == list(watched) and list(alone) == [net.names[-1]]
    np.testing.assert_allclose(alone[net.names[-1]].among.point, watched[net.names[-1]].among.point, **EXACT)
    for name in net.names:
        np.testing.assert_array_equal(beside[name].among.draws, watched[name].among.draws)


def rare(columns, share):
    """A chain whose second level, pinned all along, has the probability share ** columns."""
    nodes = [Category("x0", ["often", "rare"], [], [1.0 - share, share])]
    for place in range(1, columns):
        nodes.append(Category(f"x{place}", ["often", "rare"], [f"x{place - 1}"], [[0.5, 0.5], [1.0 - share, share]]))
    nodes.append(Category("y", ["no", "yes"], [f"x{columns - 1}"], [[0.9, 0.1], [0.25, 0.75]]))
    return Model(network(nodes))


@pytest.mark.parametrize(("columns", "share"), [(10, 1e-30), (30, 1e-20), (60, 1e-10)])
def test_pins_rarer_than_the_smallest_float_do_not_underflow(columns, share):
    model = rare(columns, share)
    answer = model.ask({f"x{place}": "rare" for place in range(columns)}, watch=["y", "x0"])
    assert answer.log_evidence == pytest.approx(columns * math.log(share), rel=1e-12)
    assert answer["y"].among.shares["yes"] == pytest.approx(0.75, abs=1e-12)


def test_rare_pins_on_leaves_of_a_hidden_column_are_weighed_rightly():
    leaves = [Category(f"leaf {n}", ["a", "b"], ["root"], [[1 - 1e-12, 1e-12], [1 - 2e-12, 2e-12]]) for n in range(30)]
    model = Model(network([Category("root", ["u", "v"], [], [0.5, 0.5]), *leaves]))
    answer = model.ask({f"leaf {n}": "b" for n in range(30)}, watch=["root"])
    assert answer["root"].among.shares["v"] == pytest.approx(2.0**30 / (1.0 + 2.0**30), rel=1e-12)


def test_a_question_too_wide_to_sum_is_refused_with_its_cost_when_it_has_to_be_exact():
    columns = [Category(f"c{n}", [f"l{k}" for k in range(30)], [], np.full(30, 1 / 30)) for n in range(14)]
    both = [
        Category(f"s{a} {b}", ["n", "y"], [f"c{a}", f"c{b}"], np.full((30, 30, 2), 0.5))
        for a in range(14)
        for b in range(a)
    ]
    model = Model(network([*columns, *both]))
    with pytest.raises(engine.Refusal, match=r"too wide to sum exactly: .*e.* table cells"):
        model.ask({node.name: "y" for node in both}, watch=["c0"], exact=True)
    sampled = model.ask({node.name: "y" for node in both}, watch=["c0"])
    assert sampled.method.startswith("sampled") and 0.0 < sampled.mc_error < 0.01
    assert sampled["c0"].among.share("l3") == pytest.approx(1 / 30, abs=4 * sampled.mc_error)
