"""Which counts of a column are hidden, so that none under the small-count limit can be worked out."""

from __future__ import annotations

from collections.abc import Sequence

from engine.records.table import SMALL_COUNT


def hidden_levels(counts: Sequence[int], small: int = SMALL_COUNT) -> tuple[int, ...]:
    """Positions of the counts under `small`, and of as many of the next smallest as it takes to cover them.

    counts: records at each level, 0 or more; a count of none is never hidden.
    """
    rising = sorted((place for place in range(len(counts)) if counts[place] > 0), key=lambda place: counts[place])
    hidden = [place for place in rising if counts[place] < small]
    if not hidden:
        return ()
    for place in rising[len(hidden) :]:
        if len(hidden) > 1 and sum(counts[each] for each in hidden) >= small:
            break
        hidden.append(place)
    return tuple(sorted(hidden))
