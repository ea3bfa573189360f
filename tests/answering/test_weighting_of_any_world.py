"""Likelihood weighting against the slow truth, on worlds made up by hypothesis, within its own standard errors."""

import numpy as np
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from engine.answering.weighting import weigh
from tests.answering.mixed_generated import mixed_worlds, own_parameters, shaken_parameters
from tests.answering.mixed_plainly import in_boxes, truth

ERRORS = 4.5  # standard errors that an estimate may be off by: hundreds are looked at
FEW = 150.0  # effective particles below which a standard error says little; an answer carries a caution under 50


def only_possible(found):
    """Leave out a world whose evidence cannot be, or is so unlikely that nothing of it can be checked."""
    assume(found.log_evidence > -50.0)
    return found


def read(world, drawn, count, seed, particles):
    found = weigh(world, drawn, count, seed, particles, 0)
    assume(found.effective >= FEW)
    return found


@settings(max_examples=35, deadline=None, derandomize=True)
@given(mixed_worlds(most=5), st.integers(0, 2**32 - 1))
def test_shares_means_and_evidence_are_within_their_errors(world, seed):
    assume(len(in_boxes(world)) <= 2)
    exact = only_possible(truth(world))
    found = read(world, own_parameters(world), 0, seed, 6000)
    assert abs(found.log_evidence[0] - exact.log_evidence) < ERRORS * np.sqrt(1.0 / found.effective)
    for name in world.watch:
        if name in found.numbers:
            mixture = found.numbers[name]
            mean = mixture.means[0]
            assert abs(mean - exact.mean(name)) <= ERRORS * found.error[name] * max(exact.sd(name), 1e-9) * 1.2 + 1e-9
            if name in exact.shares:  # the slow truth leaves out bands of a number beside two others in boxes
                away = np.abs(found.shares[name][:, 0] - exact.shares[name])
                assert away.max() <= ERRORS * 0.5 / np.sqrt(found.effective)
        else:
            away = np.abs(found.shares[name][:, 0] - exact.shares[name])
            assert away.max() <= ERRORS * found.error[name] + 1e-9
        assert np.isclose(found.shares[name].sum(), 1.0)


@settings(max_examples=15, deadline=None, derandomize=True)
@given(mixed_worlds(most=5, exact_numbers=False), st.integers(0, 2**32 - 1))
def test_a_number_is_told_as_it_is_spread(world, seed):
    """The share under any value, from cells and not from single particles."""
    assume(len(in_boxes(world)) <= 2)
    exact = only_possible(truth(world))
    found = read(world, own_parameters(world), 0, seed, 6000)
    assume(found.numbers.keys() - world.values.keys())
    for name in found.numbers.keys() - world.values.keys():
        mixture = found.numbers[name]
        for value in exact.mean(name) + exact.sd(name) * np.array([-1.5, -0.5, 0.0, 0.5, 1.5]):
            below = mixture.below([value])[0, 0]
            assert abs(below - exact.below(name, value)) < ERRORS * 0.5 / np.sqrt(found.effective) + 0.01


@settings(max_examples=25, deadline=None, derandomize=True)
@given(mixed_worlds(most=4), st.integers(0, 2**32 - 1))
def test_every_draw_is_read_with_its_own_parameters(world, seed):
    assume(len(in_boxes(world)) <= 1)
    only_possible(truth(world))
    drawn = shaken_parameters(world, 2, seed)
    found = read(world, drawn, 2, seed, 8000)
    for draw in (1, 2):
        exact = truth(world, drawn, draw)
        assert abs(found.log_evidence[draw] - exact.log_evidence) < 0.25
        for name in world.watch:  # two draws are calmed towards each other, so their mean is looked at
            if draw == 1:
                other = truth(world, drawn, 2).shares[name]
                away = np.abs(found.shares[name][:, 1:].mean(axis=1) - 0.5 * (exact.shares[name] + other))
                assert away.max() < 0.06
