"""The exact route through worlds with numbers, against the slow truth."""

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from scipy.stats import norm

import engine
from engine.answering.exact_mixed import plan
from engine.answering.mixed import MixedWorld
from engine.network.nodes import Category, Number
from tests.answering.mixed_generated import mixed_worlds, own_parameters, set_worlds, shaken_parameters
from tests.answering.mixed_plainly import in_boxes, truth

QUICK = settings(max_examples=60, deadline=None)


def read(world, drawn=None, count=0):
    return plan(world).read(world, drawn or own_parameters(world), count)


def agree(world, found, true, draw=0, exactly=1e-10):
    """Every figure of a draw is the true one."""
    assert found.log_evidence[draw] == pytest.approx(true.log_evidence, abs=exactly, rel=exactly)
    if true.log_evidence == -np.inf:
        return
    for name in world.watch:
        if name in true.parts and len(in_boxes(world) | {name}) > 2:  # the truth would take seconds
            continue
        assert found.shares[name][:, draw] == pytest.approx(true.shares[name], abs=exactly)
        if name not in true.parts:
            continue
        mixture = found.numbers[name]
        middle, spread = true.mean(name), true.sd(name)
        assert mixture.weight[:, draw].sum() == pytest.approx(1.0)
        assert mixture.means[draw] == pytest.approx(middle, abs=exactly * (1.0 + abs(middle) + spread))
        assert mixture.sds[draw] == pytest.approx(spread, rel=1e3 * exactly, abs=1e-7)
        for place in (-1.3, 0.2, 2.1):
            value = middle + place * (spread + 0.1)
            assert mixture.below([value])[0, draw] == pytest.approx(true.below(name, value), abs=exactly)


@QUICK
@given(mixed_worlds(banded=False, boxes=0))
def test_values_and_pins_are_read_as_by_enumeration(world):
    agree(world, read(world), truth(world))


@QUICK
@given(mixed_worlds(most=5, banded=False, boxes=0), st.integers(0, 99))
def test_every_draw_is_read_with_its_own_parameters(world, seed):
    drawn = shaken_parameters(world, 3, seed)
    found = read(world, drawn, 3)
    for draw in range(4):
        agree(world, found, truth(world, drawn, draw), draw)


@QUICK
@given(mixed_worlds(most=5))
def test_numbers_that_act_through_bands_or_lie_in_ranges_are_cut(world):
    assume(len(in_boxes(world)) < 2)
    agree(world, read(world), truth(world))


@settings(max_examples=40, deadline=None)
@given(set_worlds(most=4))
def test_a_set_copy_follows_its_number_to_the_last_digit(world):
    assume(len(in_boxes(world)) < 3)
    cuts = {cut for node in world.nodes if isinstance(node, Number) for cut in node.bands}
    assume(not cuts & set(world.values.values()))  # the slow truth spreads a copy a little to either side of its value
    assume(np.isfinite(plan(world).cells))
    true = truth(world)
    assume(true.log_evidence > -50.0 or true.log_evidence == -np.inf)
    agree(world, read(world), true, exactly=1e-9)


@settings(max_examples=8, deadline=None)  # the slow truth takes half a second
@given(st.integers(0, 2**32 - 1))
def test_two_numbers_that_hang_together_are_cut_by_the_bivariate_normal(seed):
    rng = np.random.default_rng(seed)
    noise = rng.gamma(1.0, 1.0, (2, 2)) * 10.0 ** rng.uniform(-3.0, 0.0)
    world = MixedWorld(
        (
            Category("kind", ["a", "b"], (), [0.4, 0.6]),
            Number("first", ("kind",), rng.normal(size=2), (), noise[0], (-0.3, 0.4)),
            Number("second", ("kind", "first"), rng.normal(size=2), rng.normal(size=(2, 1)), noise[1], (0.1,)),
            Category("after", ["no", "yes"], ("first", "kind"), np.dstack([ups := rng.random((3, 2)), 1.0 - ups])),
        ),
        {"after": frozenset([1])},
        {},
        {"second": (float(rng.normal()), np.inf)},
        ("kind", "first"),
    )
    true = truth(world)
    assume(true.log_evidence > -30.0)
    found = read(world)
    assert plan(world).readings[0].layout.factors[0].gates == ("first", "second")
    agree(world, found, true, exactly=1e-9)


def test_more_than_two_cut_numbers_that_hang_together_have_no_exact_route():
    ends = {"a": (0.0, 1.0), "b": (0.0, 1.0), "c": (0.0, 1.0)}
    nodes = (Number("a"), Number("b", ("a",), 0.0, [1.0]), Number("c", ("b",), 0.0, [1.0]))
    found = plan(MixedWorld(nodes, {}, {}, ends, ("a",)))
    assert found.cells == np.inf
    assert "hang together" in found.why
    apart = plan(MixedWorld(nodes[:2], {}, {"a": 0.3}, {"b": (0.0, 1.0)}, ("b",)))
    assert np.isfinite(apart.cells)
    assert apart.why == ""


def test_columns_that_only_follow_bring_nothing_into_an_answer():
    nodes = (
        Number("a", (), 0.0, (), 1.0, (0.0,)),
        Number("b", ("a",), 0.0, [1.0], 1.0, (0.0,)),
        Number("c", ("b",), 0.0, [1.0], 1.0, (0.0,)),
        *(Category(f"of {name}", ["x", "y"], (name,), [[0.5, 0.5], [0.1, 0.9]]) for name in "abc"),
    )
    world = MixedWorld(nodes, {}, {}, {}, tuple(node.name for node in nodes))
    found = read(world)  # each is read with what bears on it alone
    assert found.numbers["c"].sds[0] == pytest.approx(np.sqrt(3.0))
    assert found.shares["of c"][:, 0] == pytest.approx([0.3, 0.7])


