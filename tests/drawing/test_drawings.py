"""Drawings: well formed, escaped, and true to the numbers they draw."""

from __future__ import annotations

import re
from xml.etree import ElementTree

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.drawing import arcs, beam, curve, histogram, svg
from app.drawing.arcs import Arc
from app.drawing.curve import Point

NAMES = st.text(
    st.characters(blacklist_categories=["Cs", "Cc", "Cn"]) | st.sampled_from("<>&\"'"), min_size=1, max_size=40
)


def parsed(drawing: str) -> ElementTree.Element:
    return ElementTree.fromstring(drawing)


@given(NAMES)
def test_a_name_in_a_drawing_is_text_and_never_markup(name: str) -> None:
    element = parsed(svg.tag("text", name, aria_label=name))
    assert element.text == name
    assert element.get("aria-label") == name
    assert list(element) == []


@given(st.lists(NAMES, min_size=2, max_size=5, unique=True))
def test_hostile_names_leave_the_arcs_well_formed(names: list[str]) -> None:
    links = [Arc(names[0], other, "nobody") for other in names[1:]]
    drawn = parsed(arcs.arcs([(names[0], names)], links, {name: f"?column={name}" for name in names}, names[-1]))
    assert sum(path.get("fill") == "none" and path.get("d", "").startswith("M196") for path in drawn) == len(links)
    assert {link.get("href") for link in drawn.iter("a")} == {f"?column={name}" for name in names}


def test_every_arc_runs_downward_and_its_stroke_says_who_settled_it() -> None:
    links = [Arc("a", "b", "your order"), Arc("a", "c", "the data"), Arc("b", "c", "nobody")]
    drawn = parsed(arcs.arcs([("First", ["a"]), ("Then", ["b", "c"])], links, dict.fromkeys("abc", "#")))
    found = [path for path in drawn.iter("path") if "A" in path.get("d", "")]
    for path in found:
        start, end = re.findall(r"196 (\d+)", path.get("d", ""))
        assert int(start) < int(end)
    assert sorted(str(path.get("stroke-dasharray")) for path in found) == ["10 4", "2 5", "None"]


def test_the_arcs_of_the_picked_column_are_in_ink_and_the_others_are_not() -> None:
    links = [Arc("a", "b", "your order"), Arc("a", "c", "your order")]
    drawn = parsed(arcs.arcs([("One", ["a", "b", "c"])], links, dict.fromkeys("abc", "#"), "b"))
    strokes = [path.get("stroke") for path in drawn.iter("path") if "A" in path.get("d", "")]
    assert strokes == [svg.FAR, svg.INK]
    assert [link.get("aria-current") for link in drawn.iter("a")] == [None, "true", None]


def test_an_arc_and_a_bar_are_as_wide_as_the_link_is_sure() -> None:
    links = [Arc("a", "b", "nobody", 0.0), Arc("a", "c", "your order", 0.5), Arc("b", "c", "the data", 1.0)]
    drawn = parsed(arcs.arcs([("One", ["a", "b", "c"])], links, dict.fromkeys("abc", "#")))
    widths = [path.get("stroke-width") for path in drawn.iter("path") if "A" in path.get("d", "")]
    assert widths == ["1", "2.5", "4"]
    assert [bar.get("width") for bar in parsed(arcs.support_bar(0.25)).iter("rect")] == ["25.00%"]


@pytest.mark.parametrize(("fraction", "at"), [(0.0, "0.00%"), (0.54, "54.00%"), (1.0, "100.00%"), (1.7, "100.00%")])
def test_the_weight_on_the_beam_stands_at_the_share_done(fraction: float, at: str) -> None:
    drawn = parsed(beam.progress(fraction, "Counting"))
    assert [weight.get("x") for weight in drawn.iter("svg") if weight.get("class") == "weight"] == [at]
    assert "Counting" in drawn.get("aria-label", "")


def test_bars_are_as_tall_as_their_counts() -> None:
    heights = [float(bar.get("height", 0)) for bar in parsed(histogram.levels([30, 60, 15])).iter("rect")]
    assert heights == pytest.approx([histogram.TALLEST / 2, histogram.TALLEST, histogram.TALLEST / 4], abs=0.01)


