"""Records counted directly against the model."""

import pytest

import engine
from engine.records.intervals import wilson
from tests.doubting.worlds import codes_of, only, repeated, world


def crossed(matched):
    """Records where out follows a and b together, fitted with no link into out."""
    rows = repeated(
        *[
            (matched if (a == b) == (out == "yes") else 100, {"a": a, "b": b, "out": out})
            for a in "xy"
            for b in "xy"
            for out in ("no", "yes")
        ]
    )
    return world(rows, [], [("A", ["a", "b"]), ("B", ["out"])], {"out": "yes"})


def test_a_count_that_the_model_contradicts_is_told():
    caution = only(crossed(matched=300).ask({"a": "x", "b": "x"}), "counted")
    assert caution.rank == "weakens" and caution.figure == "75%"
    assert caution.text.startswith("of these 400 records have out = yes when counted; the model says 50%, between")
    assert caution.columns == ("out", "a", "b")


def test_a_count_within_chance_of_the_model_is_only_worth_knowing():
    assert only(crossed(matched=118).ask({"a": "x", "b": "x"}), "counted").rank == "know"


@pytest.mark.parametrize(("rows", "told"), [(99, []), (100, [("know", "counted")])])
def test_a_count_within_chance_of_the_model_is_told_of_a_hundred_records_or_more(rows, told):
    held = rows // 2 + 6  # 57 of 100, where the model says 50 % within a point or two
    groups = [(held, {"a": "x", "out": "yes"}), (rows - held, {"a": "x", "out": "no"})]
    others = [(4000 - held, {"a": "y", "out": "yes"}), (4000 - rows + held, {"a": "y", "out": "no"})]
    model = world(repeated(*groups, *others), [], [("A", ["a"]), ("B", ["out"])], {"out": "yes"})
    answer = model.ask({"a": "x"})
    low, high = answer["out"].among.interval("yes")
    assert not low <= held / rows <= high
    assert codes_of(answer) == told


def marked(better, blank=False):
    """Records where more and less of a grade, or its blank, part ways with a model that has no link into it."""
    last = [("z blank", 40)] if blank else []
    groups = [
        (times, {"a": a, "out": out})
        for a, counts in (
            ("x", [("1 low", 160), ("2 middle", 100), ("3 high", 40)]),
            ("y", [("1 low", 40), ("2 middle", 100), ("3 high", 160)]),
        )
        for out, times in (*counts, *last)
    ]
    return world(
        repeated(*groups),
        [],
        [("A", ["a"]), ("B", ["out"])],
        {"out": better},
        blanks=["out"] if blank else (),
        kinds={"out": "grade"},
    )


@pytest.mark.parametrize("blank", [False, True])
@pytest.mark.parametrize(("better", "level"), [(engine.MORE, "3 high"), (engine.LESS, "1 low")])
def test_the_count_of_more_or_less_is_that_of_the_levels_the_model_speaks_of(better, level, blank):
    model = marked(better, blank)
    caution = only(model.ask({"a": "x"}), "counted")
    assert f"have out = {level} when counted" in caution.text
    assert [model.network.node("out").levels[place] for place in model._telling.better("out")] == [level]


def test_a_count_that_the_model_agrees_with_is_not_told():
    assert codes_of(crossed(matched=100).ask({"a": "x", "b": "x"})) == []


def test_a_counted_share_does_not_give_a_small_count_away():
    groups = [(4, {"a": "x", "out": "yes"}), (36, {"a": "x", "out": "no"}), (400, {"a": "y", "out": "yes"})]
    model = world(repeated(*groups), [], [("A", ["a"]), ("B", ["out"])], {"out": "yes"})
    caution = only(model.ask({"a": "x"}), "counted")
    assert caution.figure == "under 10"
    assert caution.text.startswith("of these 40 records have out = yes when counted; the model says")
    model = world(repeated(*groups), [], [("A", ["a"]), ("B", ["out"])], {"out": "no"})
    assert only(model.ask({"a": "x"}), "counted").figure == "nearly all"


def test_wilson_at_ninety_per_cent():
    # Wilson 1927: the ends are where the normal test of a share just fails.
    for held, rows in ((0, 10), (7, 10), (40, 100), (100, 100)):
        for end in wilson(held, rows):
            if 0.0 < end < 1.0:
                assert abs(held / rows - end) == pytest.approx(1.6448536 * (end * (1.0 - end) / rows) ** 0.5, rel=1e-6)


def test_a_count_whose_total_is_not_told_is_compared_by_its_share_alone():
    groups = [(5, {"a": "z", "out": "yes"}), (150, {"a": "x", "out": "yes"}), (50, {"a": "x", "out": "no"})]
    rows = repeated(*groups, (250, {"a": "y", "out": "no"}), (150, {"a": "y", "out": "yes"}))
    model = world(rows, [], [("A", ["a"]), ("B", ["out"])], {"out": "yes"})
    caution = only(model.ask({"a": "x"}), "counted")
    assert caution.figure == "75%" and caution.text.startswith("of these records have out = yes when counted")
    nearly = world(rows, [], [("A", ["a"]), ("B", ["out"])], {"out": "yes"}).ask({"a": {"x", "y"}})
    assert not nearly.matching_told
    assert all("600" not in caution.text for caution in nearly.cautions)


def test_a_group_that_is_nearly_all_is_called_so():
    groups = [(5, {"a": "x", "out": "yes"}), (200, {"a": "y", "out": "no"})]
    model = world(repeated(*groups), [], [("A", ["a"]), ("B", ["out"])], {"out": "yes"}, prior=40.0)
    caution = only(model.ask({"a": "y"}), "counted")
    assert caution.text.startswith("of nearly all records have out = yes when counted")
