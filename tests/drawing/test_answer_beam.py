"""The beam of the answer: marks where the shares are, labels that stay on the page, names escaped."""

from __future__ import annotations

import itertools
from xml.etree import ElementTree

import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.drawing.answer_beam import Mark, answer_beam, graduation
from app.drawing.scale import rounded_outward

RECORDED = Mark("recorded", "as recorded", "61%", 0.61, 0.59, 0.63)
AMONG = Mark("among", "among these", "54%", 0.54, 0.51, 0.57)
SET = Mark("set", "if set", "63%", 0.63, 0.58, 0.68)


def beam(*marks, **more):
    return ElementTree.fromstring(answer_beam(marks, "Passed.", **more))


def labels(drawing):
    """(words, share it hangs on, side, class) of every label; the figures of the axis are left out."""
    return [
        ("".join(text.itertext()), holder.get("x"), "left" if text.get("text-anchor") else "right", text.get("class"))
        for holder in drawing.iter("svg")
        for text in holder.findall("text")
        if holder is not drawing
    ]


def test_ends_stand_on_the_interval_over_sampled_models_and_the_heavy_line_is_within_the_model():
    drawing = beam(Mark("set", "if set", "63%", 0.63, 0.55, 0.71, (0.58, 0.68)))
    lines = [node for node in drawing.iter("line") if node.get("stroke") == "#1B1E22" and not node.get("class")]
    level = [(node.get("x1"), node.get("x2"), node.get("stroke-width")) for node in lines if node.get("y1") == "16"]
    ends = [node.get("x1") for node in lines if (node.get("y1"), node.get("y2")) == ("11", "21")]
    assert level == [("55.00%", "71.00%", "1"), ("58.00%", "68.00%", "2.5")]
    assert ends == ["55.00%", "71.00%"]


@pytest.mark.parametrize(
    ("marks", "height"), [((RECORDED,), 76), ((RECORDED, AMONG), 106), ((RECORDED, AMONG, SET), 138)]
)
def test_each_world_has_a_row(marks, height):
    assert beam(*marks).get("height") == str(height)


def test_each_world_has_its_shape_at_its_share():
    drawing = beam(RECORDED, AMONG, SET)
    places = {child[0].tag: child.get("x") for child in drawing.findall("svg") if child[0].tag != "text"}
    assert places == {"rect": "61.00%", "circle": "54.00%", "path": "63.00%"}


def test_the_two_that_are_compared_are_joined():
    drawing = beam(RECORDED, AMONG, SET, compared=("among", "set"))
    filled = [node for node in drawing.findall("rect") if node.get("fill-opacity")]
    assert [(node.get("x"), node.get("width"), node.get("y")) for node in filled] == [("54.00%", "9.00%", "48")]


def test_a_label_stands_right_unless_it_would_run_past_the_end():
    assert labels(beam(RECORDED))[0][1:] == ("63.00%", "right", "wide")
    assert labels(beam(RECORDED))[1][1:] == ("59.00%", "left", "slim")
    assert labels(beam(SET))[0][1:] == ("68.00%", "right", None)
    low = Mark("recorded", "as recorded", "12%", 0.12, 0.1, 0.14)
    assert labels(beam(low))[0][1:] == ("14.00%", "right", None)


def test_a_label_keeps_clear_of_the_stem_of_a_mark_above():
    low = Mark("recorded", "as recorded", "61%", 0.61, 0.6, 0.62)
    under = Mark("among", "among these", "45%", 0.45, 0.44, 0.46)
    wide = [(place, side) for _, place, side, shown in labels(beam(low, under)) if shown != "slim"]
    assert wide == [("62.00%", "right"), ("44.00%", "left")]
    free = Mark("recorded", "as recorded", "80%", 0.8, 0.79, 0.81)
    assert ("46.00%", "right") in [place[1:3] for place in labels(beam(free, under))]


def test_a_label_crossed_on_both_sides_starts_past_the_nearer_stem_with_room():
    marks = [
        Mark("recorded", "as recorded", "61%", 0.61, 0.6, 0.62),
        Mark("among", "among these", "45%", 0.45, 0.43, 0.47),
        Mark("set", "if set", "52%", 0.52, 0.5, 0.54),
    ]
    assert ("45.00%", "left") in [place[1:3] for place in labels(beam(*marks)) if "if set" in place[0]]
    far = [Mark("recorded", "as recorded", "56%", 0.56, 0.55, 0.57), *marks[1:]]
    assert [place[1:3] for place in labels(beam(*far)) if "if set" in place[0] and place[3] != "slim"] == [
        ("56.00%", "right")
    ]


