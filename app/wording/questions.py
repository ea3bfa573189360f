"""The question as a sentence whose clauses can be taken out again."""

from __future__ import annotations

from collections.abc import Mapping

from app.question import By, Lever, Question
from app.typed import per_cent
from app.wording.parts import Clause, Part, name, say, series
from app.wording.values import Words, set_to, subject, value
from engine.network.nodes import Node

Nodes = Mapping[str, Node]


def question_sentence(question: Question, watch: str, wanted: tuple[str, ...], nodes: Nodes) -> Words:
    """What is [watch] among records with [pins], if [levers]?

    wanted: the levels of `watch` that are in question; none where it is the mean of a number.
    """
    watched = Clause("watch", watch, _parts(subject(nodes[watch], wanted)))
    mean = "" if wanted else " on average"
    group = among(question, nodes, clauses=True) or [Part("across all records")]
    if not question.levers:
        return say("What is ", watched, f"{mean} ", group, "?")
    return say("What would ", watched, f" be{mean} ", group, " if ", _levers(question.levers, nodes), "?")


def among(question: Question, nodes: Nodes, clauses: bool = False) -> Words:
    """among records with [pins]; empty without pins."""
    if not question.pins:
        return []
    found: list[Words] = []
    for column, pin in question.pins.items():
        words = value(nodes[column], pin)
        found.append([Clause("pin", column, _parts(words))] if clauses else words)
    return say("among records with ", series(found))


def _levers(levers: Mapping[str, Lever], nodes: Nodes) -> Words:
    found: list[Words] = []
    for column, (setting, reach) in levers.items():
        verb = f" were {'raised' if setting.amount > 0 else 'lowered'} by " if isinstance(setting, By) else " were "
        parts = (name(column), Part(verb), name(set_to(nodes[column], setting)))
        found.append(say(Clause("set", column, parts), f" for {reach_words(reach)}"))
    return series(found)


def reach_words(reach: float) -> str:
    return "all of them" if reach == 1.0 else f"{per_cent(reach)}% of them"


def _parts(words: Words) -> tuple[Part, ...]:
    return tuple(part for part in words if isinstance(part, Part))
