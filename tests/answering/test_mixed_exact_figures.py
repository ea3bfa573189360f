"""The exact route through worlds with numbers against figures from outside, each source beside its figures."""

import numpy as np
import pytest

from engine.answering.exact_mixed import plan
from engine.answering.mixed import MixedWorld
from engine.network.nodes import Category, Number
from tests.answering.mixed_generated import own_parameters


def read(nodes, watch, pins=None, values=None, ranges=None):
    world = MixedWorld(tuple(nodes), pins or {}, values or {}, ranges or {}, tuple(watch))
    return plan(world).read(world, own_parameters(world), 0)


def is_mean_and_sd(mixture, mean, sd):
    assert (mixture.means[0], mixture.sds[0]) == pytest.approx((mean, sd), abs=1e-9)


# Lauritzen 1992, Propagation of probabilities, means and variances in mixed graphical association models, JASA 87.
INCINERATOR = (
    Category("filter", ["intact", "defective"], [], [0.95, 0.05]),
    Category("waste", ["industrial", "household"], [], [2 / 7, 5 / 7]),
    Category("burning", ["stable", "unstable"], [], [0.85, 0.15]),
    Number("metal in", ["waste"], [0.5, -0.5], (), [0.01, 0.005]),
    Number("efficiency", ["filter", "waste"], [[-3.9, -3.2], [-0.4, -0.5]], (), [[2e-5, 2e-5], [1e-4, 1e-4]]),
    Number(
        "dust",
        ["burning", "waste", "efficiency"],
        [[6.5, 6.0], [7.5, 7.0]],
        [[[1.0], [1.0]], [[1.0], [1.0]]],
        [[0.03, 0.04], [0.1, 0.1]],
    ),
    Number("carbon dioxide", ["burning"], [-2.0, -1.0], (), [0.1, 0.3]),
    Number("light", ["dust"], 3.0, [-0.5], 0.25),
    Number("metal out", ["dust", "metal in"], 0.0, [1.0, 1.0], 0.002),
)


@pytest.mark.parametrize(
    ("column", "mean", "sd"),
    [
        ("metal in", -0.214285714286, 0.458813910079),
        ("efficiency", -3.25357142857, 0.708880275433),
        ("dust", 3.03928571429, 0.770005976653),
        ("carbon dioxide", -1.85, 0.507444578255),
        ("light", 1.48035714286, 0.631052534279),
        ("metal out", 2.825, 0.860298370168),
    ],
)
def test_the_emissions_of_the_incinerator_are_as_published(column, mean, sd):
    is_mean_and_sd(read(INCINERATOR, [column]).numbers[column], mean, sd)


def test_three_facts_about_the_incinerator_are_taken_as_published():
    facts = {"light": 1.1, "carbon dioxide": -0.9}
    watch = ["filter", "burning", "efficiency", "dust", "metal in", "metal out"]
    found = read(INCINERATOR, watch, {"waste": frozenset([0])}, facts)
    assert found.shares["filter"][1, 0] == pytest.approx(0.000473727784743, abs=1e-10)
    assert found.shares["burning"][1, 0] == pytest.approx(0.987747240181, abs=1e-10)
    is_mean_and_sd(found.numbers["efficiency"], -3.89833821371, 0.0762856452802)
    is_mean_and_sd(found.numbers["dust"], 3.60766660992, 0.325851024051)
    is_mean_and_sd(found.numbers["metal in"], 0.5, 0.1)
    is_mean_and_sd(found.numbers["metal out"], 4.10766660992, 0.343771566415)


# Wright 1934, The method of path coefficients, Annals of Mathematical Statistics 5 (the rules; invented coefficients).
PATHS = (
    Number("s"),
    Number("t", ["s"], 0.0, [0.5], 0.75),
    Number("m", ["s", "t"], 0.0, [0.4, 0.3], 0.63),
    Number("y", ["t", "m"], 0.0, [-0.2, 0.6], 0.72),
)


def test_a_seen_number_moves_others_by_the_sum_over_open_paths():
    found = read(PATHS, ["s", "m", "y"], values={"t": 2.0})
    is_mean_and_sd(found.numbers["m"], 1.0, 0.866025403784)
    is_mean_and_sd(found.numbers["y"], 0.2, 0.994987437107)
    is_mean_and_sd(found.numbers["s"], 1.0, 0.866025403784)


