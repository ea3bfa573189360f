"""How far a link moves its child where numbers come in: by hand, and one row at a time."""

import numpy as np
import pytest
from hypothesis import given, settings
from scipy.stats import norm

import engine
from engine.network.typical import invented, recorded
from tests.network.mixed_made import mixed_networks, school
from tests.network.mixed_plainly import band, conditional
from tests.network.test_mixed_networks import DEPTH, FLOW, RAIN, WET


def by_hand(net, typical, source, target, value):
    """The mean of `target`, over all typical rows, had each of them that value of `source`."""
    node, total = net.node(target), 0.0
    for place, weight in enumerate(typical.weights):
        row = {
            name: typical.rows.values[name][place]
            if name in net.numbers
            else net.node(name).levels[typical.rows.codes[name][place]]
            for name in node.parents
        }
        total += weight * conditional(net, node, row | {source: value})[0]
    return total


def with_records(rows=300):
    frame, net = school(rows)
    table = engine.Table.from_frame(
        frame, kinds={"hours": "number", "score": "number"}, bands={name: net.node(name).bands for name in net.numbers}
    )
    return frame, engine.Model(net, coded=table.coded(net.names, net.numbers))


def test_a_category_moves_a_number_by_its_mean_between_two_levels():
    model = engine.Model.from_network([RAIN, FLOW, WET, DEPTH])
    assert model.strength("rain", "flow") == pytest.approx(4.0)  # 5 less 1, no sampling in it
    shift = engine.Category("shift", ["days", "nights"], [], [0.75, 0.25])
    pay = engine.Number("pay", ["rain", "shift"], [[10.0, 20.0], [16.0, 22.0]], [], np.ones((2, 2)))
    found = engine.Model.from_network([RAIN, shift, pay])
    assert found.strength("rain", "pay") == pytest.approx(0.75 * 6.0 + 0.25 * 2.0)
    assert found.strength("shift", "pay") == pytest.approx(0.8 * 10.0 + 0.2 * 6.0)


def test_a_category_moves_a_number_with_the_other_parents_of_each_record_as_they_are():
    _, model = with_records()
    typical = recorded(model.coded)
    means = [by_hand(model.network, typical, "site", "score", site) for site in ("north", "south", "west")]
    assert model.strength("site", "score") == pytest.approx(max(means) - min(means))


def test_a_number_moves_a_number_between_its_low_and_its_high_records():
    frame, model = with_records()
    low, high = np.percentile(frame["hours"], [5, 95], method="inverted_cdf")
    typical = recorded(model.coded)
    moved = by_hand(model.network, typical, "hours", "score", high) - by_hand(
        model.network, typical, "hours", "score", low
    )
    assert model.strength("hours", "score") == pytest.approx(moved)


def test_without_records_a_number_moves_a_number_over_four_standard_deviations():
    pay = engine.Number("pay", ["age"], 1000.0, [-50.0], 1.0)
    found = engine.Model.from_network([engine.Number("age", [], 45.0, [], 100.0), pay])
    assert found.strength("age", "pay") == pytest.approx(50.0 * 40.0, rel=0.02)  # invented rows: their sd is within 1%


def test_a_number_moves_a_category_across_its_bands():
    model = engine.Model.from_network([RAIN, FLOW, WET, DEPTH])
    # no, the commonest level: .9, .8, .5 in the bands without rain and .4, .3, .2 with it; it rains for a fifth
    assert model.strength("flow", "wet") == pytest.approx(0.8 * (0.9 - 0.5) + 0.2 * (0.4 - 0.2))
    bands = sum(
        weight * np.diff(norm.cdf([-np.inf, 2.0, 4.0, np.inf], mean, np.sqrt(variance)))
        for weight, mean, variance in ((0.8, 1.0, 1.0), (0.2, 5.0, 2.0))
    )
    assert model.strength("rain", "wet") == pytest.approx(bands @ [0.9 - 0.4, 0.8 - 0.3, 0.5 - 0.2])


def test_heavier_records_count_for_more():
    frame, model = with_records()
    coded = model.coded
    weights = np.where(frame["site"] == "north", 3.0, 1.0)
    heavy = engine.Model(model.network, coded=type(coded)(**(vars(coded) | {"weights": weights})))
    twice = engine.Model(model.network, coded=type(coded)(**(vars(coded) | _repeated(coded, weights.astype(int)))))
    for link in model.links:
        assert heavy.strength(*link) == pytest.approx(twice.strength(*link))
    assert heavy.strength("hours", "score") != pytest.approx(model.strength("hours", "score"), rel=1e-4)


def _repeated(coded, times):
    return {
        "codes": np.repeat(coded.codes, times, axis=0),
        "values": np.repeat(coded.values, times, axis=0),
        "weights": np.ones(times.sum()),
    }


@settings(max_examples=30, deadline=None)
@given(mixed_networks())
def test_every_link_has_a_strength_that_is_finite_and_not_below_nothing(net):
    model = engine.Model(net)
    for source, target in net.links:
        found = model.strength(source, target)
        assert np.isfinite(found) and found >= 0.0
        assert target in net.numbers or found <= 1.0 + 1e-12


def test_typical_rows_count_configurations_bands_and_means():
    frame, model = with_records()
    net, typical = model.network, recorded(model.coded)
    joint = typical.joint(net, ("hours", "site"))
    bands = np.array([band(net.node("hours"), value) for value in frame["hours"]])
    for place in range(3):
        for at, site in enumerate(("north", "south", "west")):
            assert joint[place, at] == pytest.approx(((bands == place) & (frame["site"] == site)).mean())
    means = typical.means(net, ("hours", "score"), ("site",))
    for at, site in enumerate(("north", "south", "west")):
        np.testing.assert_allclose(means[at], frame.loc[frame["site"] == site, ["hours", "score"]].mean())
    assert typical.mean("hours") == pytest.approx(frame["hours"].mean())
    assert typical.sd("hours") == pytest.approx(frame["hours"].std(ddof=0))


def test_a_configuration_that_no_row_has_takes_the_mean_of_all():
    frame, model = with_records()
    gone = frame["site"].to_numpy() != "west"
    coded = model.coded
    left = recorded(type(coded)(**(vars(coded) | _repeated(coded, gone.astype(int)))))
    means = left.means(model.network, ("hours",), ("site",))
    assert means[2, 0] == pytest.approx(frame.loc[gone, "hours"].mean())


def test_invented_rows_are_always_the_same():
    net = engine.Model.from_network([RAIN, FLOW, WET, DEPTH]).network
    assert invented(net).mean("depth") == invented(net).mean("depth")
    assert not invented(net).recorded
