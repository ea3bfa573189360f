"""How many records stand behind the pinned group."""

import pytest

import engine
from tests.doubting.schools import halves
from tests.doubting.worlds import codes_of, only, repeated, world


def pairs(rare):
    """Records of which `rare` have both a = x and b = x."""
    groups = [(rare, ("x", "x")), (200, ("x", "y")), (200, ("y", "x")), (200, ("y", "y"))]
    rows = repeated(*[(times, {"a": a, "b": b, "out": out}) for n, (a, b) in groups for times, out in halves(n)])
    links = [("a", "out"), ("b", "out"), ("a", "b")]
    return world(rows, links, [("A", ["a"]), ("B", ["b"]), ("C", ["out"])], {"out": "yes"})


@pytest.mark.parametrize(
    ("rows", "rank", "figure"),
    [(0, "weakens", "no record"), (4, "weakens", "under 10"), (9, "weakens", "under 10"), (12, "know", "12")],
)
def test_a_thin_group_is_told_without_giving_small_counts_away(rows, rank, figure):
    caution = only(pairs(rows).ask({"a": "x", "b": "x"}), "thin")
    assert (caution.rank, caution.figure, caution.columns) == (rank, figure, ("a", "b"))


def test_a_group_of_thirty_is_not_thin():
    assert "thin" not in [code for _, code in codes_of(pairs(30).ask({"a": "x", "b": "x"}))]


def test_no_matching_record_blocks_what_a_lever_would_do():
    groups = [(50, "x", "u"), (50, "y", "u"), (50, "y", "v")]
    rows = repeated(*[(n, {"a": a, "b": b, "lever": k, "out": k}) for n, a, b in groups for k in ("off", "on")])
    stages = [("A", ["a", "b"]), ("B", ["lever"]), ("C", ["out"])]
    model = world(rows, [("a", "b"), ("lever", "out")], stages, {"out": "on"})
    answer = model.ask({"a": "x", "b": "v"}, {"lever": engine.Fix("on")}, draws=20)
    assert answer.blocked and answer.matching == 0
    assert only(answer, "thin").rank == "blocks"
    twin = model.ask({"a": "y", "b": "v"}, {"lever": engine.Fix("on")}, draws=20)
    assert not twin.blocked and twin.matching == 100


def test_few_records_whose_number_is_not_told_are_called_few():
    groups = [(5, {"a": "z", "out": "yes"}), (12, {"a": "x", "out": "yes"}), (300, {"a": "y", "out": "no"})]
    model = world(repeated(*groups), [("a", "out")], [("A", ["a"]), ("B", ["out"])])
    assert only(model.ask({"a": "x"}, watch=["out"]), "thin").figure == "under 30"
