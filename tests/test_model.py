"""What a user asks of a Model, and what it refuses."""

import numpy as np
import pytest

import engine
from tests.doubting.worlds import repeated, world

NO_YES = ["no", "yes"]


@pytest.fixture(scope="module")
def school():
    """Region and shift before the offer of a mentor; attendance after it; passing last."""
    rng = np.random.default_rng(5)
    groups = []
    for region in ("north", "south", "west"):
        for shift in ("days", "nights"):
            for mentor in NO_YES:
                for attends in ("much", "little"):
                    for passed in NO_YES:
                        row = {"region": region, "shift": shift, "mentor": mentor, "attends": attends, "passed": passed}
                        groups.append((int(rng.integers(20, 60)), row))
    links = [
        ("region", "mentor"),
        ("shift", "mentor"),
        ("mentor", "attends"),
        ("attends", "passed"),
        ("region", "passed"),
    ]
    stages = [("Before", ["region", "shift"]), ("Offer", ["mentor"]), ("During", ["attends"]), ("After", ["passed"])]
    return world(repeated(*groups), links, stages, {"passed": "yes"}, ["mentor"])


def refused(message, do, ask):
    with pytest.raises(engine.Refusal, match=message) as refusal:
        ask()
    assert do in (refusal.value.do or "")


def test_the_outcomes_of_the_order_are_watched_unless_others_are_named(school):
    assert list(school.ask()) == ["passed"]
    assert list(school.ask(watch=["attends"], beside=["passed", "attends"])) == ["attends", "passed"]
    assert school.ask(watch=["attends"], beside=["passed"]).watch == ("attends",)


def test_a_network_given_as_it_is_watches_all_and_lets_all_be_set():
    model = engine.Model.from_network([engine.Category("a", NO_YES, [], [0.5, 0.5])])
    assert list(model.ask()) == ["a"] and model.changeable == ("a",)
    answer = model.ask(levers={"a": engine.Fix("yes")})
    assert answer["a"].set.shares == {"no": 0.0, "yes": 1.0}
    assert answer["a"].set.interval("yes") == (1.0, 1.0) and answer["a"].recorded.interval("yes") == (0.5, 0.5)


def test_counted_is_straight_from_the_matching_records(school):
    answer = school.ask({"region": "north", "shift": {"days", "nights"}}, watch=["passed"], beside=["mentor"])
    codes = school.coded.codes
    north = codes[:, 0] == school.coded.levels[0].index("north")
    assert answer.matching == north.sum() == answer["passed"].counted.rows
    yes = school.coded.levels[4].index("yes")
    assert answer["passed"].counted.counts["yes"] == (codes[north, 4] == yes).sum()
    assert answer["mentor"].counted.rows == north.sum()
    assert sum(answer["passed"].counted.shares.values()) == pytest.approx(1.0)
    assert school.ask()["passed"].counted.rows == len(codes)


def test_counts_under_the_limit_are_not_given():
    rows = repeated((9, {"a": "x", "b": "u"}), (10, {"a": "y", "b": "u"}), (30, {"a": "z", "b": "v"}))
    model = world(rows, [("a", "b")], [("All", ["a"]), ("Then", ["b"])])
    few, enough = model.ask({"a": "x"}, watch=["b"]), model.ask({"a": "z"}, watch=["b"])
    assert few.matching == 9 and few["b"].counted is None
    assert enough["b"].counted.counts == {"u": 0, "v": 30}


def test_change_is_set_minus_among_over_common_draws(school):
    answer = school.ask({"region": "north"}, {"mentor": engine.Fix("yes")}, draws=100)
    change, low, high = answer.change("passed", "yes")
    reading = answer["passed"]
    assert change == reading.set.share("yes") - reading.among.share("yes")
    differences = reading.set.share_draws("yes") - reading.among.share_draws("yes")
    assert (low, high) == tuple(np.quantile(differences, [0.05, 0.95])) and low < change < high
    refused("Nothing is set", "Set a lever", lambda: school.ask().change("passed", "yes"))


