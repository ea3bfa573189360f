"""What a column is taken as, guessed from its cells, and the reason in words."""

import numpy as np
import pandas as pd
import pytest

from engine.records import Table


def guessed(cells, name="x"):
    cells = list(cells)
    frame = pd.DataFrame(
        {name: pd.Series(cells, dtype=None if cells else object), "other": ["a", "b"] * (len(cells) // 2)}
    )
    return Table.from_frame(frame).columns[name]


RNG = np.random.default_rng(5)
DAYS = [str(day.date()) for day in pd.date_range("2026-01-05", periods=30)]

GUESSES = [
    ("words", ["red", "green", "blue"] * 20, "category", "It has 3 different values."),
    ("words and blanks", ["red", None] * 20, "category", "It holds “red” or nothing."),
    ("two numbers", [0, 1] * 20, "category", "It has two values, 0 and 1."),
    ("few numbers", [1, 2, 3, 4, 5] * 12, "grade", "It is a number with only 5 different values."),
    ("many numbers", list(RNG.normal(30, 9, 60)), "number", "It holds numbers."),
    ("words of degree", ["low", "high", "very high", "medium"] * 10, "grade", "Its levels are words of degree."),
    ("ranges", ["under 20", "45 and over", "20 to under 45"] * 20, "grade", "Its levels are ranges or counts."),
    ("numbered", ["level 10", "level 9", "level 1"] * 20, "grade", "Its levels are numbered."),
    ("one value", ["same"] * 20, "left out", "Every record has the same value: “same”."),
    ("all blank", [None] * 20, "left out", "Every cell is blank."),
    ("row numbers", range(1, 61), "left out", "Looks like an identifier: every record has its own value."),
    (
        "codes",
        [f"K{n:05}x" for n in range(60)],
        "left out",
        "Looks like an identifier: every record has its own value.",
    ),
    ("dates", DAYS * 2, "left out", "It holds dates, which cannot be learned from as they are."),
    ("dates with a clock", [f"{day} 10:30" for day in DAYS] * 2, "left out", "It holds dates"),
    ("days of other lands", ["5.3.2026", "17.12.2025"] * 20, "left out", "It holds dates"),
    ("dates in digits", [20260100 + day for day in range(1, 31)] * 2, "left out", "It holds dates"),
    ("timestamps", pd.date_range("2026-01-05", periods=60), "left out", "It holds dates"),
    ("texts", [f"She told us in week {n} that it went well" for n in range(60)], "left out", "Free text"),
    (
        "levels without end",
        [f"street {n % 55} corner" for n in range(220)],
        "left out",
        "55 different values; at most 50",
    ),
    ("fifty levels", [f"street {n % 50} corner" for n in range(200)], "category", "It has 50 different values."),
]


def test_an_identifier_of_several_records_may_be_the_group():
    column = guessed([f"K{n // 3:05}x" for n in range(300)], "person id")
    assert column.kind == "left out"
    assert column.why == (
        "Looks like an identifier: 100 different values. Take it as the group if it says which records belong together."
    )


@pytest.mark.parametrize(("cells", "kind", "why"), [each[1:] for each in GUESSES], ids=[each[0] for each in GUESSES])
def test_a_kind_is_guessed_with_its_reason(cells, kind, why):
    column = guessed(cells)
    assert column.kind == kind and why in column.why
    assert bool(column.levels) == (kind != "left out")


def test_a_column_named_as_an_identifier_is_left_out_even_where_values_repeat():
    numbers = [int(each) for each in RNG.integers(1000, 9000, 100)] * 2
    assert guessed(numbers, "amount").kind == "number"
    assert guessed(numbers, "learner_id").kind == "left out"


@pytest.mark.parametrize(
    "levels",
    [
        ("never", "rarely", "sometimes", "often", "always"),
        ("Strongly disagree", "Disagree", "Neutral", "Agree", "Strongly agree"),
        ("none", "one or two", "three or more"),
        ("<20", "20-39", "40-59", "60+"),
        ("under 1,000", "1,000 to under 10,000", "10,000 and over"),
        ("18 to 24", "25 to 34", "35 to 49", "50 and over"),
        ("primary", "lower secondary", "upper secondary", "tertiary"),
        ("1 - poor", "2 - fair", "10 - good"),
        ("A1", "A2", "B1"),
    ],
)
def test_grades_are_found_in_order_however_they_are_listed(levels):
    for turned in (levels, levels[::-1], levels[1:] + levels[:1]):
        column = guessed(list(turned) * 12)
        assert column.kind == "grade" and column.levels == levels


def test_an_order_that_one_level_does_not_fit_is_no_order_and_it_is_said():
    column = guessed(["low", "medium", "high", "don't know"] * 10)
    assert column.kind == "category" and "except for “don't know”" in column.warnings[0]


def test_the_levels_of_a_category_stand_as_people_sort_them():
    assert guessed(["Ward 10", "ward 2", "Ward 1"] * 10).levels == ("Ward 1", "ward 2", "Ward 10")


def test_a_number_with_few_values_says_that_it_was_taken_as_grades():
    assert "taken as grades" in guessed([1, 2, 3] * 10).warnings[0]


def test_a_number_that_is_mostly_one_value_says_so():
    assert guessed([0.0] * 60 + list(RNG.normal(9, 2, 40))).warnings == ("More than half of its values are 0.",)


def test_a_hostile_level_is_a_level_like_any_other():
    levels = ("'; drop table studies; --", "<script>alert(1)</script>", "{{ 7 * 7 }}")
    assert set(guessed(levels * 10).levels) == set(levels)