@given(st.lists(st.tuples(st.floats(0, 1), st.floats(0, 0.2)), min_size=3, max_size=3))
def test_no_label_is_struck_through_where_a_side_has_room(ends):
    marks = [
        Mark(world, world, "1%", share, max(0.0, share - half), min(1.0, share + half))
        for world, (share, half) in zip(("recorded", "among", "set"), ends, strict=True)
    ]
    for row, mark in enumerate(marks):
        stems = [round(100 * other.point, 2) for other in marks[:row]]
        for words, place, side, shown in labels(beam(*marks)):
            if not words.startswith(mark.world) or shown == "slim":
                continue
            at, sign = float(place.removesuffix("%")), 1 if side == "right" else -1
            edge = 100 * (mark.high if sign > 0 else mark.low)
            struck = any(0.01 < sign * (stem - at) < 22.9 for stem in stems)
            assert not struck or (abs(at - edge) < 0.01 and no_room(mark, stems))


def no_room(mark, stems):
    """Whether neither side has 23 % free of stems and ends, past the whisker."""
    free = [0.0, *sorted(stems), 100.0]
    gaps = [(max(low, 100 * mark.high), high) for low, high in itertools.pairwise(free)]
    gaps += [(low, min(high, 100 * mark.low)) for low, high in itertools.pairwise(free)]
    return all(high - low < 23.1 for low, high in gaps)


def test_where_a_narrow_page_is_too_tight_it_gets_the_figure_alone():
    tight = Mark("among", "among these", "55%", 0.5, 0.4, 0.6)
    assert [(words, shown) for words, _, _, shown in labels(beam(tight))] == [
        ("among these 55%", "wide"),
        ("55%", "slim"),
    ]


def test_a_point_has_no_whisker():
    sure = Mark("set", "if set", "63%", 0.63, 0.63, 0.63)
    assert not [node for node in beam(sure).findall("line") if node.get("stroke-width") == "2.5"]


def test_the_rule_runs_from_none_to_all():
    figures = [node.text for node in ElementTree.fromstring(f"<svg>{graduation(104)}</svg>").iter("text")]
    assert figures == ["0%", "10", "20", "30", "40", "50", "60", "70", "80", "90", "100%"]


@given(st.text(alphabet=st.characters(exclude_categories=("Cs", "Cc"))))
def test_a_hostile_name_is_text_in_the_drawing(name):
    drawing = ElementTree.fromstring(answer_beam([RECORDED], f"{name}: <b>&\"'"))
    assert drawing.get("aria-label") == f"{name}: <b>&\"'".replace("\t", " ")


@pytest.mark.parametrize("unit", ["", " min", " minutes", " hours of every week"])
@pytest.mark.parametrize(("low", "high"), [(3.0, 119.0), (0.4, 28.7), (-3.0, 8.0), (41_000.0, 99_000.0), (0.11, 0.32)])
def test_no_figure_runs_into_the_last_one_and_its_unit(low, high, unit):
    for width, letter in ((620.0, 7.4), (328.0, 7.4)):
        drawn = ElementTree.fromstring(f"<g>{graduation(40, rounded_outward(low, high, (), unit))}</g>")
        texts = [text for text in drawn.iter("text") if width > 600 or "t10" not in text.get("class").split()]
        *others, last = texts
        assert last.text.endswith(unit) and last.get("text-anchor") == "end" and len(texts) > 1
        starts = width - letter * len(last.text)
        for text in others:
            half = len(text.text) * letter * (1.0 if text.get("text-anchor") == "start" else 0.5)
            assert width * float(text.get("x").rstrip("%")) / 100 + half < starts


def test_a_unit_is_text_and_never_markup():
    drawn = graduation(40, rounded_outward(0.0, 10.0, (), " </text><script>"))
    assert "<script>" not in drawn and "10 &lt;/text&gt;&lt;script&gt;" in drawn
