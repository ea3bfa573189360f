"""Which pins contradict each other: the smallest set of them that no record can have together."""

from __future__ import annotations

from collections.abc import Callable, Collection, Iterable
from dataclasses import replace
from itertools import combinations

from engine.answering.pins import told
from engine.answering.scenes import Scene
from engine.network.network import Network
from engine.refusal import Refusal, quoted

SUBSETS = 400  # sets of pins tried, at most, when looking for the smallest

Pin = tuple[bool, str]  # whether it holds after the levers, and its column


def contradiction(
    network: Network, scene: Scene, possible: Callable[[Scene], bool], sampled: Collection[str] = ()
) -> Refusal:
    """Name the smallest set of pins that no record can have together, as far as it is sought.

    possible: whether a scene with some of the pins can be.  sampled: what could only be sampled; pins that were met by
    no sampled record need not contradict each other, which is then said.
    """
    every: list[Pin] = [(False, column) for column in scene.before.columns]
    every += [(True, column) for column in scene.after.columns]

    def can_be(some: Iterable[Pin]) -> bool:
        before = [column for late, column in some if not late]
        after = [column for late, column in some if late]
        return possible(replace(scene, before=scene.before.only(before), after=scene.after.only(after)))

    if sampled and can_be(every):
        return Refusal(
            f"Of the records drawn from this model, none has {_listed(network, scene, every)}, so nothing can be told.",
            where=", ".join(column for _, column in every),
            do="Take out a pin, or pin a wider range.",
        )
    found = list(every)
    for pin in list(found):  # leave out what the contradiction does not need
        rest = [other for other in found if other != pin]
        if rest and not can_be(rest):
            found = rest
    tried = 0
    for size in range(1, len(found)):
        for some in combinations(every, size):
            tried += 1
            if tried > SUBSETS:
                break
            if not can_be(some):
                return _impossible(network, scene, list(some))
    return _impossible(network, scene, found)


def _impossible(network: Network, scene: Scene, pins: list[Pin]) -> Refusal:
    columns = [column for _, column in pins]
    if len(pins) == 1:
        do = "Take this pin out."
        return Refusal(f"No record in this model can have {_listed(network, scene, pins)}.", where=columns[0], do=do)
    return Refusal(
        f"No record in this model can have {_listed(network, scene, pins)} together.",
        where=", ".join(columns),
        do=f"Take out one of these: {', '.join(map(quoted, columns))}.",
    )


def _listed(network: Network, scene: Scene, pins: list[Pin]) -> str:
    words = [
        told(network.node(column), scene.after if late else scene.before) + (" after the lever" if late else "")
        for late, column in pins
    ]
    return words[0] if len(words) == 1 else f"{', '.join(words[:-1])} and {words[-1]}"
