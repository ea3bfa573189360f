"""Likelihood weighting against closed forms, within its own standard errors."""

import math
from concurrent.futures import ThreadPoolExecutor

import numpy as np
import pytest
from scipy.stats import multivariate_normal, norm

from engine.answering.mixed import MixedWorld
from engine.answering.tallies import calmed
from engine.answering.weighting import weigh, weigh_together
from engine.network.drawn import drawn
from engine.network.nodes import Category, Number

INF = math.inf


def world(nodes, watch, pins=None, values=None, ranges=None):
    return MixedWorld(
        tuple(nodes),
        {name: frozenset(at) for name, at in (pins or {}).items()},
        values or {},
        ranges or {},
        tuple(watch),
    )


def read(nodes, watch, count=0, seed=0, particles=20_000, most=0, **seen):
    return weigh(world(nodes, watch, **seen), drawn_of(nodes, count), count, seed, particles, most)


def drawn_of(nodes, count):
    return {node.name: drawn(node, count, 3) for node in nodes}


def mean_sd(mixture, draw=0):
    return mixture.means[draw], mixture.sds[draw]


def beside(found, truth, error):
    """Within four standard errors, and what adding many figures leaves."""
    assert abs(found - truth) <= 4.0 * error + 1e-9, (found, truth, error)


SHIFT = Category("shift", ["day", "night"], (), [0.7, 0.3])
HOURS = Number("hours", ("shift",), [5.0, 8.0], [[], []], [4.0, 1.0], bands=(4.0, 6.0, 8.0))
SCORE = Number("score", ("shift", "hours"), [10.0, 12.0], [[2.0], [1.0]], [9.0, 16.0], bands=(20.0,))
PASSED = Category("passed", ["no", "yes"], ("score",), [[0.8, 0.2], [0.3, 0.7]])
SCHOOL = (SHIFT, HOURS, SCORE, PASSED)


def test_without_anything_seen_the_evidence_is_certain_and_shares_are_the_table():
    found = read(SCHOOL, ["shift", "hours"])
    assert np.array_equal(found.log_evidence, [0.0])
    assert np.allclose(found.shares["shift"][:, 0], [0.7, 0.3], atol=1e-12)
    assert found.error["shift"] < 1e-12
    assert found.effective == 20_000


def test_a_number_is_read_with_its_mean_sd_and_bands():
    found = read(SCHOOL, ["hours"])
    mean, sd = mean_sd(found.numbers["hours"])
    truth = 0.7 * 5.0 + 0.3 * 8.0
    true_sd = math.sqrt(0.7 * (4.0 + 25.0) + 0.3 * (1.0 + 64.0) - truth**2)
    beside(mean, truth, found.error["hours"] * sd)
    assert abs(sd - true_sd) < 0.05
    cuts = np.array([-INF, 4.0, 6.0, 8.0, INF])
    shares = 0.7 * np.diff(norm.cdf(cuts, 5.0, 2.0)) + 0.3 * np.diff(norm.cdf(cuts, 8.0, 1.0))
    assert np.abs(found.shares["hours"][:, 0] - shares).max() < 0.01


def test_what_is_put_together_keeps_the_distribution():
    """Cells of normals, not single particles: the share below any value is as the model has it."""
    found = read(SCHOOL, ["score"], particles=50_000).numbers["score"]
    assert found.weight.shape[0] <= 256
    grid = np.linspace(10.0, 35.0, 26)
    below = (found.weight[:, 0] * norm.cdf((grid[:, None] - found.mean[:, 0]) / found.sd[:, 0])).sum(axis=1)
    truth = 0.7 * norm.cdf(grid, 20.0, 5.0) + 0.3 * norm.cdf(grid, 20.0, math.sqrt(17.0))
    assert np.abs(below - truth).max() < 0.004


def test_a_pinned_value_weighs_by_its_density():
    found = read(SCHOOL, ["shift"], values={"hours": 8.0})
    each = np.array([0.7 * norm.pdf(8.0, 5.0, 2.0), 0.3 * norm.pdf(8.0, 8.0, 1.0)])
    beside(found.shares["shift"][1, 0], each[1] / each.sum(), found.error["shift"])
    assert abs(found.log_evidence[0] - math.log(each.sum())) < 0.02


