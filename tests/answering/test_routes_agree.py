"""Both routes for worlds with numbers give the same: exactly summed, and weighed."""

import numpy as np
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from engine.answering import exact_mixed
from engine.answering.weighting import weigh
from tests.answering.mixed_generated import mixed_worlds, shaken_parameters

DRAWS, FEW, ERRORS = 3, 400.0, 4.5


@settings(max_examples=100, deadline=None, derandomize=True)
@given(mixed_worlds(most=9), st.integers(0, 2**32 - 1))
def test_weighting_agrees_with_the_exact_route(world, seed):
    """Wider worlds than the slow truth can read, at the point answer and in every draw."""
    plan = exact_mixed.plan(world)
    assume(plan.cells < 1e6)
    drawn = shaken_parameters(world, DRAWS, seed)
    exact = plan.read(world, drawn, DRAWS)
    assume(exact.log_evidence[0] > -30.0)
    found = weigh(world, drawn, DRAWS, seed, 12_000, 0)
    assume(found.effective > FEW)
    assert abs(found.log_evidence[0] - exact.log_evidence[0]) < ERRORS / np.sqrt(found.effective)
    assert found.shares.keys() == exact.shares.keys()
    assert found.numbers.keys() == exact.numbers.keys()
    unseen = 1.0 / found.effective  # a share this small may rest on weights that no particle has met
    for name in world.watch:
        away = np.abs(found.shares[name][:, 0] - exact.shares[name][:, 0]).max()
        if name not in found.numbers:
            assert away <= ERRORS * found.error[name] + unseen
            continue
        assert away <= ERRORS * 0.5 / np.sqrt(found.effective)
        own, other = found.numbers[name], exact.numbers[name]
        assert abs(own.means[0] - other.means[0]) <= ERRORS * 1.2 * found.error[name] * other.sds[0] + 1e-6
        for value in other.means[0] + other.sds[0] * np.array([-1.0, 0.1, 1.0]):
            off = abs(own.below([value])[0, 0] - other.below([value])[0, 0])
            assert off <= ERRORS * 0.5 / np.sqrt(found.effective) + 0.01 or _beside_a_single_value(other, value)


def _beside_a_single_value(mixture, value):
    """Whether a share of the distribution lies in one value close by, where a step may fall on either side."""
    single = (mixture.sd[:, 0] < 1e-6) & (np.abs(mixture.mean[:, 0] - value) < 1e-3 * (1.0 + abs(value)))
    return mixture.weight[single, 0].sum() > 0.0


@settings(max_examples=40, deadline=None, derandomize=True)
@given(mixed_worlds(most=6), st.integers(0, 2**32 - 1))
def test_draws_of_both_routes_go_together(world, seed):
    """With many particles a draw; calming pulls them together only by what the noise adds."""
    plan = exact_mixed.plan(world)
    assume(plan.cells < 1e6)
    drawn = shaken_parameters(world, 4, seed)
    exact = plan.read(world, drawn, 4)
    assume(np.all(exact.log_evidence > -6.0))
    found = weigh(world, drawn, 4, seed, 60_000, 0)
    assume(found.effective > 10_000.0)
    assert np.abs(found.log_evidence - exact.log_evidence).max() < 0.25
    for name in world.watch:
        assert np.abs(found.shares[name] - exact.shares[name]).max() < 0.08
