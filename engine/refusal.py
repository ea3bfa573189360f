"""Refusal: the one family of errors that are meant for people."""

from numbers import Integral


class Refusal(Exception):  # noqa: N818  a refusal is an answer to a person, not a fault in the program
    """What is wrong, where it is, and what to do about it.

    message: one sentence, plain text (names in it are not escaped).
    where: the place, such as "line 212" or a column's name, or None.
    do: one sentence that says what to do next, or None.
    """

    def __init__(self, message: str, where: str | None = None, do: str | None = None) -> None:
        super().__init__(message)
        self.message = message
        self.where = where
        self.do = do

    def __str__(self) -> str:
        return " ".join(part for part in (self.message, self.do) if part)


def quoted(text: object) -> str:
    """A column's name, a level or a file's name in a sentence, in full and between quotation marks."""
    return f"“{text}”"


def whole(given: object, name: str, least: int, do: str) -> int:
    """`given` as a whole number. Raises Refusal for anything else, and below `least`.

    name: of the keyword it was given for.  do: what to do instead.
    """
    if isinstance(given, bool) or not isinstance(given, Integral) or given < least:
        raise Refusal(f"{name} = {given} is no whole number of {least} or more.", where=name, do=do)
    return int(given)
