"""How a column comes about, sentence by sentence."""

import numpy as np
import pytest
from hypothesis import given, settings

import engine
from engine.network.merging import MOST, parts
from engine.network.said import in_hundred
from engine.network.story import APART, rules
from tests.answering.generated import networks
from tests.plainly import cases, total

NO_YES = ["no", "yes"]


def yes(*shares):
    """A table of shares of yes, for a column of no and yes."""
    found = np.array(shares, dtype=float)
    return np.stack([1 - found, found], axis=-1)


def model(*nodes, unsettled=(), **order):
    network = engine.Model.from_network(nodes).network
    stated = engine.Order([("Everything", network.names)], **order) if order else None
    return engine.Model(network, stated, None, frozenset(unsettled))


SHIFT = engine.Category("shift", ["days", "nights", "mixed"], [], [0.5, 0.3, 0.2])
SCHOOL = engine.Category("school", ["primary", "lower", "upper"], [], [0.3, 0.4, 0.3], kind="grade")
HOURS = engine.Category(
    "hours", ["under 5", "5 to under 10", "10 and over", "blank"], [], [0.3, 0.3, 0.3, 0.1],
    kind="number", cuts=(5.0, 10.0), has_blank=True,
)  # fmt: skip


def test_like_configurations_are_told_as_one_from_the_highest_share_to_the_lowest():
    table = yes([0.59, 0.80, 0.60], [0.23, 0.24, 0.22], [0.05, 0.06, 0.05])
    told = model(SHIFT, SCHOOL, engine.Category("mentor", NO_YES, ["school", "shift"], table)).story("mentor")
    assert told == (
        "comes from school and shift. It is yes for 80 in 100 where school is primary and shift is nights; "
        "for 59 in 100 where school is primary and shift is days or mixed; "
        "for 23 in 100 where school is lower, the commonest case; for 5 in 100 where school is upper."
    )


def test_two_parts_need_no_word_on_which_is_the_commonest():
    told = model(SHIFT, engine.Category("passed", NO_YES, ["shift"], yes(0.7, 0.3, 0.31))).story("passed")
    assert (
        told == "comes from shift. It is yes for 70 in 100 where shift is days; "
        "for 30 in 100 where shift is nights or mixed."
    )


def test_a_part_whose_configurations_differ_says_how_far_and_with_what():
    five = engine.Category("site", ["a", "b", "c", "d", "e"], [], [0.2] * 5)
    told = model(five, engine.Category("passed", NO_YES, ["site"], yes(0.1, 0.3, 0.5, 0.7, 0.81))).story("passed")
    assert told == (
        "comes from site. It is yes for 76 in 100 where site is d or e (70 to 81 depending on site), "
        "the commonest case; "
        "for 50 in 100 where site is c; for 30 in 100 where site is b; for 10 in 100 where site is a."
    )


def test_what_hardly_differs_is_told_in_one_sentence():
    told = model(SHIFT, engine.Category("passed", NO_YES, ["shift"], yes(0.41, 0.40, 0.43))).story("passed")
    assert told == "comes from shift. It is yes for about 41 in 100, whatever shift is."
    table = yes([0.41] * 3, [0.42] * 3, [0.4] * 3)
    told = model(SHIFT, SCHOOL, engine.Category("passed", NO_YES, ["school", "shift"], table)).story("passed")
    assert told == "comes from school and shift. It is yes for about 41 in 100, whatever school and shift are."


def test_what_only_differs_jointly_says_so():
    coin = engine.Category("coin", ["heads", "tails"], [], [0.5, 0.5])
    other = engine.Category("other", ["heads", "tails"], [], [0.5, 0.5])
    told = model(coin, other, engine.Category("same", NO_YES, ["coin", "other"], yes([0.9, 0.1], [0.1, 0.9])))
    assert told.story("same") == (
        "comes from coin and other. It is yes for 50 in 100 (10 to 90 depending on coin and other)."
    )


