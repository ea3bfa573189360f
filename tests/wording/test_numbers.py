"""Means and their changes in words: they agree with each other and tell no more than is known."""

from __future__ import annotations

import math

import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from app.wording.numbers import Move, amount, decimals_for, round_value, signed

values = st.floats(-1e6, 1e6)


def number(text: str) -> float:
    return float(text.replace("−", "-").replace(",", ""))


@pytest.mark.parametrize(
    ("value", "decimals", "words"),
    [
        (12.34, 1, "12.3"),
        (1234567.891, 2, "1,234,567.89"),
        (-2.25, 1, "−2.3"),
        (-0.04, 1, "0.0"),
        (2.5, 0, "3"),
        (23412, -1, "23,410"),
        (-23415, -1, "−23,420"),
        (0.145, 2, "0.15"),
    ],
)
def test_amounts(value, decimals, words):
    assert amount(value, decimals) == words


def test_a_difference_has_its_sign_unless_it_is_none():
    assert [signed(value, 1) for value in (1.84, -1.84, 0.04, -0.04)] == ["+1.8", "−1.8", "0", "0"]


@pytest.mark.parametrize(
    ("width", "spread", "decimals"),
    [
        (2.7, 6, 1),
        (4, 6, 1),
        (6, 20, 0),
        (90, 300, 0),
        (0.27, 6, 2),
        (150, 900, -1),
        (4200, 9000, -2),
        (0, 6, 2),
        (0, 0, 0),
    ],
)
def test_decimals_follow_the_width_of_the_interval(width, spread, decimals):
    assert decimals_for(width, spread) == decimals


def test_the_change_the_brief_speaks_of():
    move = Move(12.31, 14.08, 0.41, 3.14, decimals_for(2.73, 6))
    assert move.ends == ("12.3", "14.1") and move.difference == "+1.8" and move.interval == "+0.4 to +3.1"


@given(values, values, st.floats(0, 1e5), st.floats(0, 1e5), st.floats(0.001, 1e5))
def test_a_readers_sum_agrees_and_the_sign_of_a_sure_change_is_seen(start, change, below, above, spread):
    low, high = change - below, change + above
    move = Move(start, start + change, low, high, decimals_for(high - low, spread))
    before, after = (number(end) for end in move.ends)
    assert math.isclose(after - before, number(move.difference), abs_tol=10.0**-move.decimals / 100)
    if move.decimals < move.base + 3:
        shown = [number(end) for end in move.interval.split(" to ")]
        assert (shown[0] > 0 or shown[1] < 0) == move.moves or 0 in shown
        assert not (move.moves and 0 in shown)


@given(values, st.floats(-100, 100), st.floats(0.01, 50))
def test_the_change_told_is_the_change_to_the_last_digit(start, change, half):
    move = Move(start, start + change, change - half, change + half, decimals_for(2 * half, 10))
    assert abs(number(move.difference) - change) <= 1.01 * 10.0**-move.decimals


def test_what_is_known_has_no_interval_and_may_stay():
    assert Move(3.0, 3.0, 0.0, 0.0).still
    assert Move(3.0, 4.0, 1.0, 1.0).known and not Move(3.0, 4.0, 1.0, 1.0).still


@given(values, st.floats(1e-3, 1e6))
def test_a_rounded_value_stays_near(value, width):
    rounded = round_value(value, width)
    assert abs(rounded - value) <= 0.0501 * width
    assume(abs(rounded) < 1e6)
    assert len(f"{abs(rounded):.10g}".replace(".", "").strip("0")) <= 10
