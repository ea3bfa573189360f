"""What a number is measured in, as the user states it: shown behind figures, never part of what is learned."""

from __future__ import annotations

from engine.refusal import Refusal, quoted

LONGEST = 20  # characters: a unit stands on the last figure of an axis


def checked_unit(column: str, unit: str) -> str:
    """The unit without spaces around it, "" for none.

    Raises Refusal for what is no text of one short line.
    """
    if not isinstance(unit, str):
        raise Refusal(f"The unit of {quoted(column)} is not a text.", where=column, do='Give a text such as "minutes".')
    bare = unit.strip()
    if not bare.isprintable():
        raise Refusal(
            f"The unit of {quoted(column)} holds a line break or a character that cannot be seen.",
            where=column,
            do="Type it again by hand, on one line.",
        )
    if len(bare) > LONGEST:
        raise Refusal(
            f"The unit of {quoted(column)} is {len(bare):,} characters long; at most {LONGEST} fit behind a figure.",
            where=column,
            do="Shorten it, such as “min” for “minutes”.",
        )
    return bare