def test_a_value_downstream_moves_a_number_as_a_joint_normal_says():
    nodes = (
        Number("a", (), 1.0, [], 4.0, bands=(0.0, 2.0)),
        Number("b", ("a",), 0.5, [2.0], 9.0),
        Number("c", ("b",), -1.0, [0.5], 1.0),
    )
    found = read(nodes, ["a", "b", "c"], values={"c": 3.0})
    mean = np.array([1.0, 2.5, 0.25])
    cov = np.array([[4.0, 8.0, 4.0], [8.0, 25.0, 12.5], [4.0, 12.5, 7.25]])
    assert abs(found.log_evidence[0] - multivariate_normal.logpdf(3.0, 0.25, 7.25)) < 0.03
    for place, name in enumerate("ab"):
        truth = mean[place] + cov[place, 2] / 7.25 * 2.75
        true_sd = math.sqrt(cov[place, place] - cov[place, 2] ** 2 / 7.25)
        found_mean, found_sd = mean_sd(found.numbers[name])
        beside(found_mean, truth, found.error[name] * found_sd)
        assert abs(found_sd / true_sd - 1.0) < 0.04
    assert mean_sd(found.numbers["c"]) == (3.0, 0.0)


@pytest.mark.parametrize("seen", [{"pins": {"hours": [1]}}, {"ranges": {"hours": (4.0, 6.0)}}])
def test_a_band_and_the_same_range_keep_a_number_inside(seen):
    found = read(SCHOOL, ["shift", "hours", "passed"], **seen)
    inside = np.array([np.diff(norm.cdf([4.0, 6.0], 5.0, 2.0))[0], np.diff(norm.cdf([4.0, 6.0], 8.0, 1.0))[0]])
    each = np.array([0.7, 0.3]) * inside
    beside(found.shares["shift"][0, 0], each[0] / each.sum(), found.error["shift"])
    assert abs(found.log_evidence[0] - math.log(each.sum())) < 0.02
    assert np.allclose(found.shares["hours"][:, 0], [0.0, 1.0, 0.0, 0.0])
    below = found.numbers["hours"].below([4.0, 5.0, 6.0])[:, 0]
    at_five = each @ (np.diff(norm.cdf([[4.0, 5.0]] * 2, [[5.0], [8.0]], [[2.0], [1.0]]))[:, 0] / inside) / each.sum()
    assert below[0] == 0.0 and below[2] == 1.0
    assert abs(below[1] - at_five) < 0.01


def test_bands_apart_keep_a_number_out_of_the_middle():
    found = read([Number("hours", (), 5.0, [], 4.0, bands=(4.0, 6.0))], ["hours"], pins={"hours": [0, 2]})
    outside = norm.cdf(4.0, 5.0, 2.0) + norm.sf(6.0, 5.0, 2.0)
    assert abs(found.log_evidence[0] - math.log(outside)) < 1e-12
    assert found.shares["hours"][1, 0] == 0.0
    assert abs(found.shares["hours"][0, 0] - 0.5) < 0.02


def test_several_levels_pinned_weigh_by_their_share():
    nodes = (
        SHIFT,
        Category("mark", ["low", "middle", "high"], ("shift",), [[0.5, 0.3, 0.2], [0.1, 0.3, 0.6]]),
        Category("goes on", ["no", "yes"], ("mark",), [[0.9, 0.1], [0.5, 0.5], [0.2, 0.8]]),
    )
    found = read(nodes, ["shift", "mark", "goes on"], pins={"mark": [1, 2]})
    joint = np.array([[0.21, 0.14], [0.09, 0.18]])
    assert abs(found.log_evidence[0] - math.log(joint.sum())) < 0.02
    beside(found.shares["shift"][1, 0], joint[1].sum() / joint.sum(), found.error["shift"])
    beside(found.shares["mark"][2, 0], joint[:, 1].sum() / joint.sum(), found.error["mark"])
    truth = (joint.sum(axis=0) @ [0.5, 0.8]) / joint.sum()
    beside(found.shares["goes on"][1, 0], truth, found.error["goes on"])
    assert found.shares["mark"][0, 0] == 0.0