def test_grades_are_told_by_the_threshold_that_parts_them_most_evenly():
    table = [[0.1, 0.2, 0.7], [0.5, 0.3, 0.2], [0.5, 0.3, 0.2]]
    grade = engine.Category("mark", ["low", "middle", "high"], ["shift"], table, kind="grade")
    assert model(SHIFT, grade).story("mark") == (
        "comes from shift. It is high for 70 in 100 where shift is days; for 20 in 100 where shift is nights or mixed."
    )
    table = [[0.1, 0.2, 0.7], [0.8, 0.1, 0.1], [0.8, 0.1, 0.1]]
    grade = engine.Category("mark", ["low", "middle", "high"], ["shift"], table, kind="grade")
    assert model(SHIFT, grade).story("mark") == (
        "comes from shift. It is middle or above for 90 in 100 where shift is days; "
        "for 20 in 100 where shift is nights or mixed."
    )


def test_graded_parents_are_parted_at_a_threshold_and_never_by_odd_levels():
    four = engine.Category("level", ["a", "b", "c", "d"], [], [0.25] * 4, kind="grade")
    told = model(four, engine.Category("passed", NO_YES, ["level"], yes(0.2, 0.2, 0.6, 0.6))).story("passed")
    assert told == (
        "comes from level. It is yes for 60 in 100 where level is c or above; for 20 in 100 where level is b or below."
    )
    told = model(four, engine.Category("passed", NO_YES, ["level"], yes(0.2, 0.6, 0.6, 0.2))).story("passed")
    assert told == (
        "comes from level. It is yes for 60 in 100 where level is from b to c, the commonest case; "
        "for 20 in 100 where level is a; for 20 in 100 where level is d."
    )


def test_grades_and_blanks_are_told_apart_by_a_pause():
    levels = ["none", "one or two", "three or more", "blank"]
    children = engine.Category("children", levels, [], [0.25] * 4, kind="grade", has_blank=True)
    told = model(children, engine.Category("passed", NO_YES, ["children"], yes(0.2, 0.6, 0.6, 0.6))).story("passed")
    assert told == (
        "comes from children. It is yes for 60 in 100 where children is one or two, or above, or blank; "
        "for 20 in 100 where children is none."
    )
    told = model(children, engine.Category("passed", NO_YES, ["children"], yes(0.2, 0.2, 0.6, 0.2))).story("passed")
    assert "for 20 in 100 where children is one or two, or below, or blank" in told


def test_bands_next_to_each_other_are_told_as_one_band_and_a_blank_goes_with_either_side():
    told = model(HOURS, engine.Category("passed", NO_YES, ["hours"], yes(0.2, 0.6, 0.6, 0.21))).story("passed")
    assert told == (
        "comes from hours. It is yes for 60 in 100 where hours is 5 and over; "
        "for 20 in 100 where hours is under 5 or blank."
    )
    told = model(HOURS, engine.Category("passed", NO_YES, ["hours"], yes(0.2, 0.2, 0.6, 0.61))).story("passed")
    assert told == (
        "comes from hours. It is yes for 60 in 100 where hours is 10 and over or blank; "
        "for 20 in 100 where hours is under 10."
    )


def test_a_number_in_bands_is_told_by_a_threshold_that_leaves_the_blank_out():
    table = [[0.1, 0.1, 0.6, 0.2], [0.5, 0.2, 0.1, 0.2], [0.5, 0.2, 0.1, 0.2]]
    node = engine.Category("hours", HOURS.levels, ["shift"], table, kind="number", cuts=(5.0, 10.0), has_blank=True)
    assert model(SHIFT, node).story("hours") == (
        "comes from shift. It is 5 and over for 70 in 100 where shift is days; "
        "for 30 in 100 where shift is nights or mixed."
    )


