"""The strip of a number: one scale for all curves, cuts, spikes and means, and nothing that a reader could break."""

from __future__ import annotations

from xml.etree import ElementTree

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.drawing.scale import rounded_outward
from app.drawing.strip import POINTS, Curve, places, strip

SCALE = rounded_outward(0.0, 30.0)


def normal(mean, sd):
    return np.exp(-0.5 * ((places(SCALE) - mean) / sd) ** 2) / sd


def curve(world, mean, sd=4.0, spikes=(), low=None, high=None):
    density = normal(mean, sd) if sd else np.zeros(POINTS)
    return Curve(world, density, spikes, mean, mean if low is None else low, mean if high is None else high)


def drawn(curves, cuts=()):
    return ElementTree.fromstring(strip(curves, cuts, SCALE))


def heights(path):
    numbers = path.get("d").removeprefix("M").split()
    return [float(each) for each in numbers[1::2]]


def test_curves_share_one_scale_and_the_tallest_is_forty_high():
    paths = [
        path
        for path in drawn([curve("recorded", 12), curve("among", 15, 2.0)]).iter("path")
        if path.get("fill") == "none"
    ]
    recorded, among = (min(heights(path)) for path in paths)
    assert among == 4.0 and recorded == pytest.approx(24.0, abs=0.3)


def test_each_world_has_its_stroke_and_only_among_is_filled():
    paths = list(drawn([curve("recorded", 12), curve("among", 15), curve("set", 18)]).iter("path"))
    assert [path.get("fill") for path in paths] == ["#0072B2", "none", "none", "none", "#D55E00"]
    assert [path.get("stroke-dasharray") for path in paths[1:4]] == [None, None, "6 2.5"]
    assert {path.get("vector-effect") for path in paths[1:4]} == {"non-scaling-stroke"}


def test_cuts_are_dotted_and_those_beyond_the_axis_are_left_out():
    dotted = [
        line.get("x1")
        for line in drawn([curve("recorded", 12)], (6, 15, 45)).iter("line")
        if line.get("stroke-dasharray")
    ]
    assert dotted == ["20%", "50%"]


def test_a_value_that_all_have_is_a_line_as_high_as_their_share():
    drawing = drawn([curve("recorded", 12), curve("set", 18, 0, [(18.0, 0.6), (3.0, 0.001)])])
    spikes = [line for line in drawing.iter("line") if line.get("stroke") == "#D55E00"]
    assert [(line.get("x1"), line.get("y2")) for line in spikes] == [("60%", "20.0")]


def test_means_have_whiskers_but_not_as_recorded():
    drawing = drawn([curve("recorded", 12, low=11, high=13), curve("among", 15, low=12, high=18), curve("set", 18)])
    assert [disc.get("cy") for disc in drawing.iter("circle")] == ["52"]
    whiskers = [line for line in drawing.iter("line") if line.get("stroke-width") == "2.5"]
    assert [(line.get("x1"), line.get("x2"), line.get("y1")) for line in whiskers] == [("40%", "60%", "52")]


@given(st.lists(st.floats(0, 1e6), min_size=POINTS, max_size=POINTS), st.floats(-1e9, 1e9))
def test_any_curve_stays_inside_its_strip(density, mean):
    drawing = drawn([Curve("among", np.array(density), [], mean, mean, mean)])
    for path in drawing.iter("path"):
        if path.get("fill") == "none":
            assert all(3.9 <= y <= 44.0 for y in heights(path))
    assert all(0 <= float(disc.get("cx").removesuffix("%")) <= 100 for disc in drawing.iter("circle"))
