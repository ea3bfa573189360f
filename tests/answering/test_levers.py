"""Every kind of lever against counting out every case of a network split in two, and what is refused."""

import math
from concurrent.futures import ThreadPoolExecutor

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

import engine
from engine.model import Model
from tests import plainly
from tests.answering.generated import lever_questions, levers, networks, pins

EXACT = dict(rtol=0.0, atol=1e-10)
WORLDS = ("recorded", "among", "set", "against")


def asked(question, **more):
    """The answer to a generated question, all columns watched; questions that are refused are not looked at."""
    net, pinned, levers, against, after = question
    try:
        return Model(net).ask(pinned, levers, net.names, against=against, pins_after=after, draws=20, seed=7, **more)
    except engine.Refusal as refusal:
        assume("circle" not in refusal.message)
        assume("No record" not in refusal.message)
        raise


@settings(max_examples=60, deadline=None)
@given(lever_questions())
def test_every_kind_of_lever_agrees_with_counting_out_two_worlds(question):
    net, pinned, levers, against, after = question
    answer = asked(question)
    tables = net.draws(20, seed=7)
    for draw in range(3) if net.drawable else range(1):
        natural = plainly.cases(net, draw=draw, tables=tables)
        split = plainly.cases(net, levers, draw=draw, tables=tables)
        other = None if against is None else plainly.cases(net, against, draw=draw, tables=tables)
        for column in net.names:
            reading = answer[column]
            np.testing.assert_allclose(at(reading.among, draw), plainly.shares(net, natural, pinned, column), **EXACT)
            np.testing.assert_allclose(
                at(reading.set, draw), plainly.shares(net, split, pinned, column, after), **EXACT
            )
            if other is not None:
                expected = plainly.shares(net, other, pinned, column, after)
                np.testing.assert_allclose(at(reading.against, draw), expected, **EXACT)
    assert answer.log_evidence == pytest.approx(math.log(plainly.total(plainly.cases(net), pinned)), abs=1e-9)


def at(marginal, draw):
    return marginal.point if draw == 0 else marginal.draws[:, draw - 1]


@settings(max_examples=60, deadline=None)
@given(lever_questions(most=4), st.data())
def test_the_joint_of_a_few_columns_agrees_with_counting_out_every_world(question, data):
    net, pinned, levers, against, after = question
    answer = asked(question)
    columns = data.draw(st.lists(st.sampled_from(net.names), min_size=1, max_size=3, unique=True))
    found = answer.joint(columns)
    worlds = {"recorded": ({}, None, {}), "among": (pinned, None, {}), "set": (pinned, levers, after)}
    if against is not None:
        worlds["against"] = (pinned, against, after)
    assert list(found) == list(worlds)
    for world, (before, set_to, shown) in worlds.items():
        expected = plainly.joint(net, plainly.cases(net, set_to), before, columns, shown)
        np.testing.assert_allclose(found[world]["share"], expected.ravel(), **EXACT)
        assert list(found[world].index.names) == columns
        if len(columns) == 1:
            np.testing.assert_allclose(found[world]["share"], getattr(answer[columns[0]], world).point, **EXACT)
            ends = [getattr(answer[columns[0]], world).interval(level) for level in net.node(columns[0]).levels]
            np.testing.assert_allclose(found[world][["low", "high"]], ends, **EXACT)


@settings(max_examples=60, deadline=None)
@given(lever_questions())
def test_the_change_is_set_minus_against_or_minus_among_and_none_with_pins_after(question):
    net, _, _, against, after = question
    answer = asked(question)
    column = net.names[-1]
    level = net.node(column).levels[0]
    if after:
        with pytest.raises(engine.Refusal, match="no change to tell"):
            answer.change(column, level)
        return
    reading = answer[column]
    before = reading.among if against is None else reading.against
    change, low, high = answer.change(column, level)
    assert change == reading.set.share(level) - before.share(level)
    draws = reading.set.share_draws(level) - before.share_draws(level)
    ends = (change, change) if draws.size == 0 else tuple(np.quantile(draws, [0.05, 0.95]))
    assert (low, high) == pytest.approx(ends, abs=1e-12)


