"""The question in the address: the only place that reads and writes the addresses of Ask and its printed page."""

from __future__ import annotations

import math
import unicodedata
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field, replace
from urllib.parse import quote

from engine.refusal import Refusal

LONGEST = 40  # letters of a name that go into an address
SHOWS = ("touched", "moved", "all")

Lever = tuple[str, float]  # a level and the share for whom it takes


@dataclass(frozen=True)
class Question:
    """What is asked, and how the page stands.

    pins: column -> levels it is seen at.  levers: column -> (level, reach), reach 0 to 1 with at most 6 decimals.
    watch: the column the answer sentence is about; None: the first outcome.
    opened, folded: cards opened or folded by hand.  whole: cards that show every level.
    find: text that columns are found by.  show: one of SHOWS.
    """

    pins: Mapping[str, tuple[str, ...]] = field(default_factory=dict)
    levers: Mapping[str, Lever] = field(default_factory=dict)
    watch: str | None = None
    opened: frozenset[str] = frozenset()
    folded: frozenset[str] = frozenset()
    whole: frozenset[str] = frozenset()
    find: str = ""
    show: str = SHOWS[0]

    @property
    def asked(self) -> Question:
        """The question alone, without how the page stands."""
        return Question(self.pins, self.levers, self.watch)

    @property
    def touched(self) -> bool:
        """Whether anything is pinned or set."""
        return bool(self.pins or self.levers)

    def pinned(self, column: str, levels: Iterable[str]) -> Question:
        """With this column pinned at these levels, and at no others."""
        return replace(self, pins={**self.pins, column: tuple(levels)})

    def unpinned(self, column: str) -> Question:
        return replace(self, pins={name: levels for name, levels in self.pins.items() if name != column})

    def with_lever(self, column: str, level: str, reach: float = 1.0) -> Question:
        return replace(self, levers={**self.levers, column: (level, reach)})

    def without_lever(self, column: str) -> Question:
        return replace(self, levers={name: lever for name, lever in self.levers.items() if name != column})

    def watching(self, column: str) -> Question:
        return replace(self, watch=column, folded=self.folded - {column})

    def opening(self, column: str) -> Question:
        return replace(self, opened=self.opened | {column}, folded=self.folded - {column})

    def folding(self, column: str) -> Question:
        return replace(self, opened=self.opened - {column}, folded=self.folded | {column})


class Misread(Refusal):
    """An address that does not say a question of this study. rest: what of it could be read."""

    def __init__(self, refusals: Sequence[Refusal], rest: Question) -> None:
        first = refusals[0]
        messages = dict.fromkeys(refusal.message for refusal in refusals)
        super().__init__(" ".join(messages), where=first.where, do=first.do)
        self.rest = rest


class Names:
    """Readable names for the addresses of one model's columns and levels, unique and the same on every page.

    columns: (name, levels) in the order of the study.
    """

    def __init__(self, columns: Sequence[tuple[str, Sequence[str]]]) -> None:
        self.columns = tuple(name for name, _ in columns)
        self.levels = {name: tuple(levels) for name, levels in columns}
        self._places = {name: place for place, name in enumerate(self.columns)}
        self.slugs = dict(zip(self.columns, slugs(self.columns, "column"), strict=True))
        self.quoted = {name: quote(slug) for name, slug in self.slugs.items()}
        self._named = {slug: name for name, slug in self.slugs.items()}
        self.level_slugs = {
            name: dict(zip(levels, slugs(levels, "level"), strict=True)) for name, levels in self.levels.items()
        }
        self.quoted_levels = {
            name: {level: quote(slug) for level, slug in found.items()} for name, found in self.level_slugs.items()
        }
        self._levels_named = {
            name: {slug: level for level, slug in found.items()} for name, found in self.level_slugs.items()
        }

    def ordered(self, columns: Iterable[str]) -> list[str]:
        """These columns in the order of the study."""
        return sorted(columns, key=self._places.__getitem__)

    def column(self, slug: str) -> str:
        """Raises Refusal when no column has that name."""
        if not slug:
            raise Refusal("The address names no column.", where=slug, do="Pick a column on the page.")
        if slug not in self._named:
            raise Refusal(
                f"There is no column “{slug}” in this model.",
                where=slug,
                do="It may have been left out or renamed since this address was written.",
            )
        return self._named[slug]

    def level(self, column: str, slug: str) -> str:
        """Raises Refusal when the column has no such level."""
        found = self._levels_named[column]
        if slug not in found:
            raise Refusal(
                f"The column {column} has no level “{slug}”.",
                where=slug,
                do=f"Its levels are {', '.join(list(self.levels[column])[:12])}.",
            )
        return found[slug]


def parse(parameters: Iterable[tuple[str, str]], names: Names) -> Question:
    """The question that an address asks. Raises Misread when a part of it cannot be read; nothing is dropped silently.

    parameters: (key, value) pairs after the "?", in their order.
    """
    reading = _Reading(names)
    for key, value in parameters:
        try:
            reading.take(key, value)
        except Refusal as refusal:
            reading.refused.append(refusal)
    found = reading.question()
    if reading.refused:
        raise Misread(reading.refused, found)
    return found


