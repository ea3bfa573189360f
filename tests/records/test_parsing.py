"""Texts become numbers only where every cell spells one, and what was read into them is said."""

import math

import numpy as np
import pandas as pd
import pyarrow as pa
import pytest
from hypothesis import given
from hypothesis import strategies as st

from engine.records.parsing import typed


def read(separator=",", **columns):
    frame, said = typed(
        {name: pa.array(cells) for name, cells in columns.items()}, lambda row: f"line {row + 2}", separator
    )
    return frame, said


def column(cells, separator=",", **others):
    frame, said = read(separator, x=cells, **others)
    return [None if pd.isna(cell) else cell for cell in frame["x"]], said


finite = st.floats(allow_nan=False, allow_infinity=False)


@given(
    st.lists(finite | st.none(), min_size=1, max_size=20).filter(lambda cells: any(cell is not None for cell in cells))
)
def test_a_number_written_is_the_number_read(numbers):
    cells, said = column([None if number is None else repr(number) for number in numbers], y=["w"] * len(numbers))
    assert cells == [None if number is None else number + 0.0 for number in numbers]
    assert said == ()
    assert all(cell is None or math.copysign(1, cell) > 0 for cell in cells if cell == 0)


@pytest.mark.parametrize(
    ("cells", "separator", "numbers"),
    [
        (["1", " 2 ", "+3", "−4", "-5", ".5", "6.", "1e3"], ",", [1, 2, 3, -4, -5, 0.5, 6, 1000]),
        (["0", "0.5", "-0"], ",", [0, 0.5, 0]),
        (["1,234", "12"], ",", [1234, 12]),  # between thousands, as the file parts cells with commas
        (["1,234", "12"], ";", [1.234, 12]),
        (["1,234", "0,5"], "\t", [1.234, 0.5]),  # half makes it a decimal comma
        (["1,234.5", "2,000"], ";", [1234.5, 2000]),
        (["1,234,567", "1"], ";", [1234567, 1]),
        (["1.234,5", "7"], ",", [1234.5, 7]),
        (["45%", "7.5 %"], ",", [45, 7.5]),
    ],
)
def test_ways_to_write_numbers(cells, separator, numbers):
    assert column(cells, separator)[0] == numbers


def test_points_stand_between_thousands_where_another_column_has_decimal_commas():
    assert column(["1.234", "900"], ";", y=["0,5", "1,5"]) == (
        [1234, 900],
        (
            "The points in “x” were read as marks between thousands, as the file has decimal commas.",
            "The commas in “y” were read as decimal points.",
        ),
    )
    assert column(["1.234", "9.25"], ";", y=["0,5", "1,5"])[0] == [1.234, 9.25]
    assert column(["1.234", "900"], ";", y=["5", "1"])[0] == [1.234, 900]


def test_a_comma_that_may_be_either_follows_the_other_columns():
    assert column(["1,234", "2,000"], ";", y=["0.5", "1.5"])[0] == [1234, 2000]
    assert column(["1,234", "2,000"], "|", y=["0,5", "1,5"])[0] == [1.234, 2]


@pytest.mark.parametrize(
    "cells",
    [
        ["007", "12"],
        ["0031", "0044"],
        ["12345678901234567", "1"],
        ["1", "2x"],
        ["2024-01-05", "2024-01-06"],
        ["1.2.3", "4"],
        ["1 234", "5"],
        ["inf", "1"],
        ["0x10", "1"],
        ["1_000", "2"],
        ["1e999", "2"],
        ["True", "False"],
        ["12:30", "1"],
        ["٣", "4"],
        ["£5", "£6"],
    ],
)
def test_what_is_not_surely_a_number_stays_the_text_it_is(cells):
    assert column(cells)[0] == cells


def test_words_that_only_look_missing_are_kept():
    assert column(["None", "na", "missing", "-"])[0] == ["None", "na", "missing", "-"]


def test_spaces_around_a_cell_are_not_part_of_it():
    frame, _ = read(x=[" yes", "yes ", "\u00a0"], y=["1", "2", "3"])
    assert frame["x"].tolist()[:2] == ["yes", "yes"] and pd.isna(frame["x"][2])


def test_other_columns_pass_as_they_are():
    numbers = pd.Series([1.0, np.nan])
    frame, said = typed({"x": numbers, "y": pa.array(["a", "b"])}, str)
    assert frame["x"].equals(numbers) and said == ()
