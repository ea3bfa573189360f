"""What the forms of Records and Order do: pure changes of choices and plans, and what they refuse."""

from __future__ import annotations

from dataclasses import replace
from datetime import UTC, datetime

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.pages import order_form, records_form, records_view
from app.pages.records_view import Typed
from app.store import Choices, Plan, Study
from engine.order import LESS, MORE
from engine.records.table import Column
from engine.refusal import Refusal

PLAN = Plan(
    stages=(("Who", ("age", "hours")), ("Then", ("passed",))), changeable=("hours",), outcomes={"passed": ("yes",)}
)
AGE = Column("age", "grade", "ordered words", ("young", "middle", "old"), np.zeros(3, dtype=np.int32))
HOURS = Column(
    "hours",
    "number",
    "numbers",
    ("under 5", "5 and over", "blank"),
    np.zeros(3, np.int32),
    (5.0,),
    np.zeros(3),
    blanks=2,
)
PASSED = Column("passed", "category", "two words", ("no", "yes"), np.zeros(3, dtype=np.int32))


def study(plan: Plan = PLAN, choices: Choices | None = None) -> Study:
    return Study(
        key="evening-school",
        name="Evening school",
        created=datetime(2026, 3, 1, tzinfo=UTC),
        source="records.csv",
        sample=None,
        rows=3,
        columns=3,
        digest="0",
        choices=choices or Choices(),
        plan=plan,
        warnings=(),
        mended=(),
        links=None,
        recommended=None,
        max_parents=3,
        model="none",
        asked=0,
        last=None,
    )


def typed(column: Column, plan: Plan = PLAN, **changes: object) -> Typed:
    return replace(records_view.saved(study(plan), column), **changes)  # type: ignore[arg-type]


@pytest.mark.parametrize("column", [AGE, HOURS, PASSED], ids=lambda column: column.name)
def test_a_form_sent_back_as_it_was_changes_nothing(column: Column) -> None:
    changed = records_form.change(study(), column, typed(column))
    assert changed == records_form.Change(Choices(), PLAN)


def test_typed_cuts_become_bands_and_none_let_go_of_them() -> None:
    changed = records_form.change(study(), HOURS, typed(HOURS, cuts="2; 7.5 20"))
    assert changed.choices.bands == {"hours": (2.0, 7.5, 20.0)}
    back = records_form.change(study(choices=changed.choices), HOURS, typed(HOURS, cuts=" "))
    assert back.choices.bands == {}


@pytest.mark.parametrize(("cuts", "words"), [("2, many", "“many”"), ("7, 2", "do not rise"), ("nan", "“nan”")])
def test_cuts_that_are_no_rising_numbers_are_refused(cuts: str, words: str) -> None:
    with pytest.raises(Refusal) as refused:
        records_form.change(study(), HOURS, typed(HOURS, cuts=cuts))
    assert words in refused.value.message
    assert refused.value.where == "hours"


def test_a_typed_unit_is_kept_without_spaces_around_it_and_an_empty_one_lets_go_of_it() -> None:
    others = Choices(units={"travel": "minutes"})
    changed = records_form.change(study(choices=others), HOURS, typed(HOURS, unit=" hours a week "))
    assert changed.choices == Choices(units={"travel": "minutes", "hours": "hours a week"})
    back = records_form.change(study(choices=changed.choices), HOURS, typed(HOURS, unit=" "))
    assert back.choices == others


def test_a_unit_that_is_no_short_text_is_refused() -> None:
    with pytest.raises(Refusal, match="unit of “hours” is 30 characters long"):
        records_form.change(study(), HOURS, typed(HOURS, unit="h" * 30))


def test_another_kind_lets_go_of_the_cuts_unit_and_grades_of_the_kind_before() -> None:
    choices = Choices(bands={"hours": (5.0,)}, grades={"age": ("a", "b")}, units={"hours": "h"})
    changed = records_form.change(study(choices=choices), HOURS, typed(HOURS, kind="category"))
    assert changed.choices == Choices(kinds={"hours": "category"}, grades={"age": ("a", "b")})


def test_typed_grades_are_the_columns_levels_in_their_new_order() -> None:
    changed = records_form.change(study(), AGE, typed(AGE, grades=" old\n\nyoung \r\nmiddle"))
    assert changed.choices.grades == {"age": ("old", "young", "middle")}


