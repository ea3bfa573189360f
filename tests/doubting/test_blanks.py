"""Blanks taken as a level of their own."""

from dataclasses import replace

import pytest

import engine
from tests.doubting.worlds import codes_of, only, repeated, world


def attending(blank, where="attends", unknown="unknown"):
    """A lever that acts through attendance, `blank` of 400 records of one column blank."""
    groups = [
        (50 - blank // 8, {"mentor": mentor, "attends": attends, "passed": passed, "town": "b"})
        for mentor in ("no", "yes")
        for attends in ("little", "much")
        for passed in ("no", "yes")
    ]
    groups += [(blank // 8, {**group, where: unknown}) for _, group in groups]
    links = [("mentor", "attends"), ("attends", "passed"), ("passed", "town")]
    stages = [("Offer", ["mentor"]), ("During", ["attends"]), ("After", ["passed"]), ("Last", ["town"])]
    return world(repeated(*groups), links, stages, {"passed": "yes"}, ["mentor"], blanks=[where] if blank else [])


@pytest.mark.parametrize("where", ["mentor", "attends", "passed"])
def test_a_blank_in_what_the_question_runs_through_is_worth_knowing(where):
    model = attending(16, where, unknown="zz")
    caution = only(model.ask(levers={"mentor": engine.Fix("yes")}), "blanks")
    assert (caution.rank, caution.figure, caution.columns) == ("know", "4%", (where,))
    assert caution.text == (
        f"of {where} is blank and is taken as a level of its own, which can hide part of its influence."
    )
    assert caution.do == "Say on the Records page what a blank means there."
    twin = attending(0, where).ask(levers={"mentor": engine.Fix("yes")})
    assert "blanks" not in [code for _, code in codes_of(twin)]
    codes = model.coded.codes
    unseen = replace(model, coded=replace(model.coded, codes=codes[(codes < 2).all(axis=1)]))  # a blank without records
    assert "blanks" not in [code for _, code in codes_of(unseen.ask(levers={"mentor": engine.Fix("yes")}))]


def test_a_blank_off_the_path_is_not_told():
    lever = {"mentor": engine.Fix("yes")}
    assert "blanks" not in [code for _, code in codes_of(attending(16, "town", "zz").ask(levers=lever))]
    assert "blanks" in [code for _, code in codes_of(attending(16, "town", "zz").ask(levers=lever, watch=["town"]))]
    model = attending(16, "attends", "zz")
    assert "blanks" not in [code for _, code in codes_of(model.ask(watch=["passed"]))]
    assert "blanks" not in [code for _, code in codes_of(model.ask(levers={"mentor": engine.Fix("yes", 0.0)}))]


def test_a_blank_in_a_cause_of_the_lever_is_told_and_in_what_no_lever_moves_is_not():
    groups = [(100, {"need": need, "mentor": need, "passed": "yes", "other": "a"}) for need in ("no", "yes")]
    groups += [(20, {"need": "zz", "mentor": "yes", "passed": "no", "other": "zz"})]
    model = world(
        repeated(*groups),
        [("need", "mentor"), ("need", "passed"), ("mentor", "passed")],
        [("Before", ["need", "other"]), ("Offer", ["mentor"]), ("After", ["passed"])],
        {"passed": "yes", "other": "a"},
        ["mentor"],
        blanks=["need", "other"],
    )
    assert only(model.ask(levers={"mentor": engine.Fix("yes")}), "blanks").columns == ("need",)


def test_blanks_of_several_columns_are_told_in_one_caution_the_largest_first():
    groups = [(300, "yes", "yes"), (50, "zz", "no"), (30, "yes", "zz"), (5, "no", "no"), (15, "no", "zz")]
    rows = repeated(*[(times, {"mentor": mentor, "passed": passed}) for times, mentor, passed in groups])
    stages = [("Offer", ["mentor"]), ("After", ["passed"])]
    model = world(rows, [("mentor", "passed")], stages, {"passed": "yes"}, blanks=["mentor", "passed"])
    caution = only(model.ask(levers={"mentor": engine.Fix("yes")}), "blanks")
    assert (caution.figure, caution.columns) == ("12%", ("mentor", "passed"))
    assert caution.text.startswith("of mentor and 11% of passed are blank, and a blank is taken as a level of its own")
    assert caution.do == "Say on the Records page what a blank means in each of them."


def test_a_share_of_blanks_does_not_give_a_small_count_away():
    caution = only(attending(8, "attends", "zz").ask(levers={"mentor": engine.Fix("yes")}), "blanks")
    assert caution.figure == "under 3%"
