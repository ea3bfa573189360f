"""Each caution fires in a world made for it, and not in that world's clean twin."""

from dataclasses import replace

import pytest

import engine
from engine.doubting import STANDING, UNSEEN
from engine.doubting.counted import wilson
from tests.doubting.worlds import codes_of, only, repeated, world

STAGES = [("Before", ["shift"]), ("Offer", ["mentor"]), ("After", ["passed"])]
LINKS = [("shift", "mentor"), ("shift", "passed"), ("mentor", "passed")]


def school(nights_with_mentor, days_with_mentor=100, nights=200):
    """Learners on days and nights; half of any group passes."""
    groups = []
    for shift, total, offered in (("days", 300, days_with_mentor), ("nights", nights, nights_with_mentor)):
        for mentor, count in (("yes", offered), ("no", total - offered)):
            half = count // 2
            groups.append((half, {"shift": shift, "mentor": mentor, "passed": "yes"}))
            groups.append((count - half, {"shift": shift, "mentor": mentor, "passed": "no"}))
    return world(repeated(*groups), LINKS, STAGES, {"passed": "yes"}, ["mentor"])


def offer(model, pins=None, **rest):
    return model.ask(pins, {"mentor": engine.Fix("yes", **rest)}, draws=50)


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


def pairs(rare):
    """Records of which `rare` have both a = x and b = x."""
    groups = [(rare, ("x", "x")), (200, ("x", "y")), (200, ("y", "x")), (200, ("y", "y"))]
    rows = repeated(*[(times, {"a": a, "b": b, "out": out}) for n, (a, b) in groups for times, out in halves(n)])
    links = [("a", "out"), ("b", "out"), ("a", "b")]
    return world(rows, links, [("A", ["a"]), ("B", ["b"]), ("C", ["out"])], {"out": "yes"})


