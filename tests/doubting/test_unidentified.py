"""Answers beside unrecorded causes: read from what is seen where they follow, blocked with bounds where not."""

import numpy as np
import pytest

import engine
from tests.doubting.tied import LEVELS, Tied
from tests.doubting.worlds import codes_of, only

YES_FIX = {"mentor": engine.Fix("yes")}
COLUMNS = ["age", "mentor", "attendance", "passed"]
LINKS = [
    ("age", "mentor"),
    ("age", "attendance"),
    ("age", "passed"),
    ("mentor", "attendance"),
    ("attendance", "passed"),
]


def school(direct, seed=0, more=(), links=LINKS, order=None):
    """(the model of what is seen, the truth with the unrecorded cause in it, its entries).

    An unrecorded cause drives mentor and passed; passed has mentor in its table to hold what is seen.
    """
    model = Tied(COLUMNS, links, [("mentor", "passed")])
    entries = model.some(np.random.default_rng(seed))
    fitted = model.fitted(entries)
    seen = [*links, ("mentor", "passed")]
    nodes = []
    for name in COLUMNS:
        node = fitted.node(name)
        parents = [column for column in COLUMNS if (column, name) in seen]
        spared = tuple(slice(None) if column in parents else 0 for column in node.parents)
        nodes.append(engine.Category(name, LEVELS, parents, node.table[spared]))
    stated = [engine.Unrecorded("mentor", "passed", direct=direct), *more]
    return engine.Model.from_network(nodes, unrecorded=stated, order=order), model, entries


@pytest.mark.parametrize("seed", range(3))
def test_the_front_door_gives_the_effect_that_the_links_alone_would_not(seed):
    model, truth, entries = school(direct=False, seed=seed)
    answer = model.ask({"age": "no"}, YES_FIX, ["passed"], against={"mentor": engine.Fix("no", reach=0.5)})
    cells = [truth.cells(entries, {"mentor": level})[0, ..., 0] for level in (0, 1)]
    would = [each[..., 1].sum() / each.sum() for each in cells]
    natural = truth.cells(entries)[0, ..., 0]
    assert answer["passed"].set.shares["yes"] == pytest.approx(would[1], abs=1e-9)
    halfway = 0.5 * would[0] + 0.5 * natural[..., 1].sum() / natural.sum()
    assert answer["passed"].against.shares["yes"] == pytest.approx(halfway, abs=1e-9)
    plain = engine.Model.from_network(model.network.nodes).ask({"age": "no"}, YES_FIX, ["passed"])
    assert abs(plain["passed"].set.shares["yes"] - would[1]) > 1e-4
    assert plain["passed"].among.shares == answer["passed"].among.shares


def test_it_is_told_how_the_answer_is_read():
    model, _, _ = school(direct=False)
    answer = model.ask({}, YES_FIX, ["passed"])
    told = only(answer, "unrecorded")
    assert (told.rank, told.figure) == ("know", "1 unrecorded cause") and not answer.blocked
    assert "is read for passed through attendance, weighing each level of it" in told.text
    assert told.columns == ("mentor", "passed", "attendance") and told.do


def test_a_link_beside_its_cause_blocks_and_gives_bounds():
    model, _, _ = school(direct=True)
    answer = model.ask({}, YES_FIX, ["passed"])
    blocks = only(answer, "unidentified")
    assert answer.blocked and blocks.rank == "blocks" and blocks.columns == ("mentor", "passed")
    both = answer.joints(("mentor", "passed"))["among"][0][..., 0]
    commonest = int(np.argmax(both.sum(axis=0)))
    expected = both[1, commonest], both[1, commonest] + both[0].sum()
    assert (blocks.figures["low"], blocks.figures["high"]) == pytest.approx(expected, abs=1e-12)
    assert "mentor and passed" in blocks.text and "With no assumption at all" in blocks.text
    assert "Record what drives both mentor and passed" in blocks.do and "by lot" in blocks.do


def test_every_model_alike_in_what_is_seen_lies_within_the_bounds():
    _, truth, entries = school(direct=False, seed=4)
    blocked, _, _ = school(direct=True, seed=4)
    figures = only(blocked.ask({}, YES_FIX, ["passed"]), "unidentified").figures
    would = truth.answer(entries, "passed", {"mentor": 1})[0]
    level = max(blocked.ask()["passed"].recorded.shares.items(), key=lambda item: item[1])[0]
    assert figures["low"] < (would if level == "yes" else 1.0 - would) < figures["high"]