def test_of_many_levels_the_short_way_is_said():
    six = engine.Category("site", ["a", "b", "c", "d", "e", "f"], [], [0.2, 0.2, 0.2, 0.2, 0.1, 0.1])
    told = model(six, engine.Category("passed", NO_YES, ["site"], yes(0.6, 0.2, 0.2, 0.2, 0.2, 0.2))).story("passed")
    assert told == (
        "comes from site. It is yes for 60 in 100 where site is a; for 20 in 100 where site is anything but a."
    )
    eight = engine.Category("site", list("abcdefgh"), [], [0.125] * 8)
    told = model(eight, engine.Category("passed", NO_YES, ["site"], yes(*[0.6] * 4, *[0.2] * 4))).story("passed")
    assert told == (
        "comes from site. It is yes for 60 in 100 where site is a, b or one of 2 others; "
        "for 20 in 100 where site is e, f or one of 2 others."
    )


def test_of_a_category_the_level_that_differs_most_is_told():
    table = [[0.5, 0.3, 0.2], [0.55, 0.1, 0.35], [0.55, 0.1, 0.35]]
    told = model(SHIFT, engine.Category("colour", ["red", "green", "blue"], ["shift"], table)).story("colour")
    assert told == (
        "comes from shift. It is green for 30 in 100 where shift is days; for 10 in 100 where shift is nights or mixed."
    )


def test_of_two_levels_that_are_no_yes_and_no_the_commoner_is_told():
    told = model(SHIFT, engine.Category("turned up", ["some", "most"], ["shift"], yes(0.9, 0.6, 0.6))).story(
        "turned up"
    )
    assert told.startswith("comes from shift. It is most for 90 in 100 where shift is days;")


def test_an_outcome_is_told_by_its_better_levels():
    table = [[0.5, 0.3, 0.2], [0.7, 0.1, 0.2], [0.7, 0.1, 0.2]]
    child = engine.Category("colour", ["red", "green", "blue"], ["shift"], table)
    told = model(SHIFT, child, outcomes={"colour": ("green", "blue")}).story("colour")
    assert told == (
        "comes from shift. It is green or blue for 50 in 100 where shift is days; "
        "for 30 in 100 where shift is nights or mixed."
    )


def test_a_column_without_parents_is_told_by_its_levels():
    child = engine.Category("passed", NO_YES, ["shift"], yes(0.7, 0.3, 0.3))
    assert model(SHIFT, child).story("shift") == (
        "comes from no other column. It is days for 50 in 100, nights for 30 in 100 and mixed for 20 in 100."
    )
    assert model(SCHOOL).story("school") == (
        "stands alone: no link of this model touches it. "
        "It is primary for 30 in 100, lower for 40 in 100 and upper for 30 in 100."
    )
    many = engine.Category("site", list("abcdefgh"), [], [0.05, 0.25, 0.1, 0.2, 0.2, 0.1, 0.06, 0.04])
    assert (
        model(many)
        .story("site")
        .endswith(
            "It is b for 25 in 100, d for 20 in 100, e for 20 in 100, c for 10 in 100, f for 10 in 100 "
            "and one of 3 other levels, none commoner, for 15 in 100."
        )
    )
    even = engine.Category("site", list("abcde"), [], [0.25, 0.22, 0.2, 0.17, 0.16])
    assert "d for 17 in 100 and e for 16 in 100." in model(even).story("site")
    assert model(engine.Category("passed", NO_YES, [], [0.4, 0.6])).story("passed").endswith("It is yes for 60 in 100.")


def test_what_nobody_settled_goes_with_and_is_no_source():
    child = engine.Category("passed", NO_YES, ["shift", "school"], yes([0.7] * 3, [0.3] * 3, [0.3] * 3))
    late = engine.Category("work", NO_YES, ["passed"], yes(0.3, 0.6))
    loose = model(SHIFT, SCHOOL, child, late, unsettled=[("school", "passed"), ("passed", "work")])
    assert loose.story("passed").startswith("comes from shift; goes with school and work. It is yes for 70 in 100")
    assert loose.story("work").startswith("goes with passed. It is yes for 60 in 100 where passed is yes;")
    assert loose.story("school").startswith("goes with passed. It is primary for 30 in 100,")


