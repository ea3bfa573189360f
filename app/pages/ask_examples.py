"""Two questions to try on the first visit: those that came with a sample, else one pin and one lever of the study."""

from __future__ import annotations

import json
from collections.abc import Mapping
from functools import cache

from app.pages.ask_cards import Address
from app.pages.asking import Asked, Spine
from app.question import By, Question, Setting, To, Within
from app.resources import resource
from app.wording.parts import plain
from app.wording.values import setting_words, value, yes_level

SHOWN = 2
LIKELY = 0.2  # a pin on about one record in five shows a difference and has records behind it


def examples(asked: Asked, sample: str | None, address: Address) -> list[tuple[str, str]]:
    """Words and address of each example. sample: the folder of the sample that the study is, if it is one."""
    given = [] if sample is None else [_question(said) for said in _tries(sample)]
    questions = [question for question in given if _fits(asked.spine, question)] or _first_steps(asked)
    return [(_words(asked.spine, question), address(question)) for question in questions[:SHOWN]]


@cache
def _tries(sample: str) -> tuple[Mapping[str, Mapping[str, object]], ...]:
    path = resource("sample_data") / sample / "study.json"
    if not path.is_file():
        return ()
    return tuple(json.loads(path.read_text(encoding="utf-8")).get("try", ()))


def _question(said: Mapping[str, Mapping[str, object]]) -> Question:
    pins = {
        column: tuple(str(level) for level in levels)
        for column, levels in said.get("pins", {}).items()
        if isinstance(levels, list)
    }
    levers = {column: (_setting(given), 1.0) for column, given in said.get("levers", {}).items()}
    return Question(pins, levers)


def _setting(given: object) -> Setting:
    """A level by name; {"to": 12} or {"by": 2} for a number."""
    if not isinstance(given, Mapping):
        return str(given)
    return To(float(given["to"])) if "to" in given else By(float(given["by"]))


def _fits(spine: Spine, question: Question) -> bool:
    """Whether the study still has these columns and levels, and may set what is to be set."""
    pins = all(
        column in spine.nodes and not isinstance(pin, Within) and set(pin) <= set(spine.nodes[column].levels)
        for column, pin in question.pins.items()
    )
    levers = all(
        column in spine.changeable
        and (column in spine.numbers if not isinstance(setting, str) else _is_level(spine, column, setting))
        for column, (setting, _) in question.levers.items()
    )
    return pins and levers


def _is_level(spine: Spine, column: str, level: str) -> bool:
    return column not in spine.numbers and level in spine.nodes[column].levels


def _first_steps(asked: Asked) -> list[Question]:
    spine, found = asked.spine, []
    pinnable = [name for name in spine.columns if name not in spine.changeable and name not in asked.watched]
    if pinnable:
        column = min(pinnable, key=lambda name: spine.nodes[name].kind == "number")
        point = asked.answer[column].recorded.point
        real = range(len(point) - int(spine.nodes[column].has_blank and len(point) > 1))
        level = spine.nodes[column].levels[min(real, key=lambda place: abs(float(point[place]) - LIKELY))]
        found.append(Question({column: (level,)}))
    lever = next((name for name in spine.columns if name in spine.changeable and name != asked.watch), None)
    if lever is not None:
        found.append(Question({}, {lever: (_first_setting(asked, lever), 1.0)}))
    return found


def _first_setting(asked: Asked, column: str) -> Setting:
    if column in asked.spine.numbers:
        return By(asked.usual(column).step)
    node = asked.spine.nodes[column]
    return yes_level(node) or node.levels[0]


def _words(spine: Spine, question: Question) -> str:
    pins = [plain(value(spine.nodes[column], pin)) for column, pin in question.pins.items()]
    levers = [
        f"{column} set {setting_words(spine.nodes[column], setting)}"
        for column, (setting, _) in question.levers.items()
    ]
    return ", ".join([*pins, *levers])
