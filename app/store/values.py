"""What the store keeps, as frozen values that go to JSON and come back the same."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from datetime import datetime
from typing import Any, Literal

from engine.order import Better, Direction, Link, Order

StagePlan = tuple[str, tuple[str, ...]]  # a stage's name and its columns


@dataclass(frozen=True)
class Choices:
    """What the user decided about the columns: the keywords of engine.Table.from_frame.

    kinds: column -> kind.  bands: column -> inner cuts, ascending.  grades: column -> levels low to high.
    blanks: column -> "level" or "drop row".  A column that is not named is guessed.
    units: number -> what it is measured in; nothing that is learned depends on it.
    """

    kinds: Mapping[str, str] = field(default_factory=dict)
    bands: Mapping[str, tuple[float, ...]] = field(default_factory=dict)
    grades: Mapping[str, tuple[str, ...]] = field(default_factory=dict)
    blanks: Mapping[str, str] = field(default_factory=dict)
    units: Mapping[str, str] = field(default_factory=dict)

    def __post_init__(self) -> None:
        _keep(self, "kinds", dict(self.kinds))
        _keep(self, "bands", {name: tuple(float(cut) for cut in cuts) for name, cuts in self.bands.items()})
        _keep(self, "grades", {name: tuple(levels) for name, levels in self.grades.items()})
        _keep(self, "blanks", dict(self.blanks))
        _keep(self, "units", dict(self.units))

    @property
    def learned_from(self) -> str:
        """What a model depends on, as JSON: all but the units."""
        return _text({"kinds": self.kinds, "bands": self.bands, "grades": self.grades, "blanks": self.blanks})

    def to_json(self) -> str:
        held = {"kinds": self.kinds, "bands": self.bands, "grades": self.grades, "blanks": self.blanks}
        return _text({**held, "units": self.units})

    @classmethod
    def from_json(cls, text: str) -> Choices:
        return cls(**json.loads(text))


@dataclass(frozen=True)
class Plan:
    """The order as the user states it, before the engine has judged it.

    stages: early to late.  insist, rule_out: (source, target) links.  changeable: columns that may get a lever.
    outcomes: column -> its better levels, or engine.MORE or engine.LESS for a number.
    """

    stages: tuple[StagePlan, ...] = ()
    insist: tuple[Link, ...] = ()
    rule_out: tuple[Link, ...] = ()
    changeable: tuple[str, ...] = ()
    outcomes: Mapping[str, Better] = field(default_factory=dict)

    def __post_init__(self) -> None:
        _keep(self, "stages", tuple((str(name), tuple(columns)) for name, columns in self.stages))
        _keep(self, "insist", _links(self.insist))
        _keep(self, "rule_out", _links(self.rule_out))
        _keep(self, "changeable", tuple(dict.fromkeys(self.changeable)))
        _keep(self, "outcomes", {name: _better(wanted) for name, wanted in self.outcomes.items()})

    @property
    def columns(self) -> tuple[str, ...]:
        """Every column in a stage, early to late."""
        return tuple(column for _, columns in self.stages for column in columns)

    def order(self) -> Order:
        """The order as the engine takes it. Raises Refusal where the plan contradicts itself."""
        return Order(
            self.stages,
            insist=self.insist,
            rule_out=self.rule_out,
            changeable=self.changeable,
            outcomes=dict(self.outcomes),
        )

    def to_json(self) -> str:
        outcomes = {
            name: wanted.value if isinstance(wanted, Direction) else wanted for name, wanted in self.outcomes.items()
        }
        return _text(
            {
                "stages": self.stages,
                "insist": self.insist,
                "rule_out": self.rule_out,
                "changeable": self.changeable,
                "outcomes": outcomes,
            }
        )

    @classmethod
    def from_json(cls, text: str) -> Plan:
        return cls(**json.loads(text))


@dataclass(frozen=True)
class Asked:
    """The last question that got an answer.

    query: of its Ask page, without "?".  sentence: the answer, plain text.
    cautions: the rank of each caution beside it ("blocks", "weakens", "know").  at: with its time zone.
    """

    query: str
    sentence: str
    cautions: tuple[str, ...]
    at: datetime

    def to_json(self) -> str:
        return _text(
            {"query": self.query, "sentence": self.sentence, "cautions": self.cautions, "at": self.at.isoformat()}
        )

    @classmethod
    def from_json(cls, text: str) -> Asked:
        kept: dict[str, Any] = json.loads(text)
        return cls(kept["query"], kept["sentence"], tuple(kept["cautions"]), datetime.fromisoformat(kept["at"]))


@dataclass(frozen=True)
class Study:
    """One study as the store knows it, without its records.

    key: names it in addresses.  source: the file it was brought from.  sample: the sample it is, or None.
    rows: records kept.  columns: columns in the file.  digest: of the records and choices, hex.
    warnings: sentences from reading the file.  mended: what the last change of choices did to the plan, in sentences.
    links: the accepted budget, None until one is accepted.  recommended: of the learned file, None without one.
    max_parents: the most a column may have when it is learned the next time.
    model: "old" when the records' choices or the plan changed since it was learned.  asked: questions answered.
    """

    key: str
    name: str
    created: datetime
    source: str
    sample: str | None
    rows: int
    columns: int
    digest: str
    choices: Choices
    plan: Plan
    warnings: tuple[str, ...]
    mended: tuple[str, ...]
    links: int | None
    recommended: int | None
    max_parents: int
    model: Literal["none", "current", "old"]
    asked: int
    last: Asked | None

    @property
    def basis(self) -> str:
        """What a model of this study would be learned from, as a digest."""
        return basis(self.digest, self.choices, self.plan)


def basis(digest: str, choices: Choices, plan: Plan) -> str:
    """sha256 of the records, the choices that matter to a model and the plan, hex."""
    return hashlib.sha256(_text([digest, choices.learned_from, plan.to_json()]).encode()).hexdigest()


def _keep(value: object, name: str, kept: object) -> None:
    object.__setattr__(value, name, kept)


def _links(links: Iterable[Iterable[str]]) -> tuple[Link, ...]:
    pairs = []
    for link in links:
        source, target = link
        pairs.append((source, target))
    return tuple(dict.fromkeys(pairs))


def _better(wanted: Better | str | Iterable[str]) -> Better:
    if isinstance(wanted, Direction):
        return wanted
    return Direction(wanted) if isinstance(wanted, str) else tuple(wanted)


def _text(value: object) -> str:
    return json.dumps(value, ensure_ascii=True, separators=(",", ":"))
