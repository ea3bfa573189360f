"""Questions about numbers and categories together, against the slow truth of every way in which the levers take."""

import itertools
import math
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

import engine
from engine.answering.mixed import MixedWorld
from engine.model import Model
from engine.network.network import network
from engine.network.nodes import Category, Number
from tests.answering.mixed_generated import levels_of, mixed_nodes
from tests.answering.mixed_plainly import band_of, truth

GRID = (-2.0, -0.5, 0.3, 1.7)


def ways(lever):
    """[(chance, what is set)] of a lever: a value, an amount to add, a rule, or None for those it does not reach."""
    if isinstance(lever, engine.Mix):
        found = [(lever.reach * share, ("to", value)) for value, share in lever.shares.items()]
    elif isinstance(lever, engine.Fix):
        found = [(lever.reach, ("to", lever.value))]
    elif isinstance(lever, engine.Shift):
        found = [(lever.reach, ("by", lever.amount))]
    else:
        found = [(lever.reach, ("rule", lever))]
    return [(chance, way) for chance, way in [*found, (1.0 - lever.reach, None)] if chance > 0.0]


def split_by_hand(nodes, how):
    """The nodes, parents first, with a node "<column>*" for each of `how`, that its children follow."""
    by_name = {node.name: node for node in nodes}
    seen = {name: f"{name}*" if name in how else name for name in by_name}
    made = {}
    for node in nodes:
        made[node.name] = replace(node, parents=tuple(seen[parent] for parent in node.parents))
        if node.name in how:
            made[f"{node.name}*"] = copy_by_hand(node, how[node.name], by_name, seen)
        if node.name in how and how[node.name] is not None and how[node.name][0] == "rule":
            ruler = by_name[how[node.name][1].column]
            if isinstance(ruler, Number):
                made[f"{ruler.name} band for {node.name}"] = Category(
                    f"{ruler.name} band for {node.name}", ruler.levels, (seen[ruler.name],), np.eye(levels_of(ruler))
                )
    ordered = {}
    while len(ordered) < len(made):
        for name, node in made.items():
            if name not in ordered and all(parent in ordered for parent in node.parents):
                ordered[name] = node
    return tuple(ordered.values()), seen


def copy_by_hand(node, way, by_name, seen):
    name, zero = f"{node.name}*", np.zeros(())
    if isinstance(node, Number):
        if way is None or way[0] == "by":
            return Number(name, (node.name,), 0.0 if way is None else way[1], [1.0], 0.0, node.bands)
        if way[0] == "to":
            return Number(name, (), way[1], (), zero, node.bands)
        ruler = by_name[way[1].column]
        values = [way[1].values.get(level) for level in ruler.levels]
        axis = f"{ruler.name} band for {node.name}" if isinstance(ruler, Number) else seen[ruler.name]
        return Number(
            name,
            (axis, node.name),
            [0.0 if value is None else value for value in values],
            [[1.0 if value is None else 0.0] for value in values],
            [0.0] * len(values),
            node.bands,
        )
    stays = np.eye(len(node.levels))
    if way is None:
        return Category(name, node.levels, (node.name,), stays)
    if way[0] == "to":
        return Category(name, node.levels, (), stays[node.levels.index(way[1])])
    ruler = by_name[way[1].column]
    table = [
        stays if (to := way[1].values.get(level)) is None else np.tile(stays[node.levels.index(to)], (len(stays), 1))
        for level in ruler.levels
    ]
    return Category(name, node.levels, (seen[ruler.name], node.name), np.stack(table))


def slow(nodes, before, levers, after=None):
    """column -> (log evidence, shares, mean, sd, shares below GRID) of what it shows, from each way the levers take."""
    chosen = [[(column, *way) for way in ways(lever)] for column, lever in levers.items()]
    found = []
    for combination in itertools.product(*chosen):
        chance = math.prod(each[1] for each in combination)
        made, seen = split_by_hand(nodes, {name: way for name, _, way in combination})
        positions, values, ranges = (dict(part) for part in before)
        for target, part in zip((positions, values, ranges), after or ({}, {}, {}), strict=True):
            target.update({seen[name]: wanted for name, wanted in part.items()})
        one = truth(MixedWorld(made, positions, values, ranges, tuple(seen.values())))
        if one.log_evidence > -np.inf:
            found.append((math.log(chance) + one.log_evidence, one, seen))
    if not found:
        return None
    largest = max(log for log, _, _ in found)
    weights = np.array([math.exp(log - largest) for log, _, _ in found])
    log_evidence = largest + math.log(weights.sum())
    weights /= weights.sum()
    told = {}
    for node in nodes:
        each = [(one, seen[node.name]) for _, one, seen in found]
        shares = weights @ np.array([shares_of(*one, node) for one in each])
        told[node.name] = (log_evidence, shares, None, None, None)
        if isinstance(node, Number):
            means = np.array([one.mean(name) for one, name in each])
            squares = np.array([one.sd(name) ** 2 + one.mean(name) ** 2 for one, name in each])
            below = weights @ np.array([[one.below(name, x) for x in GRID] for one, name in each])
            sd = math.sqrt(max(weights @ squares - (weights @ means) ** 2, 0.0))
            told[node.name] = (log_evidence, shares, weights @ means, sd, below)
    return told


