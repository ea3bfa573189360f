"""The order: what may influence what, as the user states it."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from enum import Enum

import pandas as pd

from engine.refusal import Refusal, quoted

Link = tuple[str, str]


class Direction(Enum):
    """Which way a number is better: engine.MORE and engine.LESS."""

    MORE = "more"
    LESS = "less"


MORE = Direction.MORE
LESS = Direction.LESS
Better = Direction | tuple[str, ...]


def better_levels(better: Better | None, levels: Sequence[str], has_blank: bool) -> tuple[str, ...]:
    """The levels whose share says how well an outcome does; none for a column that is no outcome.

    In the sequence of `levels`. MORE: the highest, LESS: the lowest; a blank, which stands last, is neither.
    """
    if isinstance(better, Direction):
        last = len(levels) - 1 - int(has_blank and len(levels) > 1)
        return (levels[last if better is Direction.MORE else 0],)
    return tuple(level for level in levels if level in (better or ()))


@dataclass(frozen=True)
class Stage:
    """A named group of columns that none of them is known to come before another."""

    name: str
    columns: tuple[str, ...]


@dataclass(frozen=True)
class Unrecorded:
    """A cause in no column that drives both `first` and `second`; `first` comes before `second`.

    direct: whether `first` may also lead to `second` directly. The records cannot tell; False rules that link out.
    """

    first: str
    second: str
    direct: bool = True


@dataclass(frozen=True)
class Order:
    """Stages, early to late: a column may lead to columns of its own stage and of later ones.

    stages: (name, columns) pairs or Stages.  insist, rule_out: (source, target) links.
    unrecorded: pairs of columns that share a cause which is in no column; within a stage they say which comes first.
    changeable: columns that may get a lever.  outcomes: column -> its better level or levels, or MORE or LESS.

    Raises Refusal for a column in two places, for a column that no stage holds, for what is no stage, link, unrecorded
    cause or better level, and for links and unrecorded causes that contradict the stages or each other.
    """

    stages: tuple[Stage, ...]
    insist: tuple[Link, ...] = ()
    rule_out: tuple[Link, ...] = ()
    unrecorded: tuple[Unrecorded, ...] = ()
    changeable: tuple[str, ...] = ()
    outcomes: Mapping[str, Better] = field(default_factory=dict)
    _places: Mapping[str, int] = field(init=False, repr=False, compare=False)
    _led: Mapping[str, frozenset[str]] = field(init=False, repr=False, compare=False)

    def __init__(
        self,
        stages: Iterable[Stage | tuple[str, Iterable[str]]],
        insist: Iterable[Link] = (),
        rule_out: Iterable[Link] = (),
        unrecorded: Iterable[Unrecorded] = (),
        changeable: Iterable[str] = (),
        outcomes: Mapping[str, str | Direction | Iterable[str]] | None = None,
    ) -> None:
        def keep(name: str, value: object) -> None:
            object.__setattr__(self, name, value)

        keep("stages", tuple(_stage(stage) for stage in stages))
        keep("insist", _links(insist, "insist"))
        keep("rule_out", _links(rule_out, "rule_out"))
        keep("unrecorded", tuple(_unrecorded(given) for given in unrecorded))
        keep("changeable", tuple(dict.fromkeys(changeable)))
        keep("outcomes", {column: _better(column, better) for column, better in (outcomes or {}).items()})
        keep("_places", self._placed())
        self._check_names()
        keep("_led", _reached(self.columns, (*self.insist, *((each.first, each.second) for each in self.unrecorded))))
        self._check_links()
        self._check_unrecorded()

    @property
    def columns(self) -> tuple[str, ...]:
        """Every column, stage by stage."""
        return tuple(column for stage in self.stages for column in stage.columns)

    def stage_of(self, name: str) -> int:
        """Position of the column's stage, 0 the earliest. Raises Refusal for a column that no stage holds."""
        if name not in self._places:
            raise Refusal(
                f"The order has no column {quoted(name)}.", where=name, do="Put it into a stage or take it out."
            )
        return self._places[name]

    def may_lead(self, source: str, target: str) -> bool:
        """Whether a link from `source` to `target` is allowed."""
        return self._verdict(source, target)[0]

    def why(self, source: str, target: str) -> str:
        """Why `source` may or may not lead to `target`, in words."""
        return self._verdict(source, target)[1]

    def allows(self) -> pd.DataFrame:
        """Every ordered pair of columns: source, target, allowed, why."""
        rows = [
            (source, target, *self._verdict(source, target))
            for source in self.columns
            for target in self.columns
            if source != target
        ]
        return pd.DataFrame(rows, columns=["source", "target", "allowed", "why"])

    def _verdict(self, source: str, target: str) -> tuple[bool, str]:
        early, late = self.stage_of(source), self.stage_of(target)
        if source == target:
            return False, "a column does not lead to itself"
        if early > late:
            return False, f"{self.stages[early].name} comes after {self.stages[late].name}"
        if (source, target) in self.insist:
            return True, "you insist on it"
        if (source, target) in self.rule_out:
            return False, "you ruled it out"
        for pair in self.unrecorded:
            if (source, target) == (pair.first, pair.second) and not pair.direct:
                return False, "you said that only something unrecorded ties them, no direct link"
            if (source, target) == (pair.second, pair.first):
                return False, f"you said that {pair.first} comes first"
        if source in self._led[target]:
            return False, "it would close a circle with what you said comes first"
        if early == late:
            return True, f"both are in {self.stages[early].name}"
        return True, f"{self.stages[early].name} comes before {self.stages[late].name}"

    def _placed(self) -> dict[str, int]:
        places: dict[str, int] = {}
        for place, stage in enumerate(self.stages):
            for column in stage.columns:
                if column in places:
                    first = self.stages[places[column]].name
                    raise Refusal(
                        f"The column {quoted(column)} is in the order twice: in {first} and in {stage.name}.",
                        where=column,
                        do="Keep it in one stage.",
                    )
                places[column] = place
        return places

    def _check_names(self) -> None:
        mentions = [("insist", name) for link in self.insist for name in link]
        mentions += [("rule_out", name) for link in self.rule_out for name in link]
        mentions += [("unrecorded", name) for pair in self.unrecorded for name in (pair.first, pair.second)]
        mentions += [("changeable", name) for name in self.changeable]
        mentions += [("outcomes", name) for name in self.outcomes]
        for where, name in mentions:
            if name not in self._places:
                raise Refusal(
                    f"The column {quoted(name)} is in no stage of the order.",
                    where=where,
                    do="Put it into a stage, or say nothing of it.",
                )

    def _check_links(self) -> None:
        for source, target in self.insist:
            if source == target:
                raise Refusal(f"{quoted(source)} cannot lead to itself.", where="insist", do="Take that link out.")
            early, late = self._places[source], self._places[target]
            if early > late:
                raise Refusal(
                    f"You insist that {quoted(source)} leads to {quoted(target)}, but "
                    f"{self.stages[early].name} comes after {self.stages[late].name}.",
                    where="insist",
                    do="Move one of the columns, or take that link out.",
                )
            if (source, target) in self.rule_out:
                raise Refusal(
                    f"You insist that {quoted(source)} leads to {quoted(target)} and rule it out as well.",
                    where="insist",
                    do="Keep one of the two.",
                )
            if source in self._led[target]:
                raise Refusal(
                    f"What you say comes first runs in a circle through {quoted(source)} and {quoted(target)}.",
                    where="insist",
                    do="Take one link of the circle out.",
                )

    def _check_unrecorded(self) -> None:
        said: set[frozenset[str]] = set()
        for pair in self.unrecorded:
            first, second = quoted(pair.first), quoted(pair.second)
            early, late = self._places[pair.first], self._places[pair.second]
            wrong = do = None
            if pair.first == pair.second:
                wrong, do = f"{first} cannot share an unrecorded cause with itself.", "Name two columns."
            elif frozenset((pair.first, pair.second)) in said:
                wrong, do = f"The unrecorded cause of {first} and {second} is stated twice.", "State it once."
            elif early > late:
                after = f"{self.stages[early].name} comes after {self.stages[late].name}"
                wrong, do = f"{first} is said to come before {second}, but {after}.", f"Name {second} first."
            elif pair.first in self._led[pair.second]:
                wrong = f"What you say comes first runs in a circle through {first} and {second}."
                do = "Name the two in the other sequence, or take a link that you insist on out."
            elif not pair.direct and (pair.first, pair.second) in self.insist:
                wrong = f"You insist that {first} leads to {second} and say that it does not lead there directly."
                do = "Keep one of the two."
            if wrong is not None:
                raise Refusal(wrong, where="unrecorded", do=do)
            said.add(frozenset((pair.first, pair.second)))