def test_the_same_question_has_the_same_digits(school):
    first, second = (school.ask({"shift": "days"}, {"mentor": engine.Fix("no", 0.4)}, seed=9) for _ in range(2))
    np.testing.assert_array_equal(first["passed"].set.draws, second["passed"].set.draws)
    other = school.ask({"shift": "days"}, {"mentor": engine.Fix("no", 0.4)}, seed=10)
    assert not np.array_equal(first["passed"].set.draws, other["passed"].set.draws)
    np.testing.assert_array_equal(first["passed"].set.point, other["passed"].set.point)


def test_an_answer_says_how_it_was_come_by(school):
    answer = school.ask(levers={"mentor": engine.Fix("yes")})
    assert answer.method.startswith("exact") and answer.mc_error == 0.0
    assert answer.cost > 0 and answer.milliseconds > 0.0


def test_had_is_none_where_nobody_pinned_can_have_the_value(school):
    answer = school.ask({"mentor": "no"}, {"mentor": engine.Fix("yes")})
    assert answer["passed"].had is None and answer["passed"].set is not None


def test_unknown_names_are_refused_with_those_that_exist(school):
    refused("no column “regoin” in", "region, shift, mentor", lambda: school.ask({"regoin": "north"}))
    refused("no column “grade” in", "region, shift", lambda: school.ask(watch=["grade"]))
    refused("no column “grade” in", "region, shift", lambda: school.ask(beside=["grade"]))
    refused("no column “3” in", "region, shift", lambda: school.ask({3: "north"}))
    refused("“region” has no level “east”", "north, south, west", lambda: school.ask({"region": "east"}))
    refused("“region” has no level “east”", "north, south, west", lambda: school.ask({"region": ["north", "east"]}))
    refused("“mentor” has no level “maybe”", "no, yes", lambda: school.ask(levers={"mentor": engine.Fix("maybe")}))


def test_a_pin_downstream_of_a_lever_is_refused(school):
    refused(
        "^“attends” follows “mentor”, which you set, so pinning it would mix two worlds",
        "Take out the pin on “attends”, or do not set “mentor”.",
        lambda: school.ask({"attends": "much"}, {"mentor": engine.Fix("yes")}),
    )
    school.ask({"mentor": "no"}, {"mentor": engine.Fix("yes")})  # a pin on the lever's own column is before it


def test_only_a_changeable_column_may_be_set(school):
    refused("“shift” is not marked as changeable", "mentor", lambda: school.ask(levers={"shift": engine.Fix("days")}))


@pytest.mark.parametrize("reach", [-0.1, 1.1, float("nan"), "half", None, True])
def test_a_reach_that_is_no_probability_is_refused(school, reach):
    refused("reach of “mentor”", "from 0 to 1", lambda: school.ask(levers={"mentor": engine.Fix("yes", reach)}))


@pytest.mark.parametrize("reach", [np.float32(0.5), np.float64(0.5)])
def test_a_reach_may_be_any_kind_of_number(school, reach):
    mentor = {"mentor": engine.Fix("yes", reach)}
    half = {"mentor": engine.Fix("yes", 0.5)}
    assert school.ask(levers=mentor)["passed"].set.shares == school.ask(levers=half)["passed"].set.shares


def test_what_is_no_question_is_refused(school):
    refused("“region” is pinned to no level", "north", lambda: school.ask({"region": []}))
    refused("one level only", "no, yes", lambda: school.ask(levers={"mentor": engine.Fix({"no", "yes"})}))
    refused("no lever", "engine.Fix", lambda: school.ask(levers={"mentor": "yes"}))
    refused("one text, not a list", "passed", lambda: school.ask(watch="passed"))
    refused("watches no column", "at least one", lambda: school.ask(watch=[]))
    refused("pins of a question", "a column", lambda: school.ask(pins=["region"]))
    refused("exact = 1 is no choice", "True, False or None", lambda: school.ask(exact=1))
    refused("seed = 1.5 is no whole number of 0 or more", "0 or more", lambda: school.ask(seed=1.5))