def shares_of(one, name, node):
    if isinstance(node, Category):
        return one.shares[name]
    return np.diff([0.0, *(one.below(name, cut) for cut in node.bands), 1.0])


@st.composite
def lever(draw, net, column):
    node = net.node(column)
    reach = draw(st.sampled_from([0.25, 0.8, 1.0, 1.0]))
    before = [name for name in net.names if name != column and name not in net.descendants([column])]
    kinds = ["fix", "mix", *(["shift"] if isinstance(node, Number) else []), *(["rule"] if before else [])]
    kind = draw(st.sampled_from(kinds))
    value = st.sampled_from([-1.5, 0.2, 2.1] if isinstance(node, Number) else node.levels)
    if kind == "fix":
        return engine.Fix(draw(value), reach)
    if kind == "shift":
        return engine.Shift(draw(st.sampled_from([-0.7, 0.5])), reach)
    if kind == "mix":
        several = draw(st.lists(value, min_size=1, max_size=2, unique=True))
        return engine.Mix({each: 1.0 / len(several) for each in several}, reach)
    ruler = net.node(draw(st.sampled_from(before)))
    named = draw(st.sets(st.sampled_from(ruler.levels), min_size=1))
    return engine.Rule(ruler.name, {level: draw(value) for level in sorted(named)}, reach)


@st.composite
def pins(draw, net, columns, most=2):
    found = {}
    for column in draw(st.lists(st.sampled_from(sorted(columns)), max_size=most, unique=True)) if columns else []:
        node = net.node(column)
        if isinstance(node, Category) or (node.bands and draw(st.booleans())):
            found[column] = draw(st.sets(st.sampled_from(node.levels), min_size=1))
        elif np.all(node.variance > 0.0) and draw(st.booleans()):
            found[column] = round(draw(st.floats(-2.0, 2.0)), 2)
        else:
            low = round(draw(st.floats(-2.0, 1.0)), 2) + 0.003
            found[column] = draw(st.sampled_from([(low, low + 1.5), (low, None), (None, low + 1.0)]))
    return found


def as_places(net, pinned):
    """(positions, values, ranges) of pins as they are given to `ask`."""
    positions, values, ranges = {}, {}, {}
    for column, wanted in pinned.items():
        if isinstance(wanted, set):
            positions[column] = frozenset(net.node(column).levels.index(level) for level in wanted)
        elif isinstance(wanted, tuple):
            ranges[column] = tuple(
                side * math.inf if end is None else end for side, end in zip((-1, 1), wanted, strict=True)
            )
        else:
            values[column] = wanted
    return positions, values, ranges


def acting_through_bands(nodes):
    """The nodes, where every number has a cut, and a category two rows of its table for one that had none."""
    bare = {node.name for node in nodes if isinstance(node, Number) and not node.bands}
    made = []
    for node in nodes:
        if isinstance(node, Number):
            made.append(replace(node, bands=node.bands or (0.1,)))
            continue
        table = node.table
        for axis, parent in enumerate(node.parents):
            if parent in bare:
                table = np.concatenate([table, table[..., ::-1]], axis=axis)
        made.append(replace(node, table=table))
    return made


@st.composite
def mixed_questions(draw, most=4, after=False):
    net = network(acting_through_bands(draw(mixed_nodes(most, exact_numbers=False))))
    assume(net.numbers)
    chosen = draw(st.lists(st.sampled_from(net.names), min_size=1, max_size=2, unique=True))
    free = set(net.names) - net.descendants(chosen)
    pinned = draw(pins(net, free))
    later = draw(pins(net, (set(chosen) | net.descendants(chosen)) - set(pinned), 1)) if after else {}
    assume(not any(isinstance(wanted, float) for wanted in later.values()))
    acting = {parent for node in net.nodes if isinstance(node, Category) for parent in node.parents}
    ranged = {column for column, wanted in (pinned | later).items() if not isinstance(wanted, float)}
    boxed = (acting | ranged) & set(net.numbers)
    copied = [column for column in chosen if column in acting or column in later]
    assume(len(boxed) < 2 and len(boxed) + len(copied) < 3)  # the slow truth takes long for more
    return net, pinned, {column: draw(lever(net, column)) for column in chosen}, later