def _stage(stage: Stage | tuple[str, Iterable[str]]) -> Stage:
    if isinstance(stage, Stage):
        return stage
    if isinstance(stage, str) or len(stage) != 2:
        raise Refusal(f"{stage!r} is no stage.", where="stages", do='Write ("its name", ["column", "column"]).')
    name, columns = stage
    if isinstance(columns, str):
        columns = (columns,)
    return Stage(str(name), tuple(columns))


def _links(links: Iterable[Link], where: str) -> tuple[Link, ...]:
    given = list(links)
    for link in given:
        if isinstance(link, str) or len(link) != 2:
            raise Refusal(f"{link!r} is no link.", where=where, do='Write ("earlier column", "later column").')
    return tuple(dict.fromkeys((source, target) for source, target in given))


def _unrecorded(given: object) -> Unrecorded:
    if not isinstance(given, Unrecorded) or not isinstance(given.direct, bool):
        raise Refusal(
            f"{given!r} is no unrecorded cause of two columns.",
            where="unrecorded",
            do='Write engine.Unrecorded("earlier column", "later column", direct=True).',
        )
    return given


def _better(column: str, better: str | Direction | Iterable[str]) -> Better:
    if isinstance(better, Direction):
        return better
    levels = (better,) if isinstance(better, str) else tuple(better) if isinstance(better, Iterable) else ()
    if not levels or not all(isinstance(level, str) for level in levels):
        raise Refusal(
            f"The outcome {quoted(column)} has no level that counts as better.",
            where="outcomes",
            do="Name its better level or levels as texts, or engine.MORE or engine.LESS for a number.",
        )
    return levels


def _reached(columns: Sequence[str], links: Sequence[Link]) -> dict[str, frozenset[str]]:
    """column -> every column that the links lead to from it, itself only when they run in a circle."""
    onward: dict[str, list[str]] = {column: [] for column in columns}
    for source, target in links:
        onward[source].append(target)
    reached: dict[str, frozenset[str]] = {}
    for column in columns:
        found: set[str] = set()
        ahead = list(onward[column])
        while ahead:
            name = ahead.pop()
            if name not in found:
                found.add(name)
                ahead.extend(onward[name])
        reached[column] = frozenset(found)
    return reached
