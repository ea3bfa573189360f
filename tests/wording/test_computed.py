"""How an answer was computed, in words."""

from dataclasses import replace

import engine
from app.wording.computed import method


def test_an_exact_answer_says_how_and_a_sampled_one_its_error() -> None:
    model = engine.Model.from_network([engine.Category("a", ["x", "y"], [], [0.5, 0.5])])
    exact = replace(model.ask(watch=["a"]), milliseconds=14.0)
    assert method(exact).startswith("Exactly") and method(exact).endswith("in 14 ms.")
    sampled = replace(exact, method="sampled, by likelihood weighting", mc_error=0.004, effective=900.0)
    assert method(sampled) == (
        "Sampled, by likelihood weighting, in 14 ms. Sampling has a standard error of at most 0.4 points in a share, "
        "and of as many hundredths of its own spread in a mean."
    )
    assert method(replace(sampled, effective=2.0)).endswith("How far sampling is off cannot be told.")
