"""What the store keeps comes back from JSON as it was."""

import hashlib
import json
from dataclasses import replace

from hypothesis import given
from hypothesis import strategies as st

import engine
from app.store import Choices, Plan
from app.store.values import basis

names = st.text(st.characters(exclude_categories=["Cs"]), max_size=12)
cuts = st.lists(st.floats(allow_nan=False, allow_infinity=False), max_size=3)
better = st.one_of(st.lists(names, min_size=1, max_size=3).map(tuple), st.sampled_from([engine.MORE, engine.LESS]))
links = st.lists(st.tuples(names, names), max_size=3)
choices = st.builds(
    Choices,
    kinds=st.dictionaries(names, st.sampled_from(["category", "grade", "number", "left out"]), max_size=3),
    bands=st.dictionaries(names, cuts, max_size=2),
    grades=st.dictionaries(names, st.lists(names, max_size=3), max_size=2),
    blanks=st.dictionaries(names, st.sampled_from(["level", "drop row"]), max_size=2),
    units=st.dictionaries(names, names, max_size=2),
)
plans = st.builds(
    Plan,
    stages=st.lists(st.tuples(names, st.lists(names, max_size=3)), max_size=3),
    insist=links,
    rule_out=links,
    changeable=st.lists(names, max_size=3),
    outcomes=st.dictionaries(names, better, max_size=3),
)


@given(choices)
def test_choices_come_back_as_they_were(value):
    assert Choices.from_json(value.to_json()) == value


def test_choices_kept_before_units_could_be_stated_have_none():
    early = '{"kinds":{"age":"number"},"bands":{},"grades":{},"blanks":{}}'
    assert Choices.from_json(early) == Choices(kinds={"age": "number"})
    assert basis("d", Choices.from_json(early), Plan()) == early_basis("d", early, Plan())


def early_basis(digest, choices, plan):
    """As it was written then: over the whole text of the choices."""
    told = json.dumps([digest, choices, plan.to_json()], separators=(",", ":"))
    return hashlib.sha256(told.encode()).hexdigest()


@given(choices, st.dictionaries(names, names, max_size=2), plans)
def test_units_are_no_part_of_what_a_model_is_learned_from(value, units, plan):
    assert basis("d", value, plan) == basis("d", replace(value, units=units), plan)


@given(plans)
def test_a_plan_comes_back_as_it_was(value):
    assert Plan.from_json(value.to_json()) == value


@given(plans, plans, choices)
def test_two_plans_share_a_basis_only_when_they_are_the_same(one, other, value):
    assert (basis("d", value, one) == basis("d", value, other)) == (one.to_json() == other.to_json())


def test_a_level_named_more_is_no_direction():
    level, direction = Plan(outcomes={"dose": ("more",)}), Plan(outcomes={"dose": engine.MORE})
    assert Plan.from_json(level.to_json()).outcomes["dose"] == ("more",)
    assert Plan.from_json(direction.to_json()).outcomes["dose"] is engine.MORE