@pytest.mark.parametrize(
    ("grades", "words"),
    [("old\nyoung", "leaves out “middle”"), ("old\nold\nyoung\nmiddle", "twice"), ("old\nyoung\nmidle", "“midle”")],
)
def test_grades_that_are_not_the_levels_are_refused(grades: str, words: str) -> None:
    with pytest.raises(Refusal) as refused:
        records_form.change(study(), AGE, typed(AGE, grades=grades))
    assert words in refused.value.message


@pytest.mark.parametrize(
    ("step", "moved"),
    [
        ("0 down", "b\na\nc"),
        ("2 up", "a\nc\nb"),
        ("0 up", "a\nb\nc"),
        ("2 down", "a\nb\nc"),
        ("9 up", "a\nb\nc"),
        ("² up", "a\nb\nc"),
    ],
)
def test_a_grade_moves_by_one_and_never_off_the_end(step: str, moved: str) -> None:
    assert records_form.moved("a\nb\nc", step) == moved


def test_marks_are_made_and_taken_back() -> None:
    marked = records_form.change(study(), AGE, typed(AGE, changeable=True, better=frozenset({0, 2}))).plan
    assert marked.changeable == ("hours", "age")
    assert marked.outcomes == {"passed": ("yes",), "age": ("young", "old")}
    back = records_form.change(study(marked), AGE, typed(AGE, marked, changeable=False, better=frozenset())).plan
    assert back == PLAN


@pytest.mark.parametrize(("direction", "better"), [("more", MORE), ("less", LESS)])
def test_more_or_less_of_a_number_can_be_better(direction: str, better: object) -> None:
    assert records_form.change(study(), HOURS, typed(HOURS, direction=direction)).plan.outcomes["hours"] is better


def test_an_outcome_cannot_have_every_level_better() -> None:
    with pytest.raises(Refusal):
        records_form.change(study(), PASSED, typed(PASSED, better=frozenset({0, 1})))


def test_the_blank_has_no_place_among_the_grades() -> None:
    assert records_view.grade_levels(replace(AGE, levels=("a", "b", "blank"), blanks=2)) == ("a", "b")


def test_a_card_opened_before_the_column_changed_is_told_apart() -> None:
    assert records_view.mark(AGE) != records_view.mark(replace(AGE, levels=("old", "middle", "young")))


# Order


@given(st.data())
def test_moving_columns_about_loses_none_of_them(data: st.DataObject) -> None:
    plan = PLAN
    for _ in range(data.draw(st.integers(0, 6))):
        column = data.draw(st.sampled_from(plan.columns))
        plan = order_form.moved(plan, column, data.draw(st.integers(0, len(plan.stages))))
    assert sorted(plan.columns) == ["age", "hours", "passed"]
    names = [name for name, _ in plan.stages]
    assert len(set(names)) == len(names)
    plan.order()


def test_a_move_past_the_last_stage_makes_one() -> None:
    assert order_form.moved(PLAN, "hours", 2).stages[2] == ("Stage 3", ("hours",))


def test_a_move_to_where_it_stands_changes_nothing() -> None:
    assert order_form.moved(PLAN, "hours", 0) == PLAN


@pytest.mark.parametrize(("column", "to"), [("nobody", 0), ("age", 7), ("age", -1)])
def test_a_move_of_nothing_or_to_nowhere_is_refused(column: str, to: int) -> None:
    with pytest.raises(Refusal):
        order_form.moved(PLAN, column, to)


def test_only_an_empty_stage_is_taken_out() -> None:
    more = order_form.stage_added(PLAN)
    assert order_form.stage_taken_out(more, 2) == PLAN
    with pytest.raises(Refusal):
        order_form.stage_taken_out(more, 0)


def test_stage_names_are_kept_with_any_button() -> None:
    assert [name for name, _ in order_form.named(PLAN, [" Who  they are", "Then"]).stages] == ["Who they are", "Then"]
    assert order_form.named(PLAN, ["one name"]) == PLAN


def test_a_link_is_insisted_on_ruled_out_and_let_go() -> None:
    plan = order_form.ruled(order_form.ruled(PLAN, "must", "age", "passed"), "must not", "hours", "passed")
    assert (plan.insist, plan.rule_out) == ((("age", "passed"),), (("hours", "passed"),))
    freed = order_form.rule_taken_out(order_form.rule_taken_out(plan, "must", 0), "must not", 0)
    assert freed == PLAN


def test_a_backward_link_is_refused_by_the_order_itself() -> None:
    plan = order_form.ruled(PLAN, "must", "passed", "age")
    with pytest.raises(Refusal):
        plan.order()
