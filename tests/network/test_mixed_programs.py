"""A model with numbers as a program: what it draws is what the model says, whatever its columns are called."""

import csv
import io
import subprocess
import sys

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import engine
from engine.answering.mixed import MixedWorld
from engine.network.network import network
from engine.network.program import program
from tests.answering.mixed_plainly import truth
from tests.network.mixed_made import mixed_networks, school
from tests.network.mixed_plainly import conditional
from tests.network.test_mixed_networks import DEPTH, FLOW, RAIN, WET
from tests.network.test_program import HOSTILE, NAMES, drawn

ROWS = 20_000


@settings(max_examples=20, deadline=None)
@given(mixed_networks(most=4), st.integers(0, 99))
def test_what_it_draws_has_the_shares_means_and_spreads_of_the_model(net, seed):
    found = drawn(program(net), ROWS, seed)
    expected = truth(MixedWorld(net.nodes, {}, {}, {}, net.names))
    for node in net.nodes:
        if isinstance(node, engine.Number):
            mean, sd = expected.mean(node.name), expected.sd(node.name)
            # Five and a half standard errors: about one in 20 million draws is further off.
            assert abs(found[node.name].mean() - mean) <= 5.5 * sd / np.sqrt(ROWS) + 1e-3
            assert found[node.name].std() == pytest.approx(sd, rel=0.1, abs=1e-3)
            continue
        for level, share in zip(node.levels, expected.shares[node.name], strict=True):
            allowed = 5.5 * np.sqrt(max(share * (1 - share), 0.0) / ROWS) + 5e-4
            assert abs((found[node.name] == level).mean() - share) <= allowed


def test_numbers_follow_their_parents_row_by_row():
    net = network([RAIN, FLOW, WET, DEPTH])
    found = pd.DataFrame(drawn(program(net), 2_000, 1))
    away = []
    for row in found.to_dict("records"):
        mean, variance = conditional(net, DEPTH, row)
        if variance:
            away.append((row["depth"] - mean) / np.sqrt(variance))
        else:
            assert row["depth"] == pytest.approx(mean, rel=1e-6)
    assert np.mean(away) == pytest.approx(0.0, abs=0.15) and np.std(away) == pytest.approx(1.0, abs=0.15)


@pytest.mark.parametrize(
    ("origin", "sd", "slope"), [(1.6e9, 1_000.0, 1 / 600), (1e9, 1e-3, 1_000.0), (-1e12, 1.0, 2.0), (0.0, 1e-9, 1e9)]
)
def test_a_program_draws_as_the_model_does_however_far_from_0_its_numbers_lie(origin, sd, slope):
    site = engine.Category("site", ["a", "b"], [], [0.5, 0.5])
    start = engine.Number("start", [], origin, [], sd**2, [origin])
    took = engine.Number(
        "took", ["site", "start"], [3.0 - slope * origin, -slope * origin], [[slope], [slope]], [0.09, 0.09]
    )
    again = engine.Number("again", ["start"], 2.0, [1.0], 0.0)
    late = engine.Category("late", ["no", "yes"], ["start"], [[1.0, 0.0], [0.0, 1.0]])
    net = network([site, start, took, again, late])
    found = drawn(program(net), ROWS, 3)
    spread = np.hypot(slope * sd, 0.3)
    for place, level in enumerate("ab"):
        here = found["site"] == level
        assert found["took"][here].mean() == pytest.approx((3.0, 0.0)[place], abs=5.5 * spread / np.sqrt(ROWS / 2))
        left = found["took"][here] - (3.0, 0.0)[place] - slope * (found["start"][here] - origin)
        assert left.mean() == pytest.approx(0.0, abs=5.5 * 0.3 / np.sqrt(ROWS / 2) + 1e-3)
        assert left.std() == pytest.approx(0.3, rel=0.05)
    assert (found["start"].mean() - origin) / sd == pytest.approx(0.0, abs=5.5 / np.sqrt(ROWS))
    assert found["start"].std() == pytest.approx(sd, rel=0.05)
    np.testing.assert_allclose(found["again"] - found["start"], 2.0, atol=1e-3 * sd + 1e-15 * abs(origin))
    assert ((found["late"] == "yes") == (found["start"] >= origin)).all()