@settings(max_examples=60, deadline=None)
@given(networks(), st.data())
def test_a_fix_to_the_pinned_value_changes_nothing(net, data):
    column = data.draw(st.sampled_from(net.names))
    level = data.draw(st.sampled_from(net.node(column).levels))
    pinned = {column: level}
    assume(plainly.total(plainly.cases(net), {column: {level}}) > 0.0)
    answer = Model(net).ask(pinned, {column: engine.Fix(level)}, net.names, draws=20)
    for name in net.names:
        np.testing.assert_allclose(answer[name].set.point, answer[name].among.point, **EXACT)
        np.testing.assert_allclose(answer[name].set.draws, answer[name].among.draws, **EXACT)


@settings(max_examples=60, deadline=None)
@given(networks(), st.data())
def test_a_fix_on_a_column_without_parents_equals_pinning_it(net, data):
    column = data.draw(st.sampled_from([node.name for node in net.nodes if not node.parents]))
    level = data.draw(st.sampled_from(net.node(column).levels))
    assume(plainly.total(plainly.cases(net), {column: {level}}) > 0.0)
    answer = Model(net).ask({}, {column: engine.Fix(level)}, net.names, draws=20)
    for name in net.names:
        np.testing.assert_allclose(answer[name].set.point, answer[name].had.point, **EXACT)


@settings(max_examples=60, deadline=None)
@given(networks(), st.data())
def test_reach_0_changes_nothing_to_the_last_digit(net, data):
    columns = data.draw(st.lists(st.sampled_from(net.names), min_size=1, max_size=2, unique=True))
    given_levers = data.draw(levers(net, columns))
    idle = {name: _with_reach(lever, 0.0) for name, lever in given_levers.items()}
    try:
        answer = Model(net).ask({}, idle, net.names, draws=20)
    except engine.Refusal as refusal:
        assert "circle" in refusal.message
        return
    for name in net.names:
        np.testing.assert_array_equal(answer[name].set.point, answer[name].among.point)


def _with_reach(lever, reach):
    return type(lever)(**{**vars(lever), "reach": reach})


@settings(max_examples=40, deadline=None)
@given(lever_questions(), st.data())
def test_sampling_agrees_with_summing_within_its_own_error(question, data):
    answer, sampled = asked(question), None
    try:
        sampled = asked(question, exact=False)
    except engine.Refusal as refusal:
        assume("Of the records drawn" not in refusal.message)
        raise
    assert sampled.method.startswith("sampled") and answer.method.startswith("exact") and answer.mc_error == 0.0
    for column in question[0].names:
        for world in WORLDS:
            exact, other = getattr(answer[column], world), getattr(sampled[column], world)
            if exact is not None:
                bound = 6.0 * sampled.mc_error + 1e-9
                np.testing.assert_allclose(other.point, exact.point, rtol=0.0, atol=bound)


def test_one_model_asked_by_many_threads_gives_the_same_digits():
    net = networks_of_one(11)
    model = Model(net)
    first, last = net.names[0], net.names[-1]
    questions = [
        {"levers": {first: engine.Mix({"a": share, "b": 1.0 - share})}, "watch": [last], "exact": exact}
        for share in (0.25, 0.5, 0.75)
        for exact in (None, False)
    ]
    alone = [Model(net).ask(**question, draws=20)[last].set.draws for question in questions]
    with ThreadPoolExecutor(8) as pool:
        together = list(pool.map(lambda question: model.ask(**question, draws=20)[last].set.draws, questions * 4))
    for place, found in enumerate(together):
        np.testing.assert_array_equal(found, alone[place % len(questions)])


def networks_of_one(seed):
    """Five columns in a chain with uncertain tables."""
    rng = np.random.default_rng(seed)
    nodes = []
    for place in range(5):
        dirichlet = rng.gamma(1.0, 5.0, (2,) * (1 + (place > 0))) + 0.5
        table = dirichlet / dirichlet.sum(axis=-1, keepdims=True)
        nodes.append(engine.Category(f"c{place}", ["a", "b"], [f"c{place - 1}"] if place else [], table, dirichlet))
    return engine.Model.from_network(nodes).network


@pytest.fixture(scope="module")
def programme():
    """region and need before the offer; the offer and later steps after."""
    no_yes = ["no", "yes"]
    return engine.Model.from_network(
        [
            engine.Category("region", ["north", "south"], [], [0.6, 0.4]),
            engine.Category("need", no_yes, ["region"], [[0.7, 0.3], [0.5, 0.5]]),
            engine.Category("offer", no_yes, ["need"], [[0.8, 0.2], [0.3, 0.7]]),
            engine.Category("comes", no_yes, ["offer"], [[0.9, 0.1], [0.4, 0.6]]),
            engine.Category(
                "passed", no_yes, ["comes", "region"], [[[0.6, 0.4], [0.7, 0.3]], [[0.2, 0.8], [0.3, 0.7]]]
            ),
        ]
    )