def test_a_category_follows_a_number_through_its_bands():
    found = read(SCHOOL, ["passed"])
    over = 0.7 * norm.sf(20.0, 20.0, 5.0) + 0.3 * norm.sf(20.0, 20.0, math.sqrt(17.0))
    beside(found.shares["passed"][1, 0], 0.2 + 0.5 * over, found.error["passed"])


def test_a_set_copy_with_reach_keeps_its_single_value():
    """Set to 9 for 80 %: a value on which no noise may lie, and the natural value for the others."""
    nodes = (
        Number("hours", (), 5.0, [], 4.0, bands=(6.0,)),
        Category("hours taken", ["no", "yes"], (), [0.2, 0.8]),
        Number("hours set", ("hours taken", "hours"), [0.0, 9.0], [[1.0], [0.0]], [0.0, 0.0], bands=(6.0,)),
        Category("passed", ["no", "yes"], ("hours set",), [[0.8, 0.2], [0.3, 0.7]]),
    )
    found = read(nodes, ["hours set", "passed"])
    natural = norm.sf(6.0, 5.0, 2.0)
    beside(found.shares["passed"][1, 0], 0.2 + 0.5 * (0.8 + 0.2 * natural), found.error["passed"])
    mixture = found.numbers["hours set"]
    certain = (mixture.sd[:, 0] == 0.0) & (np.abs(mixture.mean[:, 0] - 9.0) < 1e-9)
    assert abs(mixture.weight[certain, 0].sum() - 0.8) < 0.02


def test_a_value_that_follows_exactly_must_be_met():
    nodes = (
        Category("taken", ["no", "yes"], (), [0.25, 0.75]),
        Number("set", ("taken",), [1.0, 2.0], [[], []], [0.0, 0.0], bands=(1.5,)),
    )
    met = read(nodes, ["taken"], values={"set": 2.0})
    assert np.allclose(met.shares["taken"][:, 0], [0.0, 1.0])
    assert abs(met.log_evidence[0] - math.log(0.75)) < 0.02
    assert read(nodes, ["taken"], values={"set": 1.7}).log_evidence[0] == -INF
    in_band = read(nodes, ["taken", "set"], ranges={"set": (0.0, 1.5)})
    assert np.allclose(in_band.shares["taken"][:, 0], [1.0, 0.0])
    assert mean_sd(in_band.numbers["set"]) == (1.0, 0.0)


def test_what_cannot_be_has_no_evidence_and_no_shares():
    nodes = (Category("a", ["x", "y"], (), [1.0, 0.0]), Category("b", ["x", "y"], ("a",), [[1.0, 0.0], [0.5, 0.5]]))
    found = read(nodes, ["a"], count=3, pins={"b": [1]})
    assert np.all(found.log_evidence == -INF)
    assert np.isnan(found.shares["a"]).all()
    assert found.effective == 0.0


def test_probabilities_down_to_the_smallest_do_not_underflow():
    nodes = [Category("cause", ["no", "yes"], (), [0.5, 0.5])]
    for place in range(10):
        table = [[1.0 - 1e-30, 1e-30], [1.0 - 2e-30, 2e-30]]
        nodes.append(Category(f"sign {place}", ["no", "yes"], ("cause",), table))
    found = read(nodes, ["cause"], pins={f"sign {place}": [1] for place in range(10)})
    truth = 10 * math.log(1e-30) + math.log(0.5 * (1.0 + 1024.0))
    assert abs(found.log_evidence[0] - truth) < 0.05
    assert abs(found.shares["cause"][1, 0] - 1024.0 / 1025.0) < 1e-4
    tail = read([Number("far", (), 0.0, [], 1.0)], ["far"], ranges={"far": (40.0, INF)})
    assert abs(tail.log_evidence[0] - norm.logsf(40.0)) < 1e-9
    assert abs(mean_sd(tail.numbers["far"])[0] - 40.02494) < 1e-3


