"""What the Model page says of how a model was learned: what the records count for, and limits that were reached."""

from __future__ import annotations

from collections.abc import Sequence

from app.wording.amounts import count, listing, people
from engine.network.said import Said, Words, name, series
from engine.records.table import SMALL_COUNT

PAIRS = 3  # links that a sentence names


def counting(records: int, equal: float, worth: float, groups: int | None) -> tuple[str, ...]:
    """What weights and groups made of the records, in sentences; none without both.

    equal: records of equal weight that the weighted ones are worth.  worth: what they count for in the end, as groups
    of them are alike.  groups: how many, or None.
    """
    said = []
    weighted = round(equal) < records
    if weighted:
        said.append(
            f"By their weights the {count(records)} records are worth {count(round(equal))} of equal weight, and "
            "learning counts them so."
        )
    if groups is not None:
        alike = ""
        if round(worth) < round(equal):
            alike = f"Those of one are alike, so that all count as {count(round(worth))} separate cases. "
        said.append(
            f"The records stand in {people(groups, SMALL_COUNT)} groups. {alike}Each group is held out whole or not at "
            "all, so that no record is predicted from others of its group."
        )
    return tuple(said)


def at_limit(column: str, parents: Sequence[str], more: Sequence[str], odds: str) -> Words:
    """A column of which records say that it comes from more columns than learning allowed.

    parents: it has now.  more: those it would have with one more; some of the present ones may give way.  odds: for it.
    """
    new = [parent for parent in more if parent not in parents]
    limit = f" is at the limit of {len(more) - 1} {'parent' if len(more) == 2 else 'parents'}; "
    if len(new) == 1:
        rest: Words = (Said("one more, "), name(new[0]), Said(", would describe it better: the odds are "))
    else:
        rest = (*series([[name(parent)] for parent in more], " and "), Said(" together would describe it better: "))
        rest = (*rest, Said("the odds are "))
    return (name(column), Said(limit), *rest, Said(odds, "figure"), Said("."))


def shaped(pairs: Sequence[tuple[str, str]]) -> str:
    """Why nobody settles the direction between a category and a number of one stage.  pairs: those links."""
    told = [f"{source} goes with {target}" for source, target in pairs[:PAIRS]]
    if len(pairs) > PAIRS:
        told.append(f"{len(pairs) - PAIRS} more")
    return (
        f"Nobody settled {'this direction' if len(pairs) == 1 else 'these directions'}: {listing(told)}. Between a "
        "category and a number of one stage the shape of the number would decide it, not how the two hang together. If "
        "you know which comes first, give it an earlier stage on the Order page."
    )