def refused(message, do, ask):
    with pytest.raises(engine.Refusal, match=message) as refusal:
        ask()
    assert do in (refusal.value.do or ""), refusal.value.do
    return refusal.value


def test_a_rule_reads_what_its_column_was_set_to(programme):
    levers = {"region": engine.Fix("south"), "offer": engine.Rule("region", {"south": "yes"})}
    answer = programme.ask({}, levers, ["offer", "comes"])
    assert answer["offer"].set.share("yes") == 1.0
    assert answer["comes"].set.share("yes") == pytest.approx(0.6)


def test_levels_that_a_rule_does_not_name_keep_their_natural_value(programme):
    answer = programme.ask({"region": "north"}, {"offer": engine.Rule("region", {"south": "yes"})}, ["offer"])
    assert answer["offer"].set.share("yes") == pytest.approx(answer["offer"].among.share("yes"), abs=1e-12)


def test_had_is_for_fixed_values_only(programme):
    mixed = programme.ask({}, {"offer": engine.Mix({"yes": 1.0})}, ["comes"])
    assert mixed["comes"].had is None and mixed["comes"].set.share("yes") == pytest.approx(0.6)
    assert programme.ask({}, {"offer": engine.Fix("yes")}, ["comes"])["comes"].had is not None


def test_those_who_would_show_it_after_the_lever(programme):
    answer = programme.ask({}, {"offer": engine.Fix("yes")}, ["passed", "comes"], pins_after={"comes": "yes"})
    assert answer.pinned_after == ("comes",)
    assert answer["comes"].set.share("yes") == 1.0
    assert answer["passed"].set.share("yes") == pytest.approx(0.6 * 0.8 + 0.4 * 0.7)
    assert answer["comes"].among.shares == answer["comes"].recorded.shares
    own = programme.ask({}, {"offer": engine.Fix("yes", 0.5)}, ["need"], pins_after={"offer": "no"})
    keeps = 0.62 * 0.8 * 0.5, 0.38 * 0.3 * 0.5  # need no, yes: those not reached who had no offer
    assert own["need"].set.share("yes") == pytest.approx(keeps[1] / sum(keeps))


def test_pins_after_that_cannot_be_are_refused_by_name(programme):
    refusal = refused(
        "can have “offer” = “no” after the lever",
        "Take this pin out",
        lambda: programme.ask({}, {"offer": engine.Fix("yes")}, ["passed"], pins_after={"offer": "no", "comes": "yes"}),
    )
    assert refusal.where == "offer"


def test_levers_that_are_none_are_refused_with_what_to_do(programme):
    def ask(lever, **more):
        return lambda: programme.ask(levers={"offer": lever}, watch=["passed"], **more)

    refused("mix of “offer” sums to 0.9 instead of 1", "nothing is rescaled", ask(engine.Mix({"no": 0.2, "yes": 0.7})))
    refused("share of “no” in the mix of “offer” is -0.2", "sum to 1", ask(engine.Mix({"no": -0.2, "yes": 1.2})))
    refused("share of “no” in the mix of “offer” is nan", "sum to 1", ask(engine.Mix({"no": math.nan, "yes": 1.0})))
    refused("“offer” has no level “yess”", "Did you mean “yes”", ask(engine.Mix({"no": 0.2, "yess": 0.8})))
    refused("names no shares", "engine.Mix", ask(engine.Mix({})))
    refused("names no shares", "engine.Mix", ask(engine.Mix([0.2, 0.8])))
    refused("category, so nothing can be added", "no, yes", ask(engine.Shift(1.0)))
    refused("“offer” is ruled by “comes”, which follows", "comes before", ask(engine.Rule("comes", {"yes": "yes"})))
    refused("“offer” is ruled by itself", "comes before", ask(engine.Rule("offer", {"yes": "yes"})))
    refused("no column “regoin”", "Did you mean “region”", ask(engine.Rule("regoin", {"north": "yes"})))
    refused("“region” has no level “nroth”", "Did you mean “north”", ask(engine.Rule("region", {"nroth": "yes"})))
    refused("“offer” has no level “maybe”", "no, yes", ask(engine.Rule("region", {"north": "maybe"})))
    refused("names no level of “region”", "north, south", ask(engine.Rule("region", {})))
    refused("“3” is none", "north, south", ask(engine.Rule("region", {3: "yes"})))
    refused("reach of “offer” is 1.5", "from 0 to 1", ask(engine.Mix({"yes": 1.0}, 1.5)))
    refused("reach of “offer” is -0.5", "from 0 to 1", ask(engine.Rule("region", {"north": "yes"}, -0.5)))
    refused("no lever", "engine.Fix", ask("yes"))