def test_it_runs_by_itself_and_its_rows_are_as_likely_as_the_models_own(tmp_path):
    net = school(2_000)[1]
    path = tmp_path / "program.py"
    path.write_text(engine.Model(net).program(), encoding="utf-8")
    done = subprocess.run([sys.executable, "-I", path, "5000", "3"], capture_output=True, cwd=tmp_path, timeout=60)
    assert done.returncode == 0 and done.stderr == b""
    rows = pd.read_csv(io.BytesIO(done.stdout))
    own = engine.Model(net).sample(5_000, 3)
    for name in ("hours", "score"):
        assert rows[name].mean() == pytest.approx(own[name].mean(), abs=6 * own[name].std() / np.sqrt(2_500))
        assert rows[name].std() == pytest.approx(own[name].std(), rel=0.08)
    scores, others = engine.Model(net).log_score(rows), engine.Model(net).log_score(own)
    assert scores.mean() == pytest.approx(others.mean(), abs=6 * others.std() / np.sqrt(2_500))


@settings(max_examples=60, deadline=None)
@given(st.lists(NAMES, min_size=4, max_size=4, unique=True), st.lists(NAMES, min_size=2, max_size=3, unique=True))
def test_hostile_names_come_out_as_they_went_in(names, levels):
    site, hours, score, passed = names
    sites = len(levels)
    even = np.full(sites, 1 / sites)
    nodes = [
        engine.Category(site, levels, [], even),
        engine.Number(hours, [site], [0.0] * sites, [], [1.0] * sites, [0.0]),
        engine.Number(score, [hours, site], [5.0] * sites, [[2.0]] * sites, [0.0] * sites),
        engine.Category(passed, levels, [hours], [even, even]),
    ]
    order = engine.Order([(name, [name]) for name in names])
    text = program(network(nodes), order, units={hours: levels[0]})
    found = drawn(text, 100)
    assert list(found) == names and set(found[passed]) <= set(levels)
    np.testing.assert_allclose(found[score], 5.0 + 2.0 * found[hours])


def test_a_program_with_hostile_names_prints_rows_that_read_back(tmp_path):
    sites = len(HOSTILE)
    nodes = [
        engine.Category("a,\n\"b'", HOSTILE, [], np.full(sites, 1 / sites)),
        engine.Number('"""', ["a,\n\"b'"], np.arange(sites), [], np.zeros(sites)),
    ]
    path = tmp_path / "program.py"
    path.write_text(program(network(nodes)), encoding="utf-8")
    done = subprocess.run([sys.executable, "-I", path, "200"], capture_output=True, cwd=tmp_path, timeout=60)
    assert done.returncode == 0 and done.stderr == b""
    first, *rows = csv.reader(io.StringIO(done.stdout.decode("utf-8"), newline=""))
    assert first == ["a,\n\"b'", '"""'] and len(rows) == 200
    assert all(HOSTILE[int(float(number))] == level for level, number in rows)


def test_a_number_is_written_with_its_line_for_each_combination_and_its_unit_where_it_is_known():
    text = program(network([RAIN, FLOW, WET, DEPTH]), units={"depth": "metres"})
    assert (
        """
# flow. A number; comes from rain.
number(
    'flow',
    categories=['rain'],
    numbers=[],
    centres=[],
    lines=[
        # each row: mean, standard deviation; rain
        [1, 1],  # no
        [5, 1.414],  # yes
    ],
    bands=[2.0, 4.0],
)
"""
        in text
    )
    assert (
        """
# depth. A number, in metres; comes from flow, rain.
number(
    'depth',
    categories=['rain'],
    numbers=['flow'],
    centres=[2],
    lines=[
        # each row: mean at the centres, slope of flow, standard deviation; rain
        [4.5, 2, 1],  # no
        [7, 3, 0],  # yes
    ],
)
"""
        in text
    )
    assert "        # each row: rain, flow\n        [0.9000, 0.1000],  # no, under 2\n" in text


def test_a_program_without_numbers_says_nothing_of_them():
    text = program(network([RAIN]))
    assert "number(" not in text and "centre" not in text
