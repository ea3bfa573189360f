"""The axis of a number: round ends, a figure at every step, every value inside."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.drawing.scale import PER_CENT, round_step, rounded_outward

values = st.floats(-1e9, 1e9)


def figures(scale):
    return [tick.words for tick in scale.ticks() if tick.rank == 0]


@given(values, values, st.lists(values, max_size=3))
def test_everything_lies_on_the_axis_and_its_ends_are_steps(one, other, also):
    scale = rounded_outward(min(one, other), max(one, other), also)
    ends = (one, other, *also)
    slack = 1e-6 * scale.step + 1e-9
    assert scale.low <= min(ends) + slack and max(ends) <= scale.high + slack
    assert all(0 <= scale.place(end) <= 1 for end in ends)
    assert 5 <= scale.last - scale.first <= 15 or max(ends) - min(ends) < 1e-6


@pytest.mark.parametrize(
    ("low", "high", "words"),
    [
        (0.4, 28.7, ["0", "5", "10", "15", "20", "25", "30"]),
        (-3.0, 8.0, ["−4", "−2", "0", "2", "4", "6", "8"]),
        (0.11, 0.32, ["0.1", "0.12", "0.14"]),
        (1182.0, 2766.0, ["1,000", "1,200", "1,400"]),
        (1991.0, 2012.0, ["1990", "1992", "1994"]),
        (7.0, 7.0, ["6.2", "6.4"]),
    ],
)
def test_figures_stand_on_round_numbers(low, high, words):
    assert figures(rounded_outward(low, high))[: len(words)] == words


def test_shares_run_from_none_to_all():
    assert figures(PER_CENT)[0] == "0%" and figures(PER_CENT)[-1] == "100%" and "50" in figures(PER_CENT)
    assert len(PER_CENT.ticks()) == 101 and PER_CENT.place(0.61) == 0.61


@given(st.floats(1e-9, 1e12))
def test_a_step_is_one_two_or_five(most):
    step = round_step(most)
    assert step <= most * (1 + 1e-9) and most < 2.5000001 * step
    assert f"{step:e}"[0] in "125"


@given(values, values)
def test_ticks_rise_from_end_to_end(low, high):
    ticks = rounded_outward(min(low, high), max(low, high)).ticks()
    places = [tick.place for tick in ticks]
    assert places == sorted(places) and places[0] == 0 and places[-1] == 1
    assert ticks[0].words and ticks[-1].words


@given(values, values)
def test_the_unit_stands_on_the_last_figure_alone(one, other):
    bare, told = (rounded_outward(min(one, other), max(one, other), (), behind) for behind in ("", " minutes"))
    assert figures(told) == [*figures(bare)[:-1], f"{figures(bare)[-1]} minutes"]
