"""Answers that rest on few sampled particles say so, in their errors and in a caution."""

import math

import pytest

import engine
from tests.doubting.worlds import codes_of, only


@pytest.fixture(scope="module")
def narrow():
    """Two numbers whose sum is recorded to a hair: pinned far out, hardly a particle comes near."""
    return engine.Model.from_network(
        [
            engine.Number("x", bands=[0.0]),
            engine.Number("y", parents=["x"], slopes=[1.0], bands=[0.0]),
            engine.Number("sum", parents=["x", "y"], slopes=[1.0, 1.0], variance=0.001),
            engine.Category("w", ["n", "p"], ["x", "y"], [[[0.9, 0.1], [0.7, 0.3]], [[0.4, 0.6], [0.2, 0.8]]]),
        ]
    )


def test_so_few_particles_that_they_cannot_tell_their_error_block_and_claim_nothing(narrow):
    answer = narrow.ask(pins={"sum": 12.0}, watch=["w", "x"], exact=False)
    assert answer.effective < 10.0
    found = only(answer, "sampled")
    assert found.rank == "blocks" and found.figures["effective"] == answer.effective
    assert answer.mc_error >= 1.0  # of a number, in its own standard deviations: nothing is known


def test_few_particles_weaken(narrow):
    answer = next(
        found
        for pinned in (4.0, 5.0, 6.0, 7.0, 8.0)
        if 10.0 <= (found := narrow.ask(pins={"sum": pinned}, watch=["w"], exact=False)).effective < 50.0
    )
    assert only(answer, "sampled").rank == "weakens"


def test_enough_particles_and_exact_answers_are_not_told(narrow):
    sampled = narrow.ask(watch=["w"], exact=False)
    assert "sampled" not in {code for _, code in codes_of(sampled)} and math.isfinite(sampled.effective)
    exact = engine.Model.from_network([engine.Category("a", ["x", "y"], [], [0.5, 0.5])]).ask(watch=["a"])
    assert math.isinf(exact.effective) and codes_of(exact) == []
