"""Reads the address of a question: what it asks, or what in it cannot be read and why."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence

from app import typed
from app.names import Names
from app.question import SHOWS, By, Pin, Question, Setting, To, Within
from engine.records.wording import figure
from engine.refusal import Refusal

FORMS = ("reach", "set", "shift", "from", "under")  # fields of a card: these with the column, as in reach.mentor


class Misread(Refusal):
    """An address that does not say a question of this study. rest: what of it could be read."""

    def __init__(self, refusals: Sequence[Refusal], rest: Question) -> None:
        first = refusals[0]
        messages = dict.fromkeys(refusal.message for refusal in refusals)
        super().__init__(" ".join(messages), where=first.where, do=first.do)
        self.rest = rest


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


def from_a_form(parameters: Iterable[tuple[str, str]]) -> bool:
    """Whether a form was sent, whose fields have an address of their own that says the same."""
    return any(
        (key == "find" and not value) or ("." in key and key.partition(".")[0] in FORMS) for key, value in parameters
    )


class _Reading:
    """One address while it is read."""

    def __init__(self, names: Names) -> None:
        self.names = names
        self.pins: dict[str, Pin] = {}
        self.levers: dict[str, Setting] = {}
        self.reaches: dict[str, float] = {}
        self.tried: set[str] = set()  # columns that something sets, readable or not
        self.ends: dict[str, dict[str, float]] = {}
        self.watch: str | None = None
        self.cards: dict[str, frozenset[str]] = {"open": frozenset(), "fold": frozenset(), "whole": frozenset()}
        self.find = ""
        self.show = SHOWS[0]
        self.refused: list[Refusal] = []

    def take(self, key: str, value: str) -> None:
        start, _, slug = key.partition(".")
        if start in FORMS and slug:
            self._typed(start, slug, value)
            return
        match key:
            case "pin":
                column, parts = self._column(value)
                self._once(key, column, self.pins)
                self.pins[column] = self._pin(column, parts, value)
            case "set":
                column, parts = self._column(value)
                self._lever_once(key, column)
                self.levers[column] = self._setting(column, parts, value)
            case "shift":
                slug, _, rest = value.partition(".")
                column = self.names.number(slug)
                self._lever_once(key, column)
                self.levers[column] = self._shift(column, rest.removeprefix("by."))
            case "reach":
                slug, _, rest = value.partition(".")
                column = self.names.column(slug)
                self.reaches[column] = typed.share(rest, column)
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
        for column, ends in self.ends.items():
            try:
                self._once("pin", column, self.pins)
                self.pins[column] = self._range(column, ends)
            except Refusal as refusal:
                self.refused.append(refusal)
        for column in set(self.reaches) - self.tried:
            self.refused.append(
                Refusal(f"A reach is given for {column}, which is not set.", where=column, do=f"Set {column} first.")
            )
        order = self.names.ordered
        return Question(
            pins={column: self.pins[column] for column in order(self.pins)},
            levers={column: (self.levers[column], self.reaches.get(column, 1.0)) for column in order(self.levers)},
            watch=self.watch,
            opened=self.cards["open"],
            folded=self.cards["fold"],
            whole=self.cards["whole"],
            find=self.find,
            show=self.show,
        )

    def _typed(self, start: str, slug: str, value: str) -> None:
        """A field of the form on a card, which knows its column but not what will be typed."""
        column = self.names.column(slug) if start == "reach" else self.names.number(slug)
        match start:
            case "reach":
                self.reaches[column] = typed.share(value, column)
            case "set" | "shift":
                self._lever_once(start, column)
                self.levers[column] = (
                    self._shift(column, value) if start == "shift" else To(typed.number(value, column))
                )
            case _ if value.strip():
                self.ends.setdefault(column, {})[start] = typed.number(value, column)

    def _lever_once(self, key: str, column: str) -> None:
        self._once(key, column, self.levers)
        self.tried.add(column)

    def _once(self, key: str, column: str, before: Mapping[str, object]) -> None:
        if column in before:
            raise Refusal(
                f"The address has “{key}” twice for {column}.", where=column, do="Only the first of the two is used."
            )

    def _column(self, value: str) -> tuple[str, list[str]]:
        slug, *parts = value.split(".")
        return self.names.column(slug), parts

    def _pin(self, column: str, parts: list[str], value: str) -> Pin:
        if column in self.names.numbers and parts and parts[0] in ("at", "from", "under"):
            if parts[0] == "at":
                at = typed.number(".".join(parts[1:]), column)
                return Within(at, at)
            cut = parts.index("under") if "under" in parts else len(parts)
            ends = {"from": parts[1:cut], "under": parts[cut + 1 :]}
            return self._range(
                column, {end: typed.number(".".join(found), column) for end, found in ends.items() if found}
            )
        return self._levels(column, parts, value)

    def _range(self, column: str, ends: Mapping[str, float]) -> Within:
        low, high = ends.get("from"), ends.get("under")
        if low is None and high is None:
            raise Refusal(f"The address names {column}, but no range of it.", where=column, do="Give it on its card.")
        if low is not None and high is not None and low >= high:
            raise Refusal(
                f"{column} cannot be {figure(low)} or over and under {figure(high)} at once.",
                where=column,
                do="Give the lower number first.",
            )
        return Within(low, high)

    def _setting(self, column: str, parts: list[str], value: str) -> Setting:
        if column in self.names.numbers:
            if parts[:1] != ["to"]:
                raise Refusal(f"{column} is a number and is set to a value.", where=value, do="Type one on its card.")
            return To(typed.number(".".join(parts[1:]), column))
        levels = self._levels(column, parts, value)
        if len(levels) != 1:
            raise Refusal(f"{column} can be set to one level only.", where=value, do="Set it to one level.")
        return levels[0]

    def _shift(self, column: str, text: str) -> By:
        amount = typed.number(text, column)
        if amount == 0:
            raise Refusal(f"A shift by 0 leaves {column} as it is.", where=column, do="Give any other number.")
        return By(amount)

    def _levels(self, column: str, parts: list[str], value: str) -> tuple[str, ...]:
        wanted = {self.names.level(column, level) for level in parts}
        if not wanted:
            raise Refusal(
                f"The address names {column}, but no level of it.", where=value, do="Pick a level on its card."
            )
        return tuple(level for level in self.names.levels[column] if level in wanted)
