"""Tables are drawn only where a question needs them, in parts where they are large, and kept within bounds."""

import tracemalloc

import numpy as np
import pytest
from hypothesis import given, settings

import engine
from engine.answering import drawing as keeping
from engine.answering import summing
from engine.answering.kept import Kept
from engine.model import Model
from engine.network import drawn as drawing
from engine.network.network import Category, network
from tests.answering.generated import networks


def uncertain(name, levels, parents=()):
    """A column with an uncertain table; parents are other such columns."""
    rng = np.random.default_rng(len(name))
    dirichlet = rng.gamma(1.0, 2.0, [*(len(parent.levels) for parent in parents), levels]) + 0.1
    table = dirichlet / dirichlet.sum(axis=-1, keepdims=True)
    return Category(
        name, [f"{place}" for place in range(levels)], [parent.name for parent in parents], table, dirichlet
    )


def wide(children, levels=25):
    """Two columns, one that the first leads to, and children of both with levels cubed cells x 4."""
    first, second = uncertain("first", levels), uncertain("second", levels)
    then = uncertain("then", 2, [first])
    four = uncertain("four", 4)
    heavy = [uncertain(f"child {place}", levels, [first, second, four]) for place in range(children)]
    return [first, second, four, then], heavy


def test_tables_that_do_not_bear_on_the_question_are_not_drawn():
    light, heavy = wide(children=3)
    assert heavy[0].dirichlet.size == 62_500
    model, without = Model(network([*light, *heavy])), Model(network(light))
    asked = {"pins": {"four": "1"}, "levers": {"first": engine.Fix("3")}, "watch": ["then"]}
    tracemalloc.start()
    answer = model.ask(**asked)
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    assert peak < 20e6  # the three tables with 201 draws would hold 300 MB
    expected = without.ask(**asked)
    assert answer.cost == expected.cost
    for world in ("recorded", "among", "set"):
        np.testing.assert_array_equal(getattr(answer["then"], world).draws, getattr(expected["then"], world).draws)


def test_drawn_cells_count_towards_the_cost():
    light, heavy = wide(children=1, levels=5)
    model = Model(network([*light, *heavy]))
    drawn = sum(node.dirichlet.size for node in (*light[:3], *heavy))
    few, many = (model.ask(watch=["child 0"], draws=draws).cost for draws in (20, 40))
    assert few > summing.DRAWING * drawn * 20 and many > summing.DRAWING * drawn * 40


def test_a_table_too_large_to_draw_is_refused_before_it_is_drawn():
    light, heavy = wide(children=1)
    model = Model(network([*light, *heavy]))
    with pytest.raises(engine.Refusal, match="too wide to sum exactly"):
        model.ask(watch=["child 0"], draws=1000)
    assert model.ask(watch=["then"], draws=1000)["then"].recorded.draws.shape == (2, 1000)


@settings(max_examples=20, deadline=None)
@given(networks(certain=False))
def test_tables_drawn_in_parts_hold_the_same_digits(net):
    whole, kept = net.draws(30, 5), drawing.AT_ONCE
    try:
        drawing.AT_ONCE = 70
        for one, other in zip(whole, net.draws(30, 5), strict=True):
            np.testing.assert_array_equal(one, other)
    finally:
        drawing.AT_ONCE = kept


@settings(max_examples=30, deadline=None)
@given(networks(certain=False))
def test_columns_grouped_by_their_large_tables_read_the_same_whatever_else_is_asked(net):
    whole, kept = Model(net).ask(watch=net.names, draws=20), summing.HEAVY
    try:
        summing.HEAVY = 500.0
        grouped = Model(net)
        for column in net.names:
            alone = grouped.ask(watch=[column], draws=20)[column].recorded.draws
            np.testing.assert_allclose(alone, whole[column].recorded.draws, rtol=0, atol=1e-12)
            np.testing.assert_array_equal(Model(net).ask(watch=net.names, draws=20)[column].recorded.draws, alone)
    finally:
        summing.HEAVY = kept


def test_what_is_kept_weighs_no_more_than_its_limit():
    kept = Kept(10, len)
    made = []

    def text(letter, length):
        made.append(letter)
        return letter * length

    for letter, length in (("a", 4), ("b", 5), ("a", 4), ("c", 3), ("d", 11), ("a", 4), ("b", 5)):
        assert kept.get(letter, lambda letter=letter, length=length: text(letter, length)) == letter * length
        assert kept.weight <= 10
    assert made == ["a", "b", "c", "d", "b"]  # b was asked for least lately when c came; d is too heavy to keep


@pytest.mark.parametrize(("limit", "drawn_again"), [(1e6, 0), (1e4, 2)])
def test_drawn_tables_are_kept_for_the_next_question_within_their_bytes(monkeypatch, limit, drawn_again):
    drawn = []
    monkeypatch.setattr(keeping, "_DRAWN", Kept(limit, lambda table: table.nbytes))
    monkeypatch.setattr(
        keeping, "drawn", lambda node, *rest: drawn.append(node.name) or drawing.drawn_table(node, *rest)
    )
    light, _ = wide(children=0)
    model = Model(network(light))
    model.ask({"four": "1"}, watch=["then"])
    assert set(drawn) == {node.name for node in light}
    before = len(drawn)
    model.ask({"first": "1"}, watch=["then"])
    assert len(drawn) - before == drawn_again  # two of the tables hold more than 10,000 bytes
    assert keeping._DRAWN.weight <= limit