# A number through its bands: closed form with the normal distribution function (invented network).
TEMPERATURE = Number("temperature", [], 50.0, (), 100.0, (45.0, 60.0))
DEFECT = Category("defect", ["no", "yes"], ["temperature"], [[0.95, 0.05], [0.8, 0.2], [0.4, 0.6]])
COST = Number("cost", ["defect", "temperature"], [5.0, 20.0], [[0.1], [0.3]], [4.0, 9.0])


def test_what_follows_through_bands_is_a_cut_normal():
    found = read((TEMPERATURE, DEFECT, COST), ["defect", "cost"])
    assert found.shares["defect"][1, 0] == pytest.approx(0.217181470764, abs=1e-9)
    is_mean_and_sd(found.numbers["cost"], 15.7287329467, 11.5648682491)
    quantiles = [found.numbers["cost"].quantile(q)[0] for q in (0.05, 0.5, 0.95)]
    assert quantiles == pytest.approx([6.44582881959, 10.592920653, 40.1034939141], abs=1e-8)


def test_a_category_tells_of_the_number_behind_it():
    found = read((TEMPERATURE, DEFECT, COST), ["temperature", "cost"], {"defect": frozenset([1])})
    assert np.exp(found.log_evidence[0]) == pytest.approx(0.217181470764, abs=1e-10)
    is_mean_and_sd(found.numbers["temperature"], 56.8881607762, 9.21742272179)
    is_mean_and_sd(found.numbers["cost"], 37.0664482328, 4.08000972387)


def test_a_range_may_lie_across_a_cut():
    found = read((TEMPERATURE, DEFECT, COST), ["defect", "cost"], ranges={"temperature": (55.0, 65.0)})
    assert np.exp(found.log_evidence[0]) == pytest.approx(0.241730337457, abs=1e-10)
    assert found.shares["defect"][1, 0] == pytest.approx(0.351984320427, abs=1e-9)
    is_mean_and_sd(found.numbers["cost"], 20.46067104, 13.2705269806)


@pytest.mark.parametrize(("value", "share"), [(60.0, 0.6), (59.999, 0.2)])
def test_a_value_on_a_cut_lies_above_it(value, share):
    found = read((TEMPERATURE, DEFECT, COST), ["defect"], values={"temperature": value})
    assert found.shares["defect"][1, 0] == pytest.approx(share, abs=1e-12)


def test_a_value_tells_of_the_band_behind_it():
    found = read((TEMPERATURE, DEFECT, COST), ["defect", "temperature"], values={"cost": 24.0})
    assert found.shares["defect"][1, 0] == pytest.approx(0.99999873773, abs=1e-9)
    is_mean_and_sd(found.numbers["temperature"], 32.9865996404, 8.12158923713)


@pytest.mark.parametrize(
    ("value", "slope", "reach", "share", "mean", "sd"),
    [
        (-5.0, 1.0, 1.0, 0.151722880508, 13.3646458928, 9.80450610526),
        (-5.0, 1.0, 0.5, 0.184452175636, 14.5466894198, 10.785846545),
        (44.0, 0.0, 1.0, 0.05, 10.59, 5.58174703834),
    ],
    ids=["shifted", "shifted for half", "fixed"],
)
def test_a_set_copy_that_follows_exactly_acts_through_its_own_bands(value, slope, reach, share, mean, sd):
    copied = (
        TEMPERATURE,
        Category("takes", ["no", "yes"], [], [1.0 - reach, reach]),
        Number("set", ["takes", "temperature"], [0.0, value], [[1.0], [slope]], [0.0, 0.0], (45.0, 60.0)),
        Category("defect", ["no", "yes"], ["set"], DEFECT.table),
        Number("cost", ["defect", "set"], COST.intercept, COST.slopes, COST.variance),
    )
    found = read(copied, ["defect", "cost"])
    assert found.shares["defect"][1, 0] == pytest.approx(share, abs=1e-9)
    is_mean_and_sd(found.numbers["cost"], mean, sd)