def held_to(marginal, expected, tolerance=1e-8):
    _, shares, mean, sd, below = expected
    np.testing.assert_allclose(marginal.point, shares, rtol=0, atol=tolerance)
    if mean is not None:
        assert (marginal.mean, marginal.sd) == pytest.approx((mean, sd), abs=tolerance * 100)
        np.testing.assert_allclose(marginal.below(GRID), below, rtol=0, atol=tolerance * 10)


def ask(question, **more):
    net, pinned, set_to, later = question
    try:
        return Model(net).ask(pinned, set_to, net.names, pins_after=later, draws=0, **more)
    except engine.Refusal as refusal:
        assume("circle" not in refusal.message and "No record" not in refusal.message)
        raise


@settings(max_examples=20, deadline=None)
@given(mixed_questions())
def test_every_kind_of_lever_agrees_with_every_way_in_which_it_takes(question):
    net, pinned, set_to, _ = question
    before = as_places(net, pinned)
    seen = slow(net.nodes, before, {})
    assume(seen is not None and seen[net.names[0]][0] > -40.0)
    answer = ask(question)
    assume(answer.method.startswith("exact"))
    expected = slow(net.nodes, before, set_to)
    for column in net.names:
        reading = answer[column]
        held_to(reading.among, seen[column])
        held_to(reading.set, expected[column])
    assert answer.log_evidence == pytest.approx(seen[net.names[0]][0], abs=1e-8)


@settings(max_examples=15, deadline=None)
@given(mixed_questions(most=3, after=True))
def test_pins_after_the_levers_agree_with_every_way_in_which_they_take(question):
    net, pinned, set_to, later = question
    expected = slow(net.nodes, as_places(net, pinned), set_to, as_places(net, later))
    assume(expected is not None and expected[net.names[0]][0] > -20.0)
    answer = ask(question)
    assume(answer.method.startswith("exact"))
    for column in net.names:
        held_to(answer[column].set, expected[column])


@settings(max_examples=15, deadline=None)
@given(mixed_questions(), st.data())
def test_the_joint_of_columns_of_both_kinds_adds_up_to_each_of_them(question, data):
    net = question[0]
    answer = ask(question)
    columns = data.draw(st.lists(st.sampled_from(net.names), min_size=1, max_size=2, unique=True))
    for world, frame in answer.joint(columns).items():
        for column in columns:
            summed = frame["share"].groupby(level=column, sort=False).sum()
            exact = answer.method.startswith("exact") and frame.attrs["method"] == "exact"
            tolerance = 1e-9 if exact else 0.05
            np.testing.assert_allclose(summed, getattr(answer[column], world).point, rtol=0, atol=tolerance)


@settings(max_examples=30, deadline=None)
@given(mixed_questions())
def test_columns_that_no_lever_moves_read_as_among_these_to_the_last_digit(question):
    net, _, set_to, _ = question
    answer = ask(question)
    moved = net.descendants(set_to) | set_to.keys()
    for column in set(net.names) - moved:
        np.testing.assert_array_equal(answer[column].set.point, answer[column].among.point)
        assert answer[column].set.number is answer[column].among.number


def two_steps(variance=1.0):
    """A number after a category, a category after its bands, and a number after both."""
    return [
        engine.Category("site", ["a", "b"], [], [0.4, 0.6]),
        engine.Number("hours", ["site"], [10.0, 14.0], (), [4.0, 9.0], [12.0]),
        engine.Category("passed", ["no", "yes"], ["hours"], [[0.7, 0.3], [0.2, 0.8]]),
        engine.Number("score", ["hours", "passed"], [1.0, 3.0], [[0.5], [0.25]], [variance, variance], [8.0]),
    ]


def test_a_fix_to_the_pinned_value_reads_as_among_these():
    model = engine.Model.from_network(two_steps())
    answer = model.ask({"hours": 11.0}, {"hours": engine.Fix(11.0)}, ["passed", "score", "hours"])
    for column in ("passed", "score", "hours"):
        np.testing.assert_allclose(answer[column].set.point, answer[column].among.point, atol=1e-12)
    assert answer["score"].set.mean == pytest.approx(answer["score"].among.mean, abs=1e-12)
    assert answer["hours"].set.mean == 11.0 and answer["hours"].set.sd == 0.0