def test_rare_evidence_is_read_within_two_stated_errors_in_nearly_all_seeds():
    """Two causes of a sign that one record in a thousand shows."""
    prior = np.outer([0.9, 0.1], [0.8, 0.2])
    sign = np.array([[0.0001, 0.002], [0.001, 0.0197]])
    joint = prior * sign
    assert abs(joint.sum() - 1e-3) < 1e-4
    nodes = (
        Category("a", ["no", "yes"], (), [0.9, 0.1]),
        Category("b", ["no", "yes"], (), [0.8, 0.2]),
        Category("sign", ["no", "yes"], ("a", "b"), np.stack([1.0 - sign, sign], axis=-1)),
    )
    truth = joint[1].sum() / joint.sum()
    within = 0
    for seed in range(200):
        found = read(nodes, ["a"], seed=seed, particles=4000, pins={"sign": [1]})
        within += abs(found.shares["a"][1, 0] - truth) <= 2.0 * found.error["a"]
    assert 184 <= within < 200


def test_a_rare_range_downstream_is_read_within_two_stated_errors_in_nearly_all_seeds():
    """b > 4.37 once in a thousand, and mostly because of a."""
    nodes = (Number("a", (), 0.0, [], 1.0), Number("b", ("a",), 0.0, [1.0], 1.0))
    over = 4.37 / math.sqrt(2.0)
    truth = norm.pdf(over) / norm.sf(over) / math.sqrt(2.0)
    within = 0
    for seed in range(200):
        found = read(nodes, ["a"], seed=seed, particles=4000, ranges={"b": (4.37, INF)})
        mean, sd = mean_sd(found.numbers["a"])
        within += abs(mean - truth) <= 2.0 * found.error["a"] * sd
    assert 184 <= within < 200


def uncertain(seed=0):
    rng = np.random.default_rng(seed)
    nodes = []
    for place in range(6):
        parents = [f"c{before}" for before in range(max(0, place - 2), place)]
        dirichlet = rng.gamma(1.0, 30.0, (2,) * (len(parents) + 1)) + 1.0
        table = dirichlet / dirichlet.sum(axis=-1, keepdims=True)
        nodes.append(Category(f"c{place}", ["no", "yes"], tuple(parents), table, dirichlet=dirichlet))
    return nodes


def truth_of(nodes, tables, watch, pins):
    """(levels, draws) by summing the whole joint."""
    joint = np.ones((2,) * len(nodes) + (1,))
    names = [node.name for node in nodes]
    for node in nodes:
        table = tables[node.name]
        axes = [names.index(name) for name in (*node.parents, node.name)]
        order = np.argsort(axes)
        shape = [1] * len(nodes) + [table.shape[-1]]
        for axis in axes:
            shape[axis] = 2
        joint = joint * np.transpose(table, (*order, len(axes))).reshape(shape)
    for name, kept in pins.items():
        seen = np.isin(np.arange(2), kept).astype(float)
        joint = joint * seen.reshape([2 if other == name else 1 for other in names] + [1])
    found = joint.sum(axis=tuple(place for place, name in enumerate(names) if name != watch))
    return found / found.sum(axis=0)


def test_draws_spread_as_the_exact_ones_once_calmed():
    nodes, count = uncertain(), 200
    tables = drawn_of(nodes, count)
    here = world(nodes, ["c1", "c5"], pins={"c3": [1]})
    found = weigh(here, tables, count, 1, 40_000, 0)
    for name in here.watch:
        exact = truth_of(nodes, tables, name, {"c3": [1]})
        beside(found.shares[name][1, 0], exact[1, 0], found.error[name])
        assert abs(found.shares[name][1, 1:].std() / exact[1, 1:].std() - 1.0) < 0.25
        assert abs(found.shares[name][1, 1:].mean() - exact[1, 1:].mean()) < 0.01
        assert np.allclose(found.shares[name].sum(axis=0), 1.0)


def test_calming_takes_out_the_noise_and_no_more():
    rng = np.random.default_rng(5)
    true = rng.normal(0.0, 2.0, (1, 4000))
    noisy = true + rng.normal(0.0, 1.5, true.shape)
    assert abs(calmed(noisy, np.full(true.shape, 1.5**2)).std() / 2.0 - 1.0) < 0.03
    assert np.array_equal(calmed(true, np.zeros(true.shape)), true)
    assert np.ptp(calmed(noisy, np.full(true.shape, 100.0))) == 0.0


