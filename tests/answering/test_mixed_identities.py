"""What must hold of questions about numbers and categories whatever the network: identities of levers, and sampling."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

import engine
from engine.model import Model
from engine.network.nodes import Category
from tests.answering.test_mixed_questions import lever, mixed_questions

WORLDS = ("recorded", "among", "set", "had")


def asked(question, levers=None, **rest):
    net, pinned, set_to, _ = question
    try:
        return Model(net).ask(pinned, set_to if levers is None else levers, net.names, draws=0, **rest)
    except engine.Refusal as refusal:
        for sign in ("circle", "No record", "Of the records drawn"):
            assume(sign not in refusal.message)
        raise


def assert_alike(one, other, tolerance=1e-9):
    np.testing.assert_allclose(one.point, other.point, rtol=0.0, atol=tolerance)
    if one.number is not None:
        assert (one.mean, one.sd) == pytest.approx((other.mean, other.sd), abs=tolerance * 10.0)


@settings(max_examples=25, deadline=None)
@given(mixed_questions(), st.data())
def test_two_sets_of_levers_read_as_each_of_them_alone(question, data):
    net, _, levers, _ = question
    others = {column: data.draw(lever(net, column)) for column in levers}
    both, one, other = asked(question, against=others), asked(question), asked(question, others)
    assume(all(answer.method.startswith("exact") for answer in (both, one, other)))
    for column in net.names:
        assert_alike(both[column].set, one[column].set, 1e-12)
        assert_alike(both[column].against, other[column].set, 1e-12)


@settings(max_examples=25, deadline=None)
@given(mixed_questions())
def test_levers_that_reach_nobody_change_nothing_to_the_last_digit(question):
    net, _, levers, _ = question
    answer = asked(question, {column: replace(each, reach=0.0) for column, each in levers.items()})
    for column in net.names:
        np.testing.assert_array_equal(answer[column].set.point, answer[column].among.point)
        if answer[column].set.number is not None:
            assert answer[column].set.mean == answer[column].among.mean


@settings(max_examples=25, deadline=None)
@given(mixed_questions(), st.data())
def test_a_fix_to_what_is_pinned_reads_as_among_these(question, data):
    net, pinned, _, _ = question
    column = data.draw(st.sampled_from(net.names))
    node = net.node(column)
    value = data.draw(st.sampled_from(node.levels if isinstance(node, Category) else [-0.6, 0.3]))
    assume(not net.descendants([column]) & pinned.keys())
    answer = asked((net, {**pinned, column: value}, {column: engine.Fix(value)}, {}))
    assume(answer.method.startswith("exact"))
    for watched in net.names:
        assert_alike(answer[watched].set, answer[watched].among)


@settings(max_examples=25, deadline=None)
@given(mixed_questions(), st.data())
def test_a_fix_on_a_column_without_parents_equals_pinning_it(question, data):
    net, pinned, _, _ = question
    column = data.draw(st.sampled_from([node.name for node in net.nodes if not node.parents]))
    node = net.node(column)
    value = data.draw(st.sampled_from(node.levels if isinstance(node, Category) else [-0.6, 0.3]))
    before = {name: wanted for name, wanted in pinned.items() if name not in net.descendants([column]) | {column}}
    answer = asked((net, before, {column: engine.Fix(value)}, {}))
    assume(answer.method.startswith("exact") and answer[column].had is not None)
    for watched in net.names:
        assert_alike(answer[watched].set, answer[watched].had)


@settings(max_examples=12, deadline=None, derandomize=True)
@given(mixed_questions())
def test_sampling_agrees_with_every_kind_of_lever_summed_exactly(question):
    answer, sampled = asked(question), asked(question, exact=False)
    assume(answer.method.startswith("exact") and sampled.effective > 400.0)
    assert sampled.method.startswith("sampled")
    for column in question[0].names:
        for world in WORLDS:
            exact, other = getattr(answer[column], world), getattr(sampled[column], world)
            if exact is None or other is None:
                continue
            bound = 6.0 * sampled.mc_error + 3.0 / np.sqrt(sampled.effective)
            np.testing.assert_allclose(other.point, exact.point, rtol=0.0, atol=bound)
            if exact.number is not None:
                assert other.mean == pytest.approx(exact.mean, abs=6.0 * sampled.mc_error * exact.sd + 1e-6)