def test_a_fix_on_a_number_without_parents_equals_pinning_it():
    nodes = [replace(two_steps()[1], parents=(), intercept=10.0, variance=4.0), *two_steps()[2:]]
    model = engine.Model.from_network(nodes)
    answer = model.ask({}, {"hours": engine.Fix(13.0)}, ["passed", "score"])
    for column in ("passed", "score"):
        np.testing.assert_allclose(answer[column].set.point, answer[column].had.point, atol=1e-12)
    assert answer["score"].set.mean == pytest.approx(answer["score"].had.mean, abs=1e-12)
    assert answer["score"].set.quantile(0.9) == pytest.approx(answer["score"].had.quantile(0.9), abs=1e-9)


def test_a_change_of_a_number_is_that_of_its_mean():
    model = engine.Model.from_network(two_steps())
    answer = model.ask(
        {"site": "a"}, {"hours": engine.Shift(2.0)}, ["score", "hours"], against={"hours": engine.Fix(9.0)}
    )
    change, low, high = answer.change("score")
    assert change == answer["score"].set.mean - answer["score"].against.mean and (low, high) == (change, change)
    assert answer.change("hours")[0] == pytest.approx(12.0 - 9.0)
    assert answer["score"].set.interval(None) == (answer["score"].set.mean,) * 2
    shares = answer["score"].set.share("8 and over") - answer["score"].against.share("8 and over")
    assert answer.change("score", "8 and over")[0] == pytest.approx(shares)
    assert answer["hours"].had is None


def test_a_pin_on_the_levers_own_number_is_the_effect_among_those():
    model = engine.Model.from_network(two_steps())
    answer = model.ask({"hours": (12, None)}, {"hours": engine.Shift(-20.0)}, ["passed", "site", "hours"])
    assert answer["passed"].set.share("yes") == pytest.approx(0.3, abs=1e-4)  # practically all come under 12
    assert answer["passed"].among.share("yes") == pytest.approx(0.8)
    np.testing.assert_array_equal(answer["site"].set.point, answer["site"].among.point)
    assert answer["hours"].set.mean == pytest.approx(answer["hours"].among.mean - 20.0)
    had = model.ask({"hours": (12, None)}, {"hours": engine.Fix(11.0)}, ["passed"])
    assert had["passed"].had is None and had["passed"].set.share("yes") == pytest.approx(0.3)


def test_a_number_ruled_by_the_bands_of_another():
    nodes = [*two_steps(), engine.Number("later", ["hours"], 0.0, [1.0], 1.0)]
    model = engine.Model.from_network(nodes)
    answer = model.ask({}, {"score": engine.Rule("hours", {"under 12": 20.0})}, ["score", "passed"])
    share = model.ask(watch=["hours"])["hours"].recorded.share("under 12")
    rest = model.ask({"hours": "12 and over"}, watch=["score"])["score"].among.mean
    assert answer["score"].set.mean == pytest.approx(share * 20.0 + (1.0 - share) * rest, abs=1e-9)


def test_pins_that_contradict_each_other_are_named_with_values_and_ranges():
    nodes = [*two_steps(), engine.Number("twice", ["hours"], 0.0, [2.0], 0.0)]
    model = engine.Model.from_network(nodes)
    with pytest.raises(engine.Refusal, match="can have “hours” = 11 and “twice” = 30 to under 31 together") as refusal:
        model.ask({"site": "a", "hours": 11.0, "twice": (30, 31), "passed": "no"}, watch=["score"])
    assert refusal.value.where == "hours, twice"


def test_values_far_out_do_not_underflow():
    model = engine.Model.from_network(two_steps(variance=1e-4))
    answer = model.ask({"score": 40.0, "hours": 10.0}, watch=["passed"])
    assert answer.log_evidence < -1e5 and math.isfinite(answer.log_evidence)
    assert answer["passed"].among.share("no") + answer["passed"].among.share("yes") == pytest.approx(1.0)
    rare = model.ask({"hours": (75.0, 76.0)}, watch=["passed", "hours"])  # over 20 deviations out, 1e-93 or less
    assert rare.log_evidence < -200.0 and 75.0 <= rare["hours"].among.mean < 76.0


def refused(message, do, ask):
    with pytest.raises(engine.Refusal, match=message) as refusal:
        ask()
    assert do in (refusal.value.do or ""), refusal.value.do


