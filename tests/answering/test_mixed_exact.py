"""The exact route through worlds with numbers, against the slow truth."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from engine.answering.exact_mixed import plan
from tests.answering.mixed_generated import mixed_worlds, own_parameters, shaken_parameters
from tests.answering.mixed_plainly import in_boxes, truth

QUICK = settings(max_examples=60, deadline=None)


def read(world, drawn=None, count=0):
    return plan(world).read(world, drawn or own_parameters(world), count)


def agree(world, found, true, draw=0, exactly=1e-10):
    """Every figure of a draw is the true one."""
    assert found.log_evidence[draw] == pytest.approx(true.log_evidence, abs=exactly, rel=exactly)
    if true.log_evidence == -np.inf:
        return
    for name in world.watch:
        if name in true.parts and len(in_boxes(world) | {name}) > 2:  # the truth would take seconds
            continue
        assert found.shares[name][:, draw] == pytest.approx(true.shares[name], abs=exactly)
        if name not in true.parts:
            continue
        mixture = found.numbers[name]
        middle, spread = true.mean(name), true.sd(name)
        assert mixture.weight[:, draw].sum() == pytest.approx(1.0)
        assert mixture.means[draw] == pytest.approx(middle, abs=exactly * (1.0 + abs(middle) + spread))
        assert mixture.sds[draw] == pytest.approx(spread, rel=1e3 * exactly, abs=1e-7)
        for place in (-1.3, 0.2, 2.1):
            value = middle + place * (spread + 0.1)
            assert mixture.below([value])[0, draw] == pytest.approx(true.below(name, value), abs=exactly)


@QUICK
@given(mixed_worlds(banded=False, boxes=0))
def test_values_and_pins_are_read_as_by_enumeration(world):
    agree(world, read(world), truth(world))


@QUICK
@given(mixed_worlds(most=5, banded=False, boxes=0), st.integers(0, 99))
def test_every_draw_is_read_with_its_own_parameters(world, seed):
    drawn = shaken_parameters(world, 3, seed)
    found = read(world, drawn, 3)
    for draw in range(4):
        agree(world, found, truth(world, drawn, draw), draw)
