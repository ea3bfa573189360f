"""A world read by likelihood weighting (Fung & Chang 1990; Shachter & Peot 1990), where exact routes cost too much.

Columns are sampled parents first; what was seen is not sampled but weighed. Every column has chances of its own, by
its name and the seed, so that worlds of one question meet the same ones and the change between them has little noise;
particles of different draws of the parameters are independent.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from engine.answering.mixed import Drawn, MixedRead, MixedWorld
from engine.answering.sampling import Batch, Sampler
from engine.answering.weighed import Weighed

PARTICLES = 40_000  # sampled at first: half for the point answer, half spread over the draws
MOST = 100_000  # sampled at most, in batches that double what there is: for an answer within a click
A_DRAW = 100  # of every draw where 200 draws have PARTICLES together
AT_ONCE = 16_384  # particles in memory at once: 64 MB in a world of 400 columns


def a_draw(count: int) -> int:
    """Particles that give each of `count` draws as many as it has where there are 200 draws."""
    return 2 * A_DRAW * max(count, 1)


def weigh(
    world: MixedWorld, drawn: Drawn, count: int, seed: int, particles: int = PARTICLES, most: int = MOST
) -> MixedRead:
    """Read one world; see `weigh_together`."""
    return weigh_together([(world, drawn)], count, seed, particles, most)[0]


def weigh_together(
    worlds: Sequence[tuple[MixedWorld, Drawn]], count: int, seed: int, particles: int = PARTICLES, most: int = MOST
) -> list[MixedRead]:
    """Read worlds of one question on the same particles, for as long as any of them needs more.

    worlds: each with 1 + count draws of every node of it, the posterior mean first.
    The particles double until every standard error of a watched column is under a fifth of half its 90 % interval's
    width, or they would be more than `most`; both are counts, so that the same question has the same digits anywhere.
    The draws are calmed (see `tallies.calmed`). A draw in which no particle fits what was seen has log evidence -inf
    and is told like the point answer; where no particle of the point answer fits, everything is nan.
    """
    readings = [Weighed(Sampler(world, drawn, seed), 1 + count) for world, drawn in worlds]
    total, added, turn = 0, particles, 0
    while True:
        for batch in batches(added, count, turn):
            for reading in readings:
                reading.add(batch)
        total += added
        added, turn = total, turn + 1
        if total + added > most or all([reading.settled() for reading in readings]):
            return [reading.read() for reading in readings]


def batches(particles: int, count: int, turn: int) -> Iterator[Batch]:
    """Half of the particles for the point answer and half spread over `count` draws; all for the point without any."""
    left, part = (particles if count == 0 else (particles + 1) // 2), 0
    while left > 0:
        yield Batch(0, 1, min(left, AT_ONCE), (turn, 0, part))
        left, part = left - AT_ONCE, part + 1
    each = -(-(particles // 2) // count) if count else 0
    width = max(1, AT_ONCE // max(each, 1))
    for first in range(1, 1 + count, width):
        left, part = each, 0
        while left > 0:
            yield Batch(first, min(width, 1 + count - first), min(left, AT_ONCE), (turn, first, part))
            left, part = left - AT_ONCE, part + 1