def test_what_is_no_pin_or_lever_on_a_number_is_refused():
    model = engine.Model.from_network(two_steps())

    def pin(wanted):
        return lambda: model.ask({"hours": wanted}, watch=["passed"])

    def lever(wanted):
        return lambda: model.ask({}, {"hours": wanted}, ["passed"])

    for wrong in (math.nan, math.inf, None, [1.0, 2.0], True, object()):
        refused("“hours” is a number and cannot be pinned to", "(low, high)", pin(wrong))
    refused("range from 12 to under 10 holds no value", "lower end first", pin((12, 10)))
    refused("range from nan|holds no value", "lower end first", pin((math.nan, 10)))
    refused("“hours” has no level “under 13”", "Did you mean “under 12”", pin("under 13"))
    refused("pinned to no level", "under 12", pin([]))
    refused("its band “under 12” is no one value", "Give a value", lever(engine.Fix("under 12")))
    refused("cannot be set to “many”", "Give one number", lever(engine.Fix("many")))
    refused("cannot be set to “nan”", "Give one number", lever(engine.Fix(math.nan)))
    refused("cannot be shifted by “inf”", "Give one number", lever(engine.Shift(math.inf)))
    refused("cannot be shifted by “a lot”", "Give one number", lever(engine.Shift("a lot")))
    refused("its band “under 12” is no one value", "Give a value", lever(engine.Mix({"under 12": 1.0})))
    refused("its band “under 12” is no one value", "Give a value", lever(engine.Rule("site", {"a": "under 12"})))
    refused("“hours” is ruled by “passed”", "comes before", lever(engine.Rule("passed", {"no": 1.0})))
    refused("category, so nothing can be added", "a, b", lambda: model.ask({}, {"site": engine.Shift(1.0)}, ["passed"]))
    refused("no quantile at “1.5”", "below 1", lambda: model.ask()["hours"].recorded.quantile(1.5))


def test_a_range_that_matches_the_bands_is_the_bands():
    model = engine.Model.from_network(two_steps())
    by_range, by_name = (model.ask({"hours": pin}, watch=["score"]) for pin in ((None, 12), "under 12"))
    assert by_range["score"].among.mean == by_name["score"].among.mean
    assert by_range.log_evidence == by_name.log_evidence


def test_exact_refuses_what_can_only_be_sampled_and_sampling_is_said():
    numbers = [engine.Number(name, [], 0.0, (), 1.0, [0.0]) for name in "ab"]
    tied = engine.Number("c", ["a", "b"], 0.0, [1.0, 1.0], 1.0, [0.5])
    after = [engine.Category(f"after {name}", ["n", "y"], [name], [[0.8, 0.2], [0.3, 0.7]]) for name in "abc"]
    model = engine.Model.from_network([*numbers, tied, *after])
    pinned = {"after a": "y", "after b": "y", "after c": "y"}
    refused("too wide to sum exactly", "sampled", lambda: model.ask(pinned, watch=["c"], exact=True))
    answer = model.ask(pinned, watch=["c"], draws=0)
    assert answer.method.startswith("sampled, by likelihood weighting")
    assert 0.0 < answer.mc_error < 0.05 and 1000 < answer.effective < math.inf
    always = engine.Model.from_network(two_steps()).ask({"site": "a"}, watch=["score"], exact=False)
    exact = engine.Model.from_network(two_steps()).ask({"site": "a"}, watch=["score"])
    assert always.method.startswith("sampled") and exact.method.startswith("exact") and exact.mc_error == 0.0
    assert always["score"].among.mean == pytest.approx(exact["score"].among.mean, abs=5 * always.mc_error * 2)


def test_a_column_named_like_a_copy_is_no_copy():
    nodes = [
        engine.Category("x", ["n", "y"], [], [0.5, 0.5]),
        engine.Category("x as set", ["n", "y"], ["x"], [[0.9, 0.1], [0.2, 0.8]]),
        engine.Number("x taking", ["x as set"], [0.0, 1.0], (), [1.0, 1.0]),
        engine.Number("y", ["x taking"], 0.0, [1.0], 1.0),
    ]
    model = engine.Model.from_network(nodes)
    answer = model.ask({}, {"x": engine.Fix("y"), "x taking": engine.Shift(2.0, 0.5)}, ["y", "x as set"])
    assert answer["x as set"].set.share("y") == pytest.approx(0.8)
    assert answer["y"].set.mean == pytest.approx(0.8 + 1.0)


def test_a_band_is_told_by_its_place():
    node = two_steps()[1]
    assert [band_of(node, value) for value in (11.9, 12.0)] == [0, 1]