def test_columns_that_no_lever_reaches_read_the_same_in_every_world_to_the_last_digit():
    nodes = uncertain()
    lever = Category("c2 set", ["no", "yes"], ("c2",), [[0.2, 0.8], [0.0, 1.0]])
    late = [
        Category(n.name, n.levels, tuple("c2 set" if p == "c2" else p for p in n.parents), n.table, n.dirichlet)
        for n in nodes[3:]
    ]
    tables = {**drawn_of(nodes, 20), "c2 set": drawn(lever, 20, 0)}
    among, moved = weigh_together(
        [
            (world(nodes, ["c0", "c1", "c5"], pins={"c1": [0]}), tables),
            (world([*nodes[:3], lever, *late], ["c0", "c1", "c5"], pins={"c1": [0]}), tables),
        ],
        20,
        7,
        4000,
        16_000,
    )
    for name in ("c0", "c1"):
        assert np.array_equal(among.shares[name], moved.shares[name])
    assert np.array_equal(among.log_evidence, moved.log_evidence)
    assert not np.array_equal(among.shares["c5"], moved.shares["c5"])


def test_a_change_has_less_noise_than_two_worlds_read_apart():
    def worlds(seed):
        return [
            read(
                (
                    *SCHOOL[:1],
                    Number("hours", ("shift",), np.add([5.0, 8.0], more), [[], []], [4.0, 1.0], bands=(4.0, 6.0)),
                    *SCHOOL[2:],
                ),
                ["passed"],
                seed=seed,
                particles=2000,
            )
            for more in (0.0, 0.5)
        ]

    found = [[one.shares["passed"][1, 0] for one in worlds(seed)] for seed in range(40)]
    changes = np.diff(found, axis=1)
    assert changes.std() < 0.5 * math.sqrt(2.0) * np.std(found, axis=0).mean()


def test_the_same_seed_gives_the_same_digits_also_in_many_threads():
    nodes = uncertain()
    here, tables = world(nodes, ["c5"], pins={"c3": [1]}), drawn_of(nodes, 10)
    with ThreadPoolExecutor(4) as pool:
        found = list(pool.map(lambda seed: weigh(here, tables, 10, seed, 4000, 8000), [1, 2, 1, 2, 1, 2]))
    for place in (0, 1):
        for other in found[place::2]:
            assert np.array_equal(found[place].shares["c5"], other.shares["c5"])
    assert not np.array_equal(found[0].shares["c5"], found[1].shares["c5"])


def test_more_particles_come_until_the_error_is_small_beside_the_interval():
    few = read(SCHOOL, ["passed"], particles=1000)
    more = read(SCHOOL, ["passed"], particles=1000, most=64_000)
    assert few.effective == 1000
    assert 1000 < more.effective < 64_000
    assert more.error["passed"] <= 0.002 < few.error["passed"]
    at_the_end = read(SCHOOL, ["shift"], particles=1000, most=8000, values={"score": 60.0})
    assert at_the_end.error["shift"] > 0.002


def test_a_large_table_is_read_by_its_rows_in_use():
    """More configurations than particles of a draw."""
    parents = [Category(f"p{place}", ["a", "b"], (), [0.5, 0.5]) for place in range(9)]
    rng = np.random.default_rng(2)
    table = rng.dirichlet([1.0, 1.0], (2,) * 9)
    number = Number("n", tuple(p.name for p in parents), rng.normal(size=(2,) * 9), variance=np.ones((2,) * 9))
    nodes = [*parents, Category("child", ["a", "b"], tuple(p.name for p in parents), table), number]
    found = read(nodes, ["child", "n"], count=40, particles=8000)
    beside(found.shares["child"][0, 0], table[..., 0].mean(), found.error["child"])
    assert np.abs(found.shares["child"][0, 1:] - table[..., 0].mean()).max() < 0.15
    mean, sd = mean_sd(found.numbers["n"])
    beside(mean, number.intercept.mean(), found.error["n"] * sd)
