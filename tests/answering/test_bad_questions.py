"""What is no question is refused in a sentence, whatever it is."""

import numpy as np
import pytest

import engine


@pytest.fixture(scope="module")
def model():
    return engine.Model.from_network(
        [engine.Number("age", bands=[18.0, 40.0]), engine.Category("passed", ["no", "yes"], [], [0.4, 0.6])]
    )


@pytest.mark.parametrize(
    "asked",
    [
        {"watch": 3},
        {"watch": [["passed"]]},
        {"watch": ["passed"], "beside": 3},
        {"watch": ["passed"], "pins": {"age": np.array(3.0) * np.nan}},
        {"watch": ["passed"], "pins": {"age": 10**400}},
        {"watch": ["passed"], "pins": {"age": object()}},
        {"watch": ["passed"], "pins": 3},
        {"watch": ["passed"], "levers": [1]},
        {"watch": ["passed"], "levers": {"age": engine.Fix(10**400)}},
    ],
)
def test_what_is_no_question_is_refused(model, asked):
    with pytest.raises(engine.Refusal) as refused:
        model.ask(**asked)
    assert refused.value.message.endswith(".") and refused.value.do


@pytest.mark.parametrize("grid", [3, ["a"], [float("nan")], [[1.0]]])
def test_what_are_no_values_have_no_density(model, grid):
    age = model.ask(watch=["age"])["age"].among
    for read in (age.density, age.below):
        with pytest.raises(engine.Refusal):
            read(grid)
    with pytest.raises(engine.Refusal):
        age.interval(3)
