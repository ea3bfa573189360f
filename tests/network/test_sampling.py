"""Invented rows: they repeat with the seed, and have the shares, means and spreads of the network."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import engine
from engine.network.sampling import drawn_rows
from engine.refusal import Refusal
from tests.answering.generated import networks
from tests.network.mixed_made import mixed_networks, school
from tests.network.mixed_plainly import band, conditional
from tests.network.test_mixed_networks import DEPTH, FLOW, RAIN, WET
from tests.plainly import cases, shares

ROWS = 20_000


@settings(max_examples=20, deadline=None)
@given(networks(most=5), st.integers(0, 99))
def test_levels_have_the_shares_of_the_network(net, seed):
    found, every = engine.Model(net).sample(ROWS, seed), cases(net)
    for node in net.nodes:
        for level, share in zip(node.levels, shares(net, every, {}, node.name), strict=True):
            # Five and a half standard errors: about one in 20 million draws is further off.
            assert abs((found[node.name] == level).mean() - share) <= 5.5 * np.sqrt(share * (1 - share) / ROWS)


@settings(max_examples=20, deadline=None)
@given(mixed_networks(), st.integers(0, 99))
def test_a_number_is_normal_around_its_regression_in_every_row(net, seed):
    found = engine.Model(net).sample(500, seed)
    for name in net.numbers:
        node, away = net.node(name), []
        for row in found.to_dict("records"):
            mean, variance = conditional(net, node, row)
            if variance == 0.0:
                assert row[name] == pytest.approx(mean, abs=1e-9)
            else:
                away.append((row[name] - mean) / np.sqrt(variance))
        if away:
            assert abs(np.mean(away)) < 5.5 / np.sqrt(len(away))
            assert abs(np.mean(np.square(away)) - 1.0) < 5.5 * np.sqrt(2.0 / len(away)) + 30.0 / len(away)


def test_a_category_follows_the_bands_of_its_number_parents():
    found = engine.Model.from_network([RAIN, FLOW, WET, DEPTH]).sample(200_000, 2)
    bands = np.array([band(FLOW, value) for value in found["flow"]])
    for rain, table in zip(("no", "yes"), np.asarray(WET.table), strict=True):
        for place in range(3):
            here = found[(found["rain"] == rain) & (bands == place)]
            share = table[place, 1]
            assert abs((here["wet"] == "yes").mean() - share) < 5.5 * np.sqrt(share * (1 - share) / len(here))


def test_levels_are_texts_and_numbers_floats_in_their_own_units():
    frame, net = school()
    found = engine.Model(net).sample(4_000, 0)
    assert list(found.columns) == list(net.names)
    assert found["hours"].dtype == found["score"].dtype == np.float64
    assert set(found["site"]) == set(frame["site"]) and set(found["passed"]) == {"no", "yes"}
    for name in ("hours", "score"):
        assert found[name].mean() == pytest.approx(frame[name].mean(), rel=0.05)
        assert found[name].std() == pytest.approx(frame[name].std(), rel=0.1)


def test_a_number_taken_as_bands_comes_out_as_the_name_of_its_band():
    banded = engine.Category("hours", ["under 5", "5 and over"], [], [0.3, 0.7], kind="number", cuts=(5.0,))
    assert set(engine.Model.from_network([banded]).sample(50, 0)["hours"]) == {"under 5", "5 and over"}


def test_the_same_seed_draws_the_same_rows_and_what_is_drawn_scores():
    model = engine.Model(school()[1])
    one, other, third = model.sample(300, 7), model.sample(300, 7), model.sample(300, 8)
    assert one.equals(other) and not one.equals(third)
    assert np.isfinite(model.log_score(one)).all()


def test_codes_of_a_drawn_number_are_its_bands():
    rows = drawn_rows(engine.Model(school()[1]).network, 200, 3)
    node = school()[1].node("hours")
    assert rows.codes["hours"].tolist() == [band(node, value) for value in rows.values["hours"]]


@pytest.mark.parametrize(("rows", "seed"), [(0, 0), (-1, 0), (2.5, 0), (True, 0), (10, -1), (10, "x")])
def test_no_rows_and_a_seed_that_is_none_are_refused(rows, seed):
    with pytest.raises(Refusal):
        engine.Model.from_network([RAIN]).sample(rows, seed)
