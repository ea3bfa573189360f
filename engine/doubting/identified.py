"""An identified answer, read exactly from the joint of a fitted network of categories."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from engine.doubting.factors import Factor, divided, eliminated, multiplied
from engine.doubting.functional import Expression, Product, Ratio, Set, Share, Sum
from engine.doubting.identification import Functional, Hedge
from engine.network.network import Network
from engine.refusal import Refusal

OFF = 1e-6  # by so much shares may miss 1: less is rounding, more means that a case was needed that cannot be


class Joint:
    """The joint of a network, of which shares are worked out once each.

    tables: column -> (levels of its parents..., own levels, draws), as `Network.draws` gives them.
    """

    def __init__(self, network: Network, tables: Mapping[str, np.ndarray]) -> None:
        self.network = network
        self._families = {name: Factor((*network.node(name).parents, name), tables[name]) for name in network.names}
        self._kept: dict[Share, Factor] = {}

    def share(self, wanted: Share) -> Factor:
        if wanted not in self._kept:
            self._kept[wanted] = self._worked_out(wanted)
        return self._kept[wanted]

    def _worked_out(self, wanted: Share) -> Factor:
        node, given = self.network.node(wanted.column), set(wanted.given)
        if given >= set(node.parents) and not given & self.network.descendants([wanted.column]):
            return self._families[wanted.column]  # alike in its parents, nothing else that comes before it matters
        names = {wanted.column, *given}
        leading = set(names)
        for before in reversed(self.network.nodes):
            if before.name in leading:
                leading.update(before.parents)
        every = [self._families[name] for name in self.network.names if name in leading]
        both = multiplied(eliminated(every, leading - names))
        return divided(both, multiplied([both], [wanted.column]))


def identified_shares(
    functional: Functional,
    joint: Joint,
    settings: Mapping[str, int],
    pins: Mapping[str, frozenset[int]] | None = None,
) -> np.ndarray:
    """(levels of each outcome..., draws) joint shares of the outcomes among the pinned, with every lever set.

    settings: lever -> position of the level it is set to.  pins: column -> positions of the levels pinned.
    Raises Refusal where it takes cases that cannot be, or too large a table.
    """
    pinned = {column: np.array(sorted((pins or {})[column]), dtype=np.intp) for column in functional.pins}
    at = {lever: np.array([position], dtype=np.intp) for lever, position in settings.items()}
    found = multiplied(_factors(functional.shares, joint, pinned, at))
    if any(positions.size > 1 for positions in pinned.values()):
        assert not isinstance(functional.weights, Hedge), "the weights of several pinned levels do not follow"
        weights = multiplied(_factors(functional.weights, joint, pinned, at))
        axes = [column for column in pinned if column in found.columns or column in weights.columns]
        found = divided(multiplied([found, weights], axes), multiplied([weights], axes))
    else:
        found = found.without(pinned)
    shares = found.along(functional.outcomes)
    sums = shares.reshape(-1, shares.shape[-1]).sum(axis=0)
    if not (np.abs(sums - 1.0) < OFF).all():
        raise Refusal(
            "Some of the cases that this answer would have to be read from cannot be.",
            where=", ".join((*functional.levers, *functional.pins)),
            do="Take out a pin, or set the lever to another level.",
        )
    return np.asarray(shares)


def _factors(
    of: Expression,
    joint: Joint,
    taken: Mapping[str, NDArray[np.intp]],
    at: Mapping[str, NDArray[np.intp]],
) -> Sequence[Factor]:
    """Factors whose product is the expression. taken: levels left of its free columns.  at: where levers are set."""
    if isinstance(of, Share):
        return [joint.share(of).taken(taken)]
    if isinstance(of, Product):
        return [factor for part in of.parts for factor in _factors(part, joint, taken, at)]
    if isinstance(of, Sum):
        inside = {column: positions for column, positions in taken.items() if column not in of.over}
        return eliminated(_factors(of.of, joint, inside, at), of.over)
    if isinstance(of, Ratio):
        above, below = (multiplied(_factors(part, joint, taken, at)) for part in (of.above, of.below))
        return [divided(above, below)]
    assert isinstance(of, Set)
    set_there = {column: at[column] for column in of.columns}
    return [factor.without(of.columns) for factor in _factors(of.of, joint, {**taken, **set_there}, at)]
