"""The order: what it allows, and what it refuses to be."""

import pickle

import pytest

from engine.order import LESS, MORE, Order, Unrecorded, better_levels
from engine.refusal import Refusal

STAGES = [("Background", ["age", "region"]), ("Programme", ["mentor", "hours"]), ("Outcome", ["passed"])]


def test_a_column_leads_to_its_own_stage_and_later_ones_only():
    order = Order(STAGES)
    assert order.may_lead("age", "passed") and order.may_lead("age", "region") and order.may_lead("region", "age")
    assert not order.may_lead("passed", "mentor")
    assert order.why("passed", "mentor") == "Outcome comes after Programme"
    assert not order.may_lead("age", "age")


def test_columns_stand_stage_by_stage():
    order = Order(STAGES)
    assert order.columns == ("age", "region", "mentor", "hours", "passed")
    assert [order.stage_of(name) for name in order.columns] == [0, 0, 1, 1, 2]


def test_ruling_out_forbids_one_direction():
    order = Order(STAGES, rule_out=[("age", "region")])
    assert not order.may_lead("age", "region") and order.may_lead("region", "age")


def test_insisting_forbids_every_way_back():
    order = Order([("All", ["a", "b", "c", "d"])], insist=[("a", "b"), ("b", "c")])
    assert order.why("a", "b") == "you insist on it"
    assert not order.may_lead("b", "a") and not order.may_lead("c", "a") and not order.may_lead("c", "b")
    assert order.may_lead("a", "c") and order.may_lead("d", "a")


def test_an_unrecorded_cause_says_which_comes_first_and_may_rule_the_direct_link_out():
    order = Order(STAGES, unrecorded=[Unrecorded("mentor", "hours"), Unrecorded("mentor", "passed", direct=False)])
    assert order.may_lead("mentor", "hours") and not order.may_lead("hours", "mentor")
    assert order.why("hours", "mentor") == "you said that mentor comes first"
    assert not order.may_lead("mentor", "passed") and order.may_lead("hours", "passed")
    assert order.why("mentor", "passed") == "you said that only something unrecorded ties them, no direct link"


def test_what_comes_first_closes_every_way_back():
    order = Order([("All", ["a", "b", "c"])], insist=[("b", "c")], unrecorded=[Unrecorded("a", "b")])
    assert not order.may_lead("c", "a") and order.may_lead("a", "c")


def test_allows_lists_every_ordered_pair_once():
    order = Order(STAGES, insist=[("mentor", "passed")], rule_out=[("region", "passed")])
    allows = order.allows()
    assert list(allows.columns) == ["source", "target", "allowed", "why"]
    assert len(allows) == 20 and not allows.duplicated(["source", "target"]).any()
    for row in allows.itertuples():
        assert row.allowed == order.may_lead(row.source, row.target)
        assert row.why == order.why(row.source, row.target)


def test_an_outcome_is_a_level_several_levels_or_a_direction():
    order = Order(STAGES, outcomes={"passed": "yes", "hours": LESS, "mentor": ["yes", "twice"]})
    assert order.outcomes == {"passed": ("yes",), "hours": LESS, "mentor": ("yes", "twice")}


def test_an_order_survives_pickling():
    unrecorded = [Unrecorded("mentor", "hours", direct=False)]
    more = {"changeable": ["mentor"], "outcomes": {"hours": LESS}, "unrecorded": unrecorded}
    order = Order(STAGES, insist=[("mentor", "passed")], **more)
    assert pickle.loads(pickle.dumps(order)) == order


@pytest.mark.parametrize(
    ("more", "says"),
    [
        ({"insist": [("passed", "mentor")]}, "Outcome comes after Programme"),
        ({"insist": [("mentor", "nobody")]}, "“nobody” is in no stage"),
        ({"rule_out": [("nobody", "mentor")]}, "“nobody” is in no stage"),
        ({"changeable": ["nobody"]}, "“nobody” is in no stage"),
        ({"outcomes": {"nobody": "yes"}}, "“nobody” is in no stage"),
        ({"insist": [("age", "passed")], "rule_out": [("age", "passed")]}, "rule it out as well"),
        ({"insist": [("age", "region"), ("region", "age")]}, "circle"),
        ({"insist": [("age", "age")]}, "itself"),
        ({"unrecorded": [("age", "passed")]}, "is no unrecorded cause"),
        ({"unrecorded": [Unrecorded("age", "passed", direct="no")]}, "is no unrecorded cause"),
        ({"unrecorded": [Unrecorded("age", "nobody")]}, "“nobody” is in no stage"),
        ({"unrecorded": [Unrecorded("age", "age")]}, "with itself"),
        ({"unrecorded": [Unrecorded("age", "region"), Unrecorded("region", "age")]}, "in a circle"),
        ({"unrecorded": [Unrecorded("age", "region"), Unrecorded("age", "region", False)]}, "stated twice"),
        ({"unrecorded": [Unrecorded("passed", "mentor")]}, "Outcome comes after Programme"),
        ({"unrecorded": [Unrecorded("age", "region")], "insist": [("region", "age")]}, "in a circle"),
        ({"unrecorded": [Unrecorded("age", "passed", direct=False)], "insist": [("age", "passed")]}, "does not lead"),
        ({"insist": ["ab"]}, "'ab' is no link"),
        ({"rule_out": [("age",)]}, "is no link"),
        ({"outcomes": {"passed": []}}, "“passed” has no level that counts as better"),
        ({"outcomes": {"passed": 1}}, "“passed” has no level that counts as better"),
    ],
)
def test_a_contradiction_is_refused_with_a_sentence(more, says):
    with pytest.raises(Refusal, match=says) as refused:
        Order(STAGES, **more)
    assert refused.value.where and refused.value.do


def test_a_column_in_two_stages_is_refused():
    with pytest.raises(Refusal, match="twice: in Early and in Late") as refused:
        Order([("Early", ["a", "b"]), ("Late", ["a"])])
    assert refused.value.where == "a"


@pytest.mark.parametrize("stage", ["ab", ("Early",), ("Early", ["a"], 3)])
def test_what_is_no_stage_is_refused(stage):
    with pytest.raises(Refusal, match="is no stage") as refused:
        Order([stage])
    assert refused.value.where and refused.value.do


def test_a_name_outside_the_order_is_refused():
    with pytest.raises(Refusal, match="no column “weather”"):
        Order(STAGES).may_lead("weather", "passed")


def test_more_and_less_are_the_ends_of_the_levels_but_never_a_blank():
    levels = ("low", "middle", "high", "blank")
    assert better_levels(MORE, levels, has_blank=True) == ("high",)
    assert better_levels(MORE, levels, has_blank=False) == ("blank",)
    assert better_levels(LESS, levels, has_blank=True) == better_levels(LESS, levels, has_blank=False) == ("low",)
    assert better_levels(MORE, ("blank",), has_blank=True) == ("blank",)
    assert better_levels(("high", "low", "none"), levels, has_blank=True) == ("low", "high")
    assert better_levels(None, levels, has_blank=True) == ()
