"""The order as typed text: what is written is read back, and what is wrong is said by line."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.pages import order_text
from engine.refusal import Refusal

# Control characters other than line breaks and tabs do not survive a form, so no test needs them.
NAMES = st.text(st.characters(blacklist_categories=["Cs", "Cc"]) | st.sampled_from(':,"\n '), min_size=1, max_size=12)


@st.composite
def stages(draw: st.DrawFn) -> tuple[tuple[str, tuple[str, ...]], ...]:
    columns = draw(st.lists(NAMES, min_size=1, max_size=8, unique=True))
    names = draw(st.lists(NAMES.filter(str.strip), min_size=1, max_size=4))
    places = [draw(st.integers(0, len(names) - 1)) for _ in columns]
    return tuple(
        (name, tuple(column for column, at in zip(columns, places, strict=True) if at == place))
        for place, name in enumerate(names)
    )


@given(stages())
def test_what_is_written_is_read_back(given_stages: tuple[tuple[str, tuple[str, ...]], ...]) -> None:
    columns = [column for _, held in given_stages for column in held]
    assert order_text.read(order_text.write(given_stages), columns) == given_stages


def test_case_and_spaces_do_not_matter() -> None:
    read = order_text.read("Who they are:  Age Band ,SCHOOLING\n\nThen: passed", ["age band", "schooling", "passed"])
    assert read == (("Who they are", ("age band", "schooling")), ("Then", ("passed",)))


@pytest.mark.parametrize(
    ("text", "where", "words"),
    [
        ("Who they are: age\nThen pased", "line 2", "no colon"),
        ("Who: age\nThen: pased", "line 2", "“pased”"),
        (": age", "line 1", "no name"),
        ("  \n ", "line 1", "No stage"),
    ],
)
def test_what_is_wrong_is_said_by_line(text: str, where: str, words: str) -> None:
    with pytest.raises(Refusal) as refused:
        order_text.read(text, ["age", "passed"])
    assert refused.value.where == where
    assert words in refused.value.message
    assert refused.value.do


def test_a_column_that_is_left_out_is_said_to_be() -> None:
    with pytest.raises(Refusal) as refused:
        order_text.read("Who: age, Visit Date", ["age"], ["visit date"])
    assert refused.value.message == "Line 1 names “Visit Date”, which is left out, so no stage can hold it."
    assert "Records page" in refused.value.do


def test_two_columns_that_differ_by_case_are_told_apart() -> None:
    assert order_text.read("A: Age, age", ["age", "Age"]) == (("A", ("Age", "age")),)
    with pytest.raises(Refusal):
        order_text.read("A: AGE", ["age", "Age"])