@pytest.mark.parametrize("draws", [-1, 1, 2, 19, 20.5, True, None])
def test_draws_too_few_for_an_interval_are_refused(school, draws):
    refused("draw", "Give 0 for points alone, or at least 20", lambda: school.ask(draws=draws))
    low, high = school.ask(draws=0)["passed"].among.interval("yes")
    assert low == high
    assert school.ask(draws=np.int64(20))["passed"].among.draws.shape == (2, 20)


@pytest.mark.parametrize("coverage", [90, 0, 1, -0.5, float("nan"), "90", True])
def test_a_coverage_that_is_no_share_is_refused(school, coverage):
    answer = school.ask(levers={"mentor": engine.Fix("yes")})
    known = engine.Model.from_network([engine.Category("a", NO_YES, [], [0.5, 0.5])]).ask()
    for ask in (
        lambda: answer["passed"].set.interval("yes", coverage),
        lambda: answer.change("passed", "yes", coverage),
        lambda: known["a"].among.interval("yes", coverage),
    ):
        refused("An interval cannot cover", "such as 0.90", ask)


def test_a_column_that_was_not_asked_for_is_refused(school):
    answer = school.ask(levers={"mentor": engine.Fix("yes")}, beside=["attends"])
    for ask in (lambda: answer["unknown"], lambda: answer.change("unknown", "yes"), lambda: answer["region"]):
        refused("“(unknown|region)” was not asked for", "passed and attends", ask)
    refused("no level “maybe” here", "no, yes", lambda: answer.change("passed", "maybe"))


def test_a_range_pin_must_match_the_bands():
    hours = engine.Category(
        "hours", ["under 5", "5 to under 10", "10 and over"], [], [0.2, 0.3, 0.5], None, "number", (5.0, 10.0)
    )
    model = engine.Model.from_network([hours])
    answer = model.ask({"hours": (None, 10)}, watch=["hours"])
    assert answer["hours"].among.shares == pytest.approx({"under 5": 0.4, "5 to under 10": 0.6, "10 and over": 0.0})
    assert model.ask({"hours": (5, float("inf"))}).log_evidence == pytest.approx(np.log(0.8))
    assert model.ask({"hours": "5 to under 10"}).log_evidence == pytest.approx(np.log(0.3))
    assert model.ask({"hours": 7.5}).log_evidence == pytest.approx(np.log(0.3))
    for wrong in ((5, 7), (10, 5), (5, float("nan")), ([], 5)):
        with pytest.raises(engine.Refusal) as refusal:
            model.ask({"hours": wrong})
        assert refusal.value.where == "hours"
    set_to = model.ask(levers={"hours": engine.Fix(7.5)})
    assert set_to["hours"].set.shares["5 to under 10"] == 1.0


def test_strength_is_the_largest_change_of_the_better_share():
    table = [[[0.9, 0.1], [0.6, 0.4], [0.5, 0.5]], [[0.9, 0.1], [0.2, 0.8], [0.1, 0.9]]]
    model = engine.Model.from_network(
        [
            engine.Category("a", NO_YES, [], [0.75, 0.25]),
            engine.Category("b", ["x", "y", "z"], ["a"], [[0.2, 0.3, 0.5], [0.6, 0.2, 0.2]]),
            engine.Category("c", NO_YES, ["a", "b"], table),
        ]
    )
    # b: share of c = no, its commonest level: .9 at x; .75 x .6 + .25 x .2 = .5 at y; .75 x .5 + .25 x .1 = .4 at z
    assert model.strength("b", "c") == pytest.approx(0.9 - 0.4)
    # a, averaged over b as recorded, x .3, y .275, z .425: .9 - .9; .6 - .2; .5 - .1
    assert model.strength("a", "c") == pytest.approx(0.275 * 0.4 + 0.425 * 0.4)
    assert model.strength("a", "b") == pytest.approx(0.3)  # z, the commonest: .5 to .2
    refused("No link leads from “c” to “a”", "model.links", lambda: model.strength("c", "a"))


def test_strength_speaks_of_the_better_level_of_an_outcome(school):
    node = school.network.node("passed")
    assert node.parents == ("region", "attends") or node.parents == ("attends", "region")
    assert 0.0 < school.strength("attends", "passed") < 1.0
    assert school.links == tuple((parent, node.name) for node in school.network.nodes for parent in node.parents)