def test_what_cannot_be_has_no_probability_and_no_distribution():
    nodes = (Category("kind", ["a", "b"], (), [1.0, 0.0]), Number("x", ("kind",), [0.0, 1.0], (), [0.0, 1.0]))
    found = read(MixedWorld(nodes, {}, {"x": 0.5}, {}, ("kind", "x")))
    assert found.log_evidence[0] == -np.inf
    assert np.isnan(found.numbers["x"].means[0])
    empty = read(MixedWorld(nodes, {}, {}, {"x": (0.5, 0.7)}, ("x",)))
    assert empty.log_evidence[0] == -np.inf
    assert np.isnan(empty.numbers["x"].quantile(0.5)[0])


def test_a_value_that_a_number_takes_exactly_outweighs_any_density():
    nodes = (Category("kind", ["a", "b"], (), [0.01, 0.99]), Number("x", ("kind",), [0.5, 0.5], (), [0.0, 1e-6]))
    found = read(MixedWorld(nodes, {}, {"x": 0.5}, {}, ("kind",)))
    assert found.shares["kind"][0, 0] == pytest.approx(1.0)
    assert found.log_evidence[0] == pytest.approx(np.log(0.01))


def test_far_fetched_values_do_not_underflow():
    nodes = (Category("kind", ["a", "b"], (), [0.5, 0.5]), Number("x", ("kind",), [0.0, 1.0], (), [1.0, 1.0]))
    found = read(MixedWorld(nodes, {}, {"x": 200.0}, {}, ("kind",)))
    assert found.log_evidence[0] == pytest.approx(np.log(0.5) - 0.5 * 199.0**2 - 0.5 * np.log(2.0 * np.pi))
    assert found.shares["kind"][1, 0] == pytest.approx(1.0)


def test_a_precise_measurement_keeps_its_digits():
    nodes = (Number("x", (), 0.0, (), 1e4), Number("read off", ("x",), 0.0, [1.0], 1e-10))
    found = read(MixedWorld(nodes, {}, {"read off": 12.5}, {}, ("x",)))
    assert found.numbers["x"].sds[0] == pytest.approx(1e-5, rel=1e-6)
    assert found.numbers["x"].means[0] == pytest.approx(12.5, abs=1e-9)


@QUICK
@given(mixed_worlds(most=5), st.sampled_from([0.05, 0.5, 0.9]))
def test_a_quantile_has_its_share_below_it(world, q):
    assume(np.isfinite(plan(world).cells))
    for mixture in read(world).numbers.values():
        at = mixture.quantile(q)
        if np.isnan(at[0]):
            continue
        step = 1e-9 * (1.0 + np.abs(at))
        below, above = mixture.below(at - step)[0, 0], mixture.below(at + step)[0, 0]
        assert below - 1e-9 <= q <= above + 1e-9


@settings(max_examples=20, deadline=None)
@given(mixed_worlds(most=5), st.integers(0, 2))
def test_one_draw_of_a_distribution_reads_as_it_does_among_all(world, draw):
    assume(np.isfinite(plan(world).cells))
    for mixture in read(world, shaken_parameters(world, 2, 1), 2).numbers.values():
        alone = mixture.only(draw)
        assert alone.means == pytest.approx(mixture.means[[draw]], nan_ok=True)
        assert alone.quantile(0.3) == pytest.approx(mixture.quantile(0.3)[[draw]], nan_ok=True)


@QUICK
@given(mixed_worlds(most=5, exact_numbers=False))
def test_a_density_is_what_the_share_below_grows_by(world):
    assume(len(in_boxes(world)) < 2 and np.isfinite(plan(world).cells))
    found, true = read(world), truth(world)
    for name, mixture in found.numbers.items():
        if name not in in_boxes(world) and name not in world.values and true.log_evidence > -np.inf:
            value = true.mean(name) + 0.3
            assert mixture.density([value])[0, 0] == pytest.approx(true.density(name, value), rel=1e-6, abs=1e-9)


def test_two_numbers_that_act_through_bands_are_summed_exactly_and_three_are_not():
    share = [[0.9, 0.1], [0.3, 0.7]]
    nodes = [
        engine.Number("x", bands=[0.0]),
        engine.Number("y", parents=["x"], slopes=[1.0], bands=[0.5]),
        engine.Category("c", ["n", "p"], ["x"], share),
        engine.Category("d", ["n", "p"], ["y"], share),
    ]
    model = engine.Model.from_network(nodes)
    exact = model.ask(pins={"c": "p"}, watch=["d"], exact=True)
    assert exact.method.startswith("exact")
    # By one-dimensional quadrature over x: y given x is normal with mean x and variance 1.
    x = (np.arange(-90_000, 90_000) + 0.5) / 10_000.0  # midpoints, none of them on a cut
    weight = norm.pdf(x) * np.where(x < 0.0, 0.1, 0.7)
    high = 1.0 - norm.cdf(0.5 - x)
    told = float((weight * (0.1 * (1.0 - high) + 0.7 * high)).sum() / weight.sum())
    assert exact["d"].among.share("p") == pytest.approx(told, abs=1e-8)
    third = [
        engine.Number("z", parents=["y"], slopes=[1.0], bands=[0.0]),
        engine.Category("e", ["n", "p"], ["z"], share),
    ]
    wider = engine.Model.from_network([*nodes, *third])
    with pytest.raises(engine.Refusal, match="hang together"):
        wider.ask(pins={"c": "p", "e": "p"}, watch=["d"], exact=True)