@pytest.mark.parametrize(
    ("share", "words"),
    [
        (0.0, "none"),
        (0.004, "under 1 in 100"),
        (0.01, "1 in 100"),
        (0.125, "13 in 100"),
        (0.285, "29 in 100"),
        (0.99, "99 in 100"),
        (0.999, "over 99 in 100"),
        (1.0, "all"),
    ],
)
def test_shares_are_told_in_a_hundred_and_nearly_none_is_not_none(share, words):
    assert in_hundred(share) == words


def test_rare_configurations_make_no_part_of_their_own_and_widen_no_range():
    rare = engine.Category("site", ["a", "b"], [], [0.995, 0.005])
    told = model(rare, engine.Category("passed", NO_YES, ["site"], yes(0.5, 0.99))).story("passed")
    assert told == "comes from site. It is yes for about 50 in 100, whatever site is."


def test_an_unknown_column_is_refused():
    with pytest.raises(engine.Refusal, match="no column “rain”"):
        model(SHIFT).story("rain")


@settings(max_examples=60, deadline=None)
@given(networks(most=5))
def test_parts_are_few_hold_every_configuration_once_and_have_its_mean_share(net):
    every = cases(net)
    for node in net.nodes:
        if not node.parents:
            continue
        parents = [net.node(parent) for parent in node.parents]
        weights = np.zeros([len(parent.levels) for parent in parents])
        for place in np.ndindex(weights.shape):
            pins = {parent.name: {parent.levels[at]} for parent, at in zip(parents, place, strict=True)}
            weights[place] = total(every, pins)
        shares = np.asarray(node.table)[..., 0]
        found = parts(parents, shares, weights)
        assert 1 <= len(found) <= MOST
        covered = np.zeros(weights.shape, dtype=int)
        for part in found:
            here = np.ix_(*part.held)
            covered[here] += 1
            assert part.weight == pytest.approx(weights[here].sum())
            if part.weight > 0:
                assert part.share == pytest.approx((weights[here] * shares[here]).sum() / weights[here].sum())
            assert part.high - part.low <= np.ptp(shares[here]) + 1e-12
        assert (covered == 1).all()


@settings(max_examples=60, deadline=None)
@given(networks(most=5))
def test_stories_repeat_give_no_formula_and_claim_no_cause(net):
    found = engine.Model(net)
    for name in net.names:
        told = found.story(name)
        assert told == engine.Model(net).story(name)
        assert not any(word in told for word in ("cause", "probab", "=", "%", "posterior", "conditional"))
        assert told.endswith(".")
        assert told.count(" where ") <= MOST


def test_a_range_is_only_told_of_what_differs_by_more_than_ten_points():
    for apart, told in ((APART - 0.001, False), (APART + 0.001, True)):
        five = engine.Category("site", list("abcde"), [], [0.2] * 5)
        table = yes(0.1, 0.3, 0.5, 0.7, 0.7 + apart)
        assert ("depending on" in model(five, engine.Category("y", NO_YES, ["site"], table)).story("y")) is told


def test_parts_of_a_sentence_know_names_and_figures_from_words():
    found = model(SHIFT, engine.Category("passed", NO_YES, ["shift"], yes(0.7, 0.3, 0.3))).account("passed")
    every = [*found.touches, *found.rules.lead, *(part for clause in found.rules.clauses for part in clause)]
    names = [part.text for part in every if part.style == "name"]
    figures = [part.text for part in every if part.style == "figure"]
    assert names == ["shift", "yes", "shift", "days", "shift", "nights", "mixed"]
    assert figures == ["70 in 100", "30 in 100"]


def test_better_levels_are_told_whatever_the_kind():
    network = engine.Model.from_network([SCHOOL]).network
    assert rules(network, "school", np.ones(()), [0]).text == "It is primary for 30 in 100."
