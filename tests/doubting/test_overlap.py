"""Overlap: were there records that had the value a lever would set?"""

import pytest

import engine
from tests.doubting.schools import halves, offer, school
from tests.doubting.worlds import codes_of, only, repeated, world


def test_overlap_blocks_where_most_are_like_no_record_with_the_value():
    answer = offer(school(nights_with_mentor=0), {"shift": "nights"})
    caution = only(answer, "overlap")
    assert caution.rank == "blocks" and answer.blocked
    assert caution.figure == "200 of 200"
    assert caution.text == "records asked about are alike in shift to no record with mentor = yes."
    assert caution.columns == ("mentor", "shift")
    assert caution.figures == {"rows": 200, "share thin": 1.0, "share without": 1.0}


def test_overlap_weakens_where_some_are_like_no_record_with_the_value():
    answer = offer(school(nights_with_mentor=0))
    caution = only(answer, "overlap")
    assert caution.rank == "weakens" and not answer.blocked
    assert caution.figure == "200 of 500"
    assert caution.figures["share without"] == pytest.approx(0.4)
    assert only(offer(school(nights_with_mentor=0, nights=290)), "overlap").rank == "weakens"
    assert only(offer(school(nights_with_mentor=0, nights=310)), "overlap").rank == "blocks"


def test_overlap_weakens_where_the_value_is_rare():
    caution = only(offer(school(nights_with_mentor=9), {"shift": "nights"}), "overlap")
    assert caution.rank == "weakens"
    assert "alike in shift to fewer than 10 records with mentor = yes" in caution.text


@pytest.mark.parametrize("pins", [None, {"shift": "nights"}, {"mentor": "no"}])
def test_overlap_is_silent_where_every_stratum_has_the_value(pins):
    answer = offer(school(nights_with_mentor=10), pins)
    assert answer.cautions == () and answer.checks_made == (4 if pins is None else 5)


def test_overlap_is_silent_where_few_of_the_pinned_are_in_a_thin_stratum():
    assert offer(school(nights_with_mentor=0, nights=15)).cautions == ()
    assert codes_of(offer(school(nights_with_mentor=0, nights=16))) == [("weakens", "overlap")]


def test_overlap_is_not_asked_of_a_lever_that_reaches_nobody_or_moves_nothing_watched():
    model = school(nights_with_mentor=0)
    assert codes_of(offer(model, reach=0.0)) == []
    assert codes_of(model.ask(levers={"mentor": engine.Fix("yes")}, watch=["shift"], beside=["passed"])) == []


def test_overlap_of_a_lever_without_parents_looks_at_all_records():
    rows = repeated((8, {"lever": "on", "out": "yes"}), (92, {"lever": "off", "out": "no"}))
    model = world(rows, [("lever", "out")], [("A", ["lever"]), ("B", ["out"])], {"out": "yes"})
    caution = only(model.ask(levers={"lever": engine.Fix("on")}), "overlap")
    assert caution.rank == "weakens" and caution.figure == "100 of 100"
    assert caution.text.startswith("records asked about are compared with fewer than 10 records with lever = on.")


def two_offers(both):
    """Two offers that pass on to `passed`; `both` records had the two of them, each alone was common."""
    groups = [(both, "yes", "yes"), (200, "yes", "no"), (200, "no", "yes"), (200, "no", "no")]
    rows = repeated(
        *[
            (times, {"mentor": mentor, "group": group, "passed": passed})
            for n, mentor, group in groups
            for times, passed in halves(n)
        ]
    )
    stages = [("Offer", ["mentor", "group"]), ("After", ["passed"])]
    return world(rows, [("mentor", "passed"), ("group", "passed")], stages, {"passed": "yes"})


def test_two_values_that_were_never_recorded_together_block():
    levers = {"mentor": engine.Fix("yes"), "group": engine.Fix("yes")}
    caution = only(two_offers(both=0).ask(levers=levers), "overlap")
    assert (caution.rank, caution.figure) == ("blocks", "600 of 600")
    assert caution.text == (
        "records asked about are compared with no record with mentor = yes and group = yes together, "
        "on which passed depends."
    )
    assert caution.columns == ("mentor", "group", "passed")
    assert only(two_offers(both=8).ask(levers=levers), "overlap").rank == "weakens"
    assert codes_of(two_offers(both=10).ask(levers=levers)) == []
    assert codes_of(two_offers(both=0).ask(levers={"mentor": engine.Fix("yes")}, watch=["group"])) == []


def test_a_value_never_recorded_in_a_group_whose_part_in_the_outcome_differs_blocks():
    answer = two_offers(both=0).ask({"group": "yes"}, {"mentor": engine.Fix("yes")})
    caution = only(answer, "overlap")
    assert (caution.rank, caution.figure) == ("blocks", "200 of 200")
    assert "alike in group to no record with mentor = yes, on which passed depends." in caution.text
    assert codes_of(two_offers(both=40).ask({"group": "yes"}, {"mentor": engine.Fix("yes")})) == []


def test_two_values_block_where_one_leads_to_the_other_and_they_never_met():
    rows = repeated(
        *[
            (times, {"a": a, "b": b, "out": out})
            for a, b in (("x", "y"), ("y", "x"), ("y", "y"))
            for times, out in halves(200)
        ]
    )
    links = [("a", "b"), ("a", "out"), ("b", "out")]
    model = world(rows, links, [("A", ["a"]), ("B", ["b"]), ("C", ["out"])], {"out": "yes"})
    caution = model.ask(levers={"a": engine.Fix("x"), "b": engine.Fix("x")}).cautions[0]
    assert (caution.rank, caution.code, caution.figure) == ("blocks", "overlap", "600 of 600")