def query(question: Question, names: Names) -> str:
    """The question as the part of an address after "?"; empty when nothing is asked."""
    slugs_of, parts = names.quoted, []
    for column in names.ordered(question.pins):
        levels = [slug for level, slug in names.quoted_levels[column].items() if level in question.pins[column]]
        parts.append(f"pin={'.'.join([slugs_of[column], *levels])}")
    for column in names.ordered(question.levers):
        level, reach = question.levers[column]
        parts.append(f"set={slugs_of[column]}.{names.quoted_levels[column][level]}")
        if reach != 1.0:
            parts.append(f"reach={slugs_of[column]}.{per_cent(reach)}")
    if question.watch is not None:
        parts.append(f"watch={slugs_of[question.watch]}")
    for key, chosen in (("open", question.opened), ("fold", question.folded), ("whole", question.whole)):
        if chosen:
            parts.append(f"{key}={'.'.join(slugs_of[column] for column in names.ordered(chosen))}")
    if question.find:
        parts.append(f"find={quote(question.find, safe='')}")
    if question.show != SHOWS[0]:
        parts.append(f"show={question.show}")
    return "&".join(parts)


def url(key: str, question: Question, names: Names, page: str = "ask") -> str:
    """The address of a question of the study `key`, on Ask or on its printed page ("answer")."""
    asked = query(question, names)
    return f"/study/{key}/{page}" + (f"?{asked}" if asked else "")


def per_cent(share: float) -> str:
    """A share as a number of per cent, without a sign: 80, 12.5."""
    return f"{100 * share:.4f}".rstrip("0").rstrip(".")


def slugs(names: Sequence[str], nameless: str) -> list[str]:
    """A readable word for each name: small letters, digits and hyphens, unique among them."""
    taken: set[str] = set()
    found = []
    for name in names:
        wanted = _slug(name) or nameless
        slug, number = wanted, 1
        while slug in taken:
            number += 1
            slug = f"{wanted}-{number}"
        taken.add(slug)
        found.append(slug)
    return found


def _slug(name: str) -> str:
    bare = "".join(each for each in unicodedata.normalize("NFKD", name) if not unicodedata.combining(each))
    words = "".join(each if each.isalnum() else " " for each in bare.lower()).split()
    return "-".join(words)[:LONGEST].strip("-")


class _Reading:
    """One address while it is read."""

    def __init__(self, names: Names) -> None:
        self.names = names
        self.pins: dict[str, tuple[str, ...]] = {}
        self.levels: dict[str, str] = {}
        self.reaches: dict[str, float] = {}
        self.watch: str | None = None
        self.cards: dict[str, frozenset[str]] = {"open": frozenset(), "fold": frozenset(), "whole": frozenset()}
        self.find = ""
        self.show = SHOWS[0]
        self.refused: list[Refusal] = []

    def take(self, key: str, value: str) -> None:
        start, _, rest = key.partition(".")
        if start == "reach" and rest:  # from the form on a card, which knows its column but not what will be typed
            key, value = "reach", f"{rest}.{value}"
        match key:
            case "pin":
                self._once(key, value, self.pins)
                column, levels = self._column_and_levels(value)
                self.pins[column] = levels
            case "set":
                self._once(key, value, self.levels)
                column, levels = self._column_and_levels(value)
                if len(levels) != 1:
                    raise Refusal(f"{column} can be set to one level only.", where=value, do="Set it to one level.")
                self.levels[column] = levels[0]
            case "reach":
                slug, _, typed = value.partition(".")
                self.reaches[self.names.column(slug)] = _reach(typed, self.names.column(slug))
            case "watch":
                self.watch = self.names.column(value)
            case "open" | "fold" | "whole":
                self.cards[key] = frozenset(self.names.column(slug) for slug in value.split(".") if slug)
            case "find":
                self.find = " ".join(value.split())[:200]
            case "show":
                if value not in SHOWS:
                    raise Refusal(f"The page cannot show “{value}”.", where=key, do="Use the links above the lanes.")
                self.show = value
            case _:
                raise Refusal(
                    f"The address holds “{key}”, which means nothing here.", where=key, do="Ask on the page instead."
                )

    def question(self) -> Question:
        for column in set(self.reaches) - set(self.levels):
            self.refused.append(
                Refusal(f"A reach is given for {column}, which is not set.", where=column, do=f"Set {column} first.")
            )
        order = self.names.ordered
        return Question(
            pins={column: self.pins[column] for column in order(self.pins)},
            levers={column: (self.levels[column], self.reaches.get(column, 1.0)) for column in order(self.levels)},
            watch=self.watch,
            opened=self.cards["open"],
            folded=self.cards["fold"],
            whole=self.cards["whole"],
            find=self.find,
            show=self.show,
        )

    def _once(self, key: str, value: str, before: Mapping[str, object]) -> None:
        column = self.names.column(value.partition(".")[0])
        if column in before:
            raise Refusal(
                f"The address has “{key}” twice for {column}.", where=value, do="Only the first of the two is used."
            )

    def _column_and_levels(self, value: str) -> tuple[str, tuple[str, ...]]:
        slug, *levels = value.split(".")
        column = self.names.column(slug)
        wanted = {self.names.level(column, level) for level in levels}
        if not wanted:
            raise Refusal(
                f"The address names {column}, but no level of it.", where=value, do="Pick a level on its card."
            )
        return column, tuple(level for level in self.names.levels[column] if level in wanted)


def _reach(typed: str, column: str) -> float:
    text = typed.strip().removesuffix("%").strip().replace(",", ".")
    try:
        number = float(text)
    except ValueError:
        number = math.nan
    if not 0.0 <= number <= 100.0:
        raise Refusal(
            f"“{typed.strip()}” is no share of people for whom {column} could be set.",
            where=column,
            do="Give a number from 0 to 100.",
        )
    return round(number / 100.0, 6)