def test_hidden_counts_are_hatched_and_of_one_height() -> None:
    bars = list(parsed(histogram.levels([90, None, None], 20)).iter("rect"))
    assert [bar.get("fill") for bar in bars] == [svg.TINT, "url(#hidden-count)", "url(#hidden-count)"]
    assert bars[1].get("height") == bars[2].get("height")


def test_bins_under_the_limit_are_drawn_alike() -> None:
    values = np.concatenate([np.zeros(100), [50.0], [100.0] * 3, [np.nan]])
    hidden = [bar for bar in parsed(histogram.number(values, 10)).iter("rect") if "hidden" in bar.get("fill", "")]
    assert len(hidden) == 2
    assert len({bar.get("height") for bar in hidden}) == 1


@given(st.lists(st.floats(-1e300, 1e300), max_size=40))
def test_a_number_of_any_values_can_be_drawn(values: list[float]) -> None:
    parsed(histogram.number(np.array(values, dtype=float), 10))


def test_whole_numbers_leave_no_gaps_between_their_bars() -> None:
    values = np.repeat(np.arange(11.0), 50)
    assert stepped(histogram.number(values, 10)) == [histogram.TALLEST] * 11


def stepped(drawn: str) -> list[float]:
    """The heights of the bins in the outline, from left to right."""
    outline = next(path.get("d", "") for path in parsed(drawn).iter("path"))
    return [histogram.BASE - float(step.split("H")[0]) for step in outline.split("V")[1:-1]]


def test_bins_are_as_tall_as_their_counts_and_those_under_the_limit_are_not_in_the_outline() -> None:
    values = np.repeat([0.0, 1.0, 2.0, 3.0, 4.0], [100, 50, 9, 0, 10])
    assert stepped(histogram.number(values, 10)) == [50, 25, 0, 0, 5]


@pytest.mark.parametrize(
    ("values", "cuts", "at"),
    [
        ([0.0, 2.5, 10.0] * 20, (2.5, 7.5), ["25.00%", "75.00%"]),
        (list(range(10)) * 20, (5.0, 9.0), ["50.00%", "90.00%"]),  # whole numbers fill bins from one to the next
        ([-1e308, 1e308] * 20, (0.0,), ["50.00%"]),
        ([3.0] * 20, (3.0,), []),
        ([1.0, 2.0] * 20, (0.5, 40.0), []),
    ],
)
def test_dotted_lines_stand_where_the_bands_are_cut(
    values: list[float], cuts: tuple[float, ...], at: list[str]
) -> None:
    drawn = parsed(histogram.number(np.array(values, dtype=float), 10, cuts))
    assert [cut.get("x1") for cut in drawn.iter("line") if cut.get("class") == "cut"] == at


POINTS = [Point(links, -12 + 0.1 * links, -12.1 + 0.08 * links, 0.05) for links in range(11)]


def test_the_curve_marks_the_recommended_size_and_draws_every_held_out_point() -> None:
    drawn = parsed(curve.size_curve(POINTS, 7))
    assert "recommended, 7" in [text.text for text in drawn.iter("text")]
    assert len(list(drawn.iter("circle"))) == len(POINTS)


@given(
    st.lists(st.floats(-1e6, 0, allow_nan=False), min_size=1, max_size=120),
    st.integers(0, 200),
)
def test_any_curve_stays_inside_its_frame(scores: list[float], recommended: int) -> None:
    points = [Point(links, score, score - 0.5, 0.25) for links, score in enumerate(scores)]
    drawn = parsed(curve.size_curve(points, recommended % len(points)))
    for circle in drawn.iter("circle"):
        assert curve.TOP - 0.1 <= float(circle.get("cy", 0)) <= curve.BOTTOM + 0.1
        assert 0 <= float(circle.get("cx", "0%").rstrip("%")) <= 100
    assert len(list(drawn.iter("circle"))) <= 42


def test_the_figure_for_exploring_holds_the_same_numbers() -> None:
    data = curve.figure(POINTS, 7)["data"]
    assert [trace["x"] for trace in data] == [[point.links for point in POINTS]] * 2  # type: ignore[attr-defined]
    assert data[1]["y"] == [point.held_out for point in POINTS]  # type: ignore[index]


def test_a_minus_is_a_minus() -> None:
    assert curve.figure_words(-11.204, 2) == "−11.20"