def test_rules_in_a_circle_are_refused():
    no_yes = ["no", "yes"]
    model = engine.Model.from_network([engine.Category(name, no_yes, [], [0.5, 0.5]) for name in "abc"])
    rules = {
        "a": engine.Rule("b", {"yes": "yes"}),
        "b": engine.Rule("c", {"yes": "yes"}),
        "c": engine.Rule("a", {"yes": "yes"}),
    }
    refused("rules run in a circle: “a”, “b”, “c” and back to “a”", "Take out", lambda: model.ask({}, rules, ["a"]))
    two = {"a": rules["a"], "b": rules["b"]}
    assert model.ask({}, {**two, "c": engine.Fix("yes")}, ["a"])["a"].set.share("yes") == 1.0


def test_a_circle_of_rules_and_links_is_refused(programme):
    levers = {"region": engine.Rule("other", {"yes": "north"}), "other": engine.Rule("passed", {"yes": "yes"})}
    other = engine.Category("other", ["no", "yes"], [], [0.5, 0.5])
    model = engine.Model.from_network([*programme.network.nodes, other])
    refused("circle", "Take out", lambda: model.ask({}, levers, ["passed"]))


def test_pins_around_levers_are_refused_with_both_ways_out(programme):
    fix, fixed = {"offer": engine.Fix("yes")}, engine.Fix("south")
    refused("“comes” follows “offer”", "pins_after", lambda: programme.ask({"comes": "yes"}, fix, ["passed"]))
    refused(
        "“need” follows “region”",
        "Take out the pin",
        lambda: programme.ask({"need": "yes"}, {"need": engine.Fix("no")}, ["passed"], against={"region": fixed}),
    )
    refused(
        "No lever moves “need”", "pins instead", lambda: programme.ask({}, fix, ["need"], pins_after={"need": "no"})
    )
    refused("no lever for a pin to come after", "Set a lever", lambda: programme.ask(pins_after={"need": "no"}))
    refused("nothing to hold against", "Set a lever first", lambda: programme.ask(against=fix))
    refused(
        "levers against of a question are a dictionary", "engine.Fix", lambda: programme.ask({}, fix, against=["offer"])
    )
    refused("No column is named", "passed", lambda: programme.ask({}, fix, ["passed"]).joint([]))
    refused("“need” was not asked for", "passed", lambda: programme.ask({}, fix, ["passed"]).joint(["need"]))


def test_only_a_number_has_a_mean(programme):
    reading = programme.ask(watch=["passed"])["passed"].among
    for ask in (
        lambda: reading.mean,
        lambda: reading.sd,
        lambda: reading.quantile(0.5),
        lambda: reading.density([1.0]),
    ):
        refused("Only a number", "no, yes", ask)
    refused("Only a number", "no, yes", lambda: reading.interval(None))


@settings(max_examples=40, deadline=None)
@given(networks(certain=False), st.data())
def test_asking_again_gives_the_same_digits_whatever_was_asked_between(net, data):
    columns = data.draw(st.lists(st.sampled_from(net.names), min_size=1, max_size=2, unique=True))
    free = set(net.names) - net.descendants(columns)
    pinned, given_levers = data.draw(pins(net, free)), data.draw(levers(net, columns))
    model = Model(net)
    try:
        first = model.ask(pinned, given_levers, net.names, draws=20)
    except engine.Refusal as refusal:
        assert "circle" in refusal.message
        return
    model.ask({}, {}, net.names[:1], draws=20)
    model.ask({}, {columns[0]: engine.Fix(net.node(columns[0]).levels[0])}, net.names[-1:], draws=20)
    again = model.ask(pinned, given_levers, net.names, draws=20)
    for name in net.names:
        for world in ("recorded", "among", "set"):
            np.testing.assert_array_equal(getattr(first[name], world).draws, getattr(again[name], world).draws)