def halves(times):
    return [(times // 2, "yes"), (times - times // 2, "no")]


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


def settling(links, stages=None):
    """Columns x, m, y, z with dependence along `links`, whose directions only `stages` may settle."""
    rows = repeated(
        *[
            (20 + 10 * (x == m) + 10 * (m == y) + 10 * (x == z), {"x": x, "m": m, "y": y, "z": z})
            for x in "ab"
            for m in "ab"
            for y in "ab"
            for z in "ab"
        ]
    )
    return world(rows, links, stages or [("All", ["x", "m", "y", "z"])], {"y": "a"})


def test_a_direction_nobody_settled_weakens_when_it_touches_the_lever():
    caution = only(settling([("x", "m"), ("m", "y")]).ask(levers={"x": engine.Fix("a")}), "direction")
    assert caution.rank == "weakens" and caution.figure == "2 links"
    assert "x goes with m and m goes with y" in caution.text
    assert caution.figures == {"links": 2, "at the lever": 1}


def test_a_direction_nobody_settled_away_from_the_lever_is_worth_knowing():
    stages = [("First", ["x", "z"]), ("Then", ["m", "y"])]
    caution = only(
        settling([("x", "m"), ("x", "y"), ("m", "y")], stages).ask(levers={"x": engine.Fix("a")}), "direction"
    )
    assert caution.rank == "know" and caution.figure == "1 link" and caution.columns == ("m", "y")


def test_a_direction_off_every_path_is_not_told():
    stages = [("First", ["x", "z"]), ("Then", ["m"]), ("Last", ["y"])]
    model = settling([("x", "z"), ("x", "m"), ("m", "y")], stages)
    assert codes_of(model.ask(levers={"x": engine.Fix("a")})) == []


def test_a_direction_is_not_told_of_a_column_that_no_lever_could_move():
    stages = [("Early", ["y"]), ("Late", ["x", "m", "z"])]
    model = settling([("y", "x"), ("y", "m"), ("x", "m")], stages)
    assert "direction" not in [code for _, code in codes_of(model.ask(levers={"x": engine.Fix("a")}, watch=["y"]))]
    twin = settling([("y", "x"), ("y", "m"), ("x", "m")])
    assert "direction" in [code for _, code in codes_of(twin.ask(levers={"x": engine.Fix("a")}, watch=["y"]))]


def test_a_direction_with_little_support_is_told_although_no_equivalent_model_turns_it():
    # x -> m <- z with m -> y: the meeting of two arrows settles every direction, as far as the graph goes.
    model = settling([("x", "m"), ("z", "m"), ("m", "y")])
    lever = {"x": engine.Fix("a")}
    assert "direction" not in [code for _, code in codes_of(model.ask(levers=lever))]
    doubtful = replace(model, unsettled=frozenset([("x", "m")]))
    assert only(doubtful.ask(levers=lever), "direction").columns == ("x", "m")


def test_an_order_that_settles_every_direction_leaves_nothing_to_tell():
    stages = [("1", ["z"]), ("2", ["x"]), ("3", ["m"]), ("4", ["y"])]
    model = settling([("x", "m"), ("m", "y")], stages)
    assert codes_of(model.ask(levers={"x": engine.Fix("a")})) == []


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
    assert [model.network.node("out").levels[place] for place in model._better("out")] == [level]


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


def test_wilson_at_ninety_per_cent():
    # Wilson 1927: the ends are where the normal test of a share just fails.
    for held, rows in ((0, 10), (7, 10), (40, 100), (100, 100)):
        for end in wilson(held, rows):
            if 0.0 < end < 1.0:
                assert abs(held / rows - end) == pytest.approx(1.6448536 * (end * (1.0 - end) / rows) ** 0.5, rel=1e-6)


def test_cautions_come_in_the_order_of_their_ranks_each_with_something_to_do():
    model = settling([("x", "m"), ("m", "y")])
    answers = [
        offer(school(nights_with_mentor=0), {"shift": "nights"}),
        offer(school(nights_with_mentor=9, nights=18), {"shift": "nights"}),
        model.ask({"z": "a"}, {"x": engine.Fix("a")}),
    ]
    for answer in answers:
        ranks = [("blocks", "weakens", "know").index(caution.rank) for caution in answer.cautions]
        assert ranks == sorted(ranks) and ranks
        for caution in answer.cautions:
            assert caution.figure and caution.do.endswith(".") and caution.text.rstrip().endswith(".")
            assert caution.text[0].islower() and caution.columns


def test_the_same_question_has_the_same_cautions():
    model = settling([("x", "m"), ("m", "y")])
    first, second = (model.ask({"z": "a"}, {"x": engine.Fix("a")}) for _ in range(2))
    assert first.cautions == second.cautions and first.cautions


def test_a_network_given_as_it_is_has_no_records_to_doubt():
    model = engine.Model.from_network([engine.Category("a", ["x", "y"], [], [0.5, 0.5])])
    answer = model.ask({"a": "x"})
    assert answer.cautions == () and answer.checks_made == 0 and answer.matching is None


def test_the_standing_words_say_what_an_estimate_cannot_replace():
    assert STANDING.startswith("An estimate from records.") and "does not replace a trial" in STANDING
    assert UNSEEN == "They cannot see what was not recorded."


def hidden_beside(nights_with_mentor, outcome=None):
    """A school where five learners on early shifts hide how many there are on nights."""
    model = school(nights_with_mentor)
    groups = [(5, {"shift": "early", "mentor": "no", "passed": "no"})]
    for row in zip(*(model.coded.codes[:, place] for place in range(3)), strict=True):
        levels = (model.coded.levels[place][code] for place, code in enumerate(row))
        groups.append((1, dict(zip(model.coded.names, levels, strict=True))))
    return world(repeated(*groups), LINKS, STAGES, outcome or {"passed": "yes"}, ["mentor"])


@pytest.mark.parametrize(("with_mentor", "figure"), [(0, "all"), (8, "all"), (100, None)])
def test_cautions_of_a_group_whose_number_is_not_told_have_no_total(with_mentor, figure):
    answer = offer(hidden_beside(with_mentor), {"shift": "nights"})
    assert not answer.matching_told
    found = [caution.figure for caution in answer.cautions if caution.code == "overlap"]
    assert found == ([] if figure is None else [figure])
    assert not any("200" in f"{caution.figure} {caution.text}" for caution in answer.cautions)


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


def test_few_records_whose_number_is_not_told_are_called_few():
    groups = [(5, {"a": "z", "out": "yes"}), (12, {"a": "x", "out": "yes"}), (300, {"a": "y", "out": "no"})]
    model = world(repeated(*groups), [("a", "out")], [("A", ["a"]), ("B", ["out"])])
    assert only(model.ask({"a": "x"}, watch=["out"]), "thin").figure == "under 30"
