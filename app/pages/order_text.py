"""The order as text, one line a stage: "Who they are: age band, schooling"."""

from __future__ import annotations

from collections.abc import Collection, Iterable, Iterator, Sequence
from itertools import pairwise

from app.store.values import StagePlan
from engine.refusal import Refusal

SPECIAL = ':,"\n\r'


def write(stages: Iterable[StagePlan]) -> str:
    """The stages as text that `read` takes back. A name that holds a colon, a comma or a quote stands in quotes."""
    return "\n".join(f"{_quoted(name)}: {', '.join(map(_quoted, columns))}".rstrip() for name, columns in stages)


def read(text: str, columns: Sequence[str], left_out: Collection[str] = ()) -> tuple[StagePlan, ...]:
    """The stages that `text` states for a table with `columns`, not counting those that are left out.

    Case and spaces do not matter where they leave no doubt. Raises Refusal for a line without a name, and for a
    column that the table does not have or that no line names.
    """
    stages: list[StagePlan] = []
    wanted = _Columns(columns, left_out)
    for number, line in enumerate(_lines(text), start=1):
        if not line.strip():
            continue
        where = f"line {number}"
        name, after, rest = _until(line, ":")
        if not after:
            raise Refusal(
                f"Line {number} has no colon, so its stage has no name.",
                where=where,
                do="Write the stage's name, a colon, then its columns with commas between them.",
            )
        name = _unquoted(name)
        if not name:
            raise Refusal(f"Line {number} has no name before the colon.", where=where, do="Give the stage a name.")
        held = [wanted.find(_unquoted(word), where) for word in _split(rest) if word.strip()]
        stages.append((name, tuple(held)))
    if not stages:
        raise Refusal("No stage was typed.", where="line 1", do="Write one line a stage, the earliest first.")
    return tuple(stages)


class _Columns:
    """Finds a column by its name, else by its name without regard to case and spaces."""

    def __init__(self, columns: Sequence[str], left_out: Collection[str]) -> None:
        self._columns = columns
        self._left_out = {_plain(column) for column in left_out}
        self._alike: dict[str, list[str]] = {}
        for column in columns:
            self._alike.setdefault(_plain(column), []).append(column)

    def find(self, name: str, where: str) -> str:
        if name in self._columns:
            return name
        alike = self._alike.get(_plain(name), [])
        if len(alike) == 1:
            return alike[0]
        if not alike and _plain(name) in self._left_out:
            raise Refusal(
                f"{where.capitalize()} names “{name}”, which is left out, so no stage can hold it.",
                where=where,
                do="Take it out of the line, or choose another kind for it on the Records page.",
            )
        raise Refusal(
            f"{where.capitalize()} names “{name}”, which is no column of these records.",
            where=where,
            do=f"The columns are {', '.join(self._columns)}.",
        )


def _plain(name: str) -> str:
    return " ".join(name.split()).casefold()


def _quoted(name: str) -> str:
    if name == name.strip() and name and not any(letter in name for letter in SPECIAL):
        return name
    return '"' + name.replace('"', '""') + '"'


def _unquoted(word: str) -> str:
    word = word.strip()
    if len(word) >= 2 and word.startswith('"') and word.endswith('"'):
        return word[1:-1].replace('""', '"')
    return word


def _until(line: str, mark: str) -> tuple[str, str, str]:
    """`line` before and after the first `mark` outside quotes."""
    for place in _outside(line, mark):
        return line[:place], mark, line[place + 1 :]
    return line, "", ""


def _split(text: str) -> list[str]:
    places = [-1, *_outside(text, ","), len(text)]
    return [text[before + 1 : after] for before, after in pairwise(places)]


def _lines(text: str) -> list[str]:
    """Lines, but a line break inside quotes belongs to a name."""
    text = text.replace("\r\n", "\n")
    places = [-1, *_outside(text, "\n"), len(text)]
    return [text[before + 1 : after] for before, after in pairwise(places)]


def _outside(text: str, mark: str) -> Iterator[int]:
    inside = False
    for place, letter in enumerate(text):
        if letter == '"':
            inside = not inside
        elif letter == mark and not inside:
            yield place
