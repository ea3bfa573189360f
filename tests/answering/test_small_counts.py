"""A count under the limit is told neither by itself, nor as what is left out, nor as what two questions leave."""

import itertools

import pytest
from hypothesis import given
from hypothesis import strategies as st

from engine.records.small_counts import hidden_levels
from tests.doubting.worlds import repeated, world

TOWNS = {"A": 978, "B": 1015, "C": 7}


@pytest.fixture(scope="module")
def towns():
    """2,000 records in three towns, half of which passed wherever they are."""
    groups = [
        (count // 2 + count % 2 * (passed == "yes"), {"town": town, "passed": passed})
        for town, count in TOWNS.items()
        for passed in ("yes", "no")
    ]
    return world(repeated(*groups), [("town", "passed")], [("Before", ["town"]), ("After", ["passed"])])


@pytest.mark.parametrize(
    ("pinned", "told"),
    [("A", False), ("B", True), ("C", False), ("AC", True), ("BC", False), ("AB", False), ("ABC", True)],
)
def test_levels_hidden_together_are_counted_together_or_not_at_all(towns, pinned, told):
    answer = towns.ask({"town": set(pinned)}, watch=["passed"])
    assert answer.matching == sum(TOWNS[town] for town in pinned)
    assert answer.matching_told == told
    assert (answer["passed"].counted is not None) == told


def test_the_level_of_a_watched_column_is_counted_by_the_same_rule(towns):
    count = towns.ask(watch=["town"])["town"].counted
    assert count.hidden == {"A", "C"}
    assert [count.tellable(levels) for levels in ("A", "B", "AC", "AB")] == [False, True, True, False]


@pytest.mark.parametrize(
    ("shifts", "told"), [(["mixed"], False), (["mixed", "nights"], True), (["days", "mixed"], False), (["days"], True)]
)
def test_a_level_that_is_small_among_the_other_pins_is_hidden_there_too(shifts, told):
    rows = repeated(
        (826, {"group": "yes", "shift": "days"}),
        (185, {"group": "yes", "shift": "mixed"}),
        (8, {"group": "yes", "shift": "nights"}),
        *[(500, {"group": "no", "shift": shift}) for shift in ("days", "mixed", "nights")],
    )
    model = world(rows, [("shift", "group")], [("All", ["shift", "group"])])
    assert model.ask({"group": "yes", "shift": set(shifts)}, watch=["group"]).matching_told == told


def test_no_record_at_all_is_told():
    rows = repeated((20, {"a": "x", "b": "u"}), (20, {"a": "y", "b": "v"}), (5, {"a": "y", "b": "w"}))
    answer = world(rows, [("a", "b")], [("All", ["a", "b"])]).ask({"a": "x", "b": "v"}, watch=["a"])
    assert answer.matching == 0 and answer.matching_told and answer["a"].counted is None


@given(st.lists(st.integers(0, 40), min_size=1, max_size=5))
def test_no_two_told_sets_of_levels_leave_a_small_one(counts):
    hidden, total = set(hidden_levels(counts)), sum(counts)
    places = range(len(counts))
    sets = [set(some) for size in range(len(counts) + 1) for some in itertools.combinations(places, size)]
    sizes = {frozenset(some): sum(counts[place] for place in some) for some in sets}
    told = [
        some
        for some, size in sizes.items()
        if size >= 10 and not 0 < total - size < 10 and (not hidden & some or hidden <= some)
    ]
    for one, other in itertools.product(told, told):
        if one <= other and total >= 10:
            assert not 0 < sizes[other] - sizes[one] < 10
