"""The true effects are right, and the records show what the codebook says is worth finding."""

from collections import Counter
from itertools import pairwise
from math import exp, log

import pytest

SUMMED = ("shift work", "mentor", "study group", "fee waived", "passed", "in work after a year")
FEW = 10


def shares_of(node, levels):
    """Shares of the node's levels given its parents' levels, straight from the definition of proportional odds."""
    pull = sum(pulls.get(levels[parent], 0.0) for parent, pulls in node.pulls.items())
    higher, left = [1.0], 1.0
    for share in node.shares[:-1]:
        left -= share
        higher.append(1.0 / (1.0 + exp(-log(left / (1.0 - left)) - pull)))
    higher.append(0.0)
    return [above - beyond for above, beyond in pairwise(higher)]


def world(network, setting):
    """Share of every combination of levels of SUMMED, walking through all combinations of all columns."""
    summed = Counter()
    known = {}
    levels = {}

    def walk(depth, share):
        if depth == len(network):
            summed[tuple(levels[name] for name in SUMMED)] += share
            return
        node = network[depth]
        if node.name in setting:
            levels[node.name] = setting[node.name]
            walk(depth + 1, share)
            return
        seen = (depth, *(levels[parent] for parent in node.pulls))
        if seen not in known:
            known[seen] = tuple(zip(node.levels, shares_of(node, levels), strict=True))
        for level, own in known[seen]:
            levels[node.name] = level
            walk(depth + 1, share * own)

    walk(0, 1.0)
    return summed


def share(summed, outcome, given):
    """Share with the outcome at yes among those with all of `given`."""
    among = {
        combination: weight
        for combination, weight in summed.items()
        if all(combination[SUMMED.index(name)] == level for name, level in given.items())
    }
    better = sum(weight for combination, weight in among.items() if combination[SUMMED.index(outcome)] == "yes")
    return better / sum(among.values())


@pytest.fixture(scope="module")
def recorded(script):
    return world(script.NETWORK, {})


def test_the_combinations_of_levels_sum_to_one(recorded):
    assert sum(recorded.values()) == pytest.approx(1.0, abs=1e-12)


def test_every_changeable_column_outcome_and_shift_has_its_truth(effects, study):
    plan = study["plan"]
    assert set(effects) == {
        (column, outcome, shift)
        for column in plan["changeable"]
        for outcome in plan["outcomes"]
        for shift in (None, "days", "mixed", "nights")
    }


@pytest.mark.parametrize("column", ["mentor", "study group", "fee waived"])
def test_the_truths_equal_a_plain_enumeration(script, effects, recorded, column):
    worlds = {level: world(script.NETWORK, {column: level}) for level in ("no", "yes")}
    for (lever, outcome, _), entry in effects.items():
        if lever != column:
            continue
        group = entry["among"]
        assert entry["recorded"] == pytest.approx(share(recorded, outcome, group), abs=1e-6)
        for level in ("no", "yes"):
            had = share(recorded, outcome, {**group, column: level})
            assert entry["had"][level] == pytest.approx(had, abs=1e-6)
            assert entry["set"][level] == pytest.approx(share(worlds[level], outcome, group), abs=1e-6)


@pytest.mark.parametrize("shift", [None, "days", "mixed", "nights"])
def test_a_mentor_looks_harmful_and_helps(effects, records, shift):
    truth = effects["mentor", "passed", shift]
    assert truth["had"]["no"] - truth["had"]["yes"] > 0.05
    assert 0.07 <= truth["set"]["yes"] - truth["recorded"] <= 0.10
    assert truth["set"]["yes"] > truth["recorded"] > truth["set"]["no"]
    among = records if shift is None else records[records["shift work"] == shift]
    passed = (among["passed"] == "yes").groupby(among["mentor"]).mean()
    assert passed["no"] - passed["yes"] > 0.05


def test_a_study_group_looks_better_than_it_is(effects):
    truth = effects["study group", "passed", None]
    assert truth["had"]["yes"] - truth["had"]["no"] > 2 * (truth["set"]["yes"] - truth["set"]["no"]) > 0.1


def test_waiving_the_fee_moves_passing_by_about_a_point(effects):
    truth = effects["fee waived", "passed", None]
    assert 0.005 < truth["set"]["yes"] - truth["recorded"] < 0.015


def test_nights_are_the_thin_place(records, codebook):
    assert "fewer than ten learners on\n  nights were ever in one" in codebook
    groups = records[records["study group"] == "yes"]["shift work"].value_counts()
    assert 0 < groups["nights"] < FEW < 100 < groups["mixed"]
    assert (records["shift work"] == "nights").sum() > 800
    assert "of those on nights with upper schooling fewer than ten had a mentor" in codebook
    mentored = records[records["mentor"] == "yes"]
    combinations = mentored[mentored["prior schooling"] != ""].groupby(["prior schooling", "shift work"]).size()
    assert list(combinations[combinations < FEW].index) == [("upper", "nights")]