def test_a_mix_with_reach_has_narrower_bounds_the_fewer_it_reaches():
    model, _, _ = school(direct=True)
    widths = []
    for reach in (1.0, 0.5, 0.1):
        mix = {"mentor": engine.Mix({"no": 0.5, "yes": 0.5}, reach)}
        figures = only(model.ask({}, mix, ["passed"]), "unidentified").figures
        widths.append(figures["high"] - figures["low"])
    assert widths == pytest.approx([0.5, 0.25, 0.05], abs=1e-12)  # of any two levels, one half is not seen


@pytest.mark.parametrize(
    ("levers", "watch", "pins"),
    [({}, ["passed"], {"mentor": "yes"}), ({"attendance": engine.Fix("yes")}, ["mentor"], {}), (YES_FIX, ["age"], {})],
)
def test_what_no_lever_moves_raises_no_doubt_here(levers, watch, pins):
    model, _, _ = school(direct=True)
    answer = model.ask(pins, levers, watch)
    assert not {"unidentified", "unrecorded"} & {code for _, code in codes_of(answer)}
    if levers:
        assert answer[watch[0]].set.shares == pytest.approx(answer[watch[0]].among.shares, abs=1e-9)


def test_a_cause_that_bears_on_nothing_asked_is_not_told():
    links = [("age", "mentor"), ("mentor", "attendance")]
    model = Tied(COLUMNS, links, [])
    nodes = [*model.fitted(model.some(np.random.default_rng(0))).nodes]
    stated = engine.Model.from_network(nodes, unrecorded=[engine.Unrecorded("attendance", "passed")])
    plain = engine.Model.from_network(nodes)
    told, known = (each.ask({}, YES_FIX, ["attendance"]) for each in (stated, plain))
    assert codes_of(told) == codes_of(known) and told.checks_made == known.checks_made + 1
    assert told["attendance"].set.shares == pytest.approx(known["attendance"].set.shares, abs=1e-12)


def test_a_link_for_the_cause_alone_is_not_shown_as_one():
    model, _, _ = school(direct=False)
    assert ("mentor", "passed") in model.network.links and ("mentor", "passed") not in model.links


def test_joint_shares_follow_or_are_left_out():
    model, truth, entries = school(direct=False)
    joint = model.ask({}, YES_FIX, ["passed", "attendance"]).joint(["passed", "attendance"])
    cells = truth.cells(entries, {"mentor": 1})[..., 0].sum(axis=(0, 1))  # (attendance, passed)
    assert joint["set"]["share"].to_numpy() == pytest.approx(cells.T.ravel(), abs=1e-9)
    blocked, _, _ = school(direct=True)
    assert set(blocked.ask({}, YES_FIX, ["passed"]).joint(["passed"])) == {"recorded", "among"}


@pytest.mark.parametrize(
    ("more", "says"),
    [
        ([engine.Unrecorded("mentor", "weather")], "no such column"),
        ([engine.Unrecorded("passed", "age")], "follows from it"),
        ([engine.Unrecorded("age", "age")], "follows from it"),
    ],
)
def test_causes_that_do_not_fit_the_network_are_refused(more, says):
    with pytest.raises(engine.Refusal, match=says) as refused:
        school(direct=True, more=more)
    assert refused.value.where and refused.value.do


def test_numbers_beside_unrecorded_causes_are_refused():
    nodes = [
        engine.Number("age", intercept=40.0, bands=[30.0]),
        engine.Category("b", LEVELS, ["age"], [[0.5, 0.5]] * 2),
    ]
    with pytest.raises(engine.Refusal, match="taken as bands"):
        engine.Model.from_network(nodes, unrecorded=[engine.Unrecorded("age", "b")])


def test_an_order_states_causes_and_forbids_links_of_a_given_network():
    stages = [("Before", ["age"]), ("Programme", ["mentor", "attendance"]), ("After", ["passed"])]
    cause = [engine.Unrecorded("mentor", "passed", direct=False)]
    order = engine.Order(stages, unrecorded=cause, changeable=["mentor"], outcomes={"passed": "yes"})
    model, _, _ = school(direct=False, order=engine.Order(stages, changeable=["mentor"], outcomes={"passed": "yes"}))
    stated = engine.Model.from_network(model.network.nodes, order=order)
    assert only(stated.ask({}, YES_FIX), "unrecorded").columns == ("mentor", "passed", "attendance")
    with pytest.raises(engine.Refusal, match="“attendance” leads to “passed”, but you ruled it out"):
        engine.Model.from_network(model.network.nodes, order=engine.Order(stages, rule_out=[("attendance", "passed")]))
