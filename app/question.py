"""A question, and its address: the only place that writes the addresses of Ask and of its printed page."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field, replace
from urllib.parse import quote

from app.names import Names
from app.typed import per_cent, written

SHOWS = ("touched", "moved", "all")


@dataclass(frozen=True)
class Within:
    """A number seen in a range, low <= x < high; an end that is None is open. Both ends alike: exactly that value."""

    low: float | None = None
    high: float | None = None

    @property
    def value(self) -> float | None:
        return self.low if self.low == self.high else None


@dataclass(frozen=True)
class To:
    """A number set to a value."""

    value: float


@dataclass(frozen=True)
class By:
    """A number shifted by an amount."""

    amount: float


Pin = tuple[str, ...] | Within
Setting = str | To | By  # of a category a level, of a number where to or how far
Lever = tuple[Setting, float]  # and the share for whom it takes


@dataclass(frozen=True)
class Question:
    """What is asked, and how the page stands.

    pins: column -> levels it is seen at; a number may have a range.  levers: column -> (setting, reach), reach 0 to 1
    with at most 6 decimals.
    watch: the column the answer sentence is about; None: the first outcome.
    opened, folded: cards opened or folded by hand.  whole: cards that show every level.
    find: text that columns are found by.  show: one of SHOWS.
    """

    pins: Mapping[str, Pin] = field(default_factory=dict)
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

    def with_lever(self, column: str, setting: Setting, reach: float = 1.0) -> Question:
        return replace(self, levers={**self.levers, column: (setting, reach)})

    def without_lever(self, column: str) -> Question:
        return replace(self, levers={name: lever for name, lever in self.levers.items() if name != column})

    def watching(self, column: str) -> Question:
        return replace(self, watch=column, folded=self.folded - {column})

    def opening(self, column: str) -> Question:
        return replace(self, opened=self.opened | {column}, folded=self.folded - {column})

    def folding(self, column: str) -> Question:
        return replace(self, opened=self.opened - {column}, folded=self.folded | {column})


def query(question: Question, names: Names) -> str:
    """The question as the part of an address after "?"; empty when nothing is asked."""
    slugs_of, parts = names.quoted, []
    for column in names.ordered(question.pins):
        parts.append(f"pin={'.'.join([slugs_of[column], *_pinned(names, column, question.pins[column])])}")
    for column in names.ordered(question.levers):
        setting, reach = question.levers[column]
        match setting:
            case To(value):
                parts.append(f"set={slugs_of[column]}.to.{written(value)}")
            case By(amount):
                parts.append(f"shift={slugs_of[column]}.by.{written(amount)}")
            case level:
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


def _pinned(names: Names, column: str, pin: Pin) -> list[str]:
    """What is pinned, as the parts of an address: mixed, nights; from, 5, under, 12; at, 7."""
    if not isinstance(pin, Within):
        return [slug for level, slug in names.quoted_levels[column].items() if level in pin]
    if pin.value is not None:
        return ["at", written(pin.value)]
    ends = (("from", pin.low), ("under", pin.high))
    return [part for word, end in ends if end is not None for part in (word, written(end))]
