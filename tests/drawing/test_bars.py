"""The bars of one value: three worlds told apart by order and shape, lengths in per cent, no style attribute."""

from __future__ import annotations

import re
from xml.etree import ElementTree

import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.drawing.bars import SEEN, SET, bars
from app.wording.estimates import Estimate as Bar

shares = st.floats(0, 1)


def shapes(drawing, tag):
    return [node for node in ElementTree.fromstring(drawing).iter(tag)]


def widths(drawing):
    return {node.get("fill"): node.get("width") for node in shapes(drawing, "rect")}


def test_without_pins_and_levers_only_the_hollow_bar_is_drawn():
    drawing = bars(0.22)
    assert widths(drawing) == {"none": "22%"}
    assert not shapes(drawing, "circle") and not shapes(drawing, "path")


def test_one_world_stands_in_the_middle_and_two_share_the_room():
    alone = [node.get("y") for node in shapes(bars(0.5, Bar(0.4, 0.3, 0.5)), "rect")]
    both = [node.get("y") for node in shapes(bars(0.5, Bar(0.4, 0.3, 0.5), Bar(0.6, 0.5, 0.7)), "rect")]
    assert alone == ["1", "9"] and both == ["1", "4.5", "14.5"]


def test_a_disc_ends_the_seen_bar_and_a_diamond_the_set_bar():
    drawing = bars(0.5, Bar(0.4, 0.3, 0.5), Bar(0.6, 0.5, 0.7))
    assert widths(drawing) == {"none": "50%", SEEN: "40%", SET: "60%"}
    assert [node.get("cx") for node in shapes(drawing, "circle")] == ["40%"]
    assert [node.get("fill") for node in shapes(drawing, "path")] == [SET]


@pytest.mark.parametrize("share", [0.0, 1.0])
def test_none_and_all_have_neither_whisker_nor_end_mark(share):
    drawing = bars(0.5, Bar(share, share, share), Bar(share, share, share))
    assert not shapes(drawing, "circle") and not shapes(drawing, "path")
    assert not [node for node in shapes(drawing, "line") if node.get("stroke-width") == "2.5"]


def test_the_whisker_spans_the_interval():
    whiskers = [node for node in shapes(bars(0.5, Bar(0.4, 0.31, 0.52)), "line") if node.get("stroke-width") == "2.5"]
    assert [(node.get("x1"), node.get("x2")) for node in whiskers] == [("31%", "52%")]


def test_over_sampled_models_a_light_whisker_runs_under_the_heavy_one():
    lines = [node for node in shapes(bars(0.5, Bar(0.4, 0.25, 0.6, (0.31, 0.52))), "line")]
    whiskers = [
        (node.get("stroke-width"), node.get("x1"), node.get("x2")) for node in lines if node.get("y1") == "13.5"
    ]
    assert whiskers == [("1", "25%", "60%"), ("2.5", "31%", "52%")]


@given(shares, st.tuples(shares, shares, shares), st.tuples(shares, shares, shares))
def test_every_length_is_a_presentation_attribute_inside_the_drawing(recorded, among, after):
    drawing = bars(recorded, Bar(*sorted(among)), Bar(*sorted(after)))
    ElementTree.fromstring(drawing)
    assert "style=" not in drawing
    assert all(0 <= float(each) <= 100 for each in re.findall(r'"([-\d.e]+)%"', drawing))
