"""What stands above the lanes of Ask: question, answer, beam, counted line, cautions, key strip, filter."""

from __future__ import annotations

from dataclasses import dataclass, replace
from urllib.parse import parse_qsl

from markupsafe import Markup

from app.drawing.answer_beam import Mark, World, answer_beam
from app.drawing.scale import PER_CENT
from app.pages.ask_cards import Address
from app.pages.asking import DRAWS, EACH, SEED, Asked
from app.question import SHOWS, query
from app.store import Study
from app.wording.answers import also_sentence, counted_sentence, had_sentence
from app.wording.computed import intervals, method, size
from app.wording.parts import plain
from app.wording.values import Words, either, is_yes, value
from engine.answering.answer import Caution
from engine.records.table import SMALL_COUNT

WORDS: dict[World, str] = {"recorded": "as recorded", "among": "among these", "set": "if set"}
RANKS = (("blocks", "Blocks the answer"), ("weakens", "Weakens it"), ("know", "Worth knowing"))


@dataclass(frozen=True)
class Key:
    """One world in the key strip. figure: its share in question, or "withheld"."""

    world: World
    words: str
    figure: str


@dataclass(frozen=True)
class WayOut:
    """What a person can do about a question that was refused."""

    words: str
    address: str


@dataclass(frozen=True)
class Also:
    """Another watched column. address: where it becomes the column of the answer sentence."""

    column: str
    what: tuple[object, ...]
    figures: tuple[object, ...]
    address: str


def heading(asked: Asked) -> str:
    """The column in question as the key strip and the beam name it."""
    wanted = asked.wanted(asked.watch)
    if not wanted:
        unit = asked.spine.nodes[asked.watch].unit
        return f"{asked.watch}, {f'{unit} ' if unit else ''}on average"
    return asked.watch if is_yes(wanted) else f"{asked.watch}: {either(wanted)}"


def keys(asked: Asked) -> list[Key]:
    """The worlds shown, with their figures; they agree with the sentence to the last digit."""
    found = asked.estimates(asked.watch)
    figures: list[tuple[World, str]] = [("recorded", found.figure(found.recorded))]
    if found.change is not None and asked.shows_set:
        start, end = found.change.ends
        recorded = found.figure(found.recorded, found.change.decimals)
        figures = [("recorded", recorded), ("among", start)] if asked.shows_among else [("recorded", start)]
        figures.append(("set", end))
    elif asked.shows_among:
        figures = list(zip(("recorded", "among"), found.gap.ends, strict=True))
    if asked.blocked:
        figures.append(("set", "withheld"))
    return [Key(world, WORDS[world], figure) for world, figure in figures]


def beam(asked: Asked) -> Markup:
    """The shares in question on a rule from 0 to 100 %; means on one over the recorded values."""
    found = asked.estimates(asked.watch)
    worlds = {"recorded": found.recorded, "among": found.among, "set": found.set}
    scale = asked.scale(asked.watch) if found.of_a_number else PER_CENT
    marks, told = [], []
    for key in keys(asked):
        estimate = worlds[key.world]
        told.append(f"{key.words} {key.figure}")
        if key.figure != "withheld" and estimate is not None:
            marks.append(
                Mark(key.world, key.words, key.figure, estimate.point, estimate.low, estimate.high, estimate.inner)
            )
    compared: tuple[World, World] | None = None
    if asked.shows_set:
        compared = ("among" if asked.shows_among else "recorded", "set")
    return answer_beam(marks, f"{heading(asked)}: {', '.join(told)}.", compared, scale)


def had(asked: Asked) -> Words:
    """The line that keeps those who had it anyway apart from the effect; empty when there is nothing to tell."""
    if not asked.shows_set:
        return []
    return had_sentence(asked.question, asked.estimates(asked.watch), asked.spine.nodes)


def counted(asked: Asked) -> Words:
    """What the records hold; empty for a model without records."""
    answer = asked.answer
    if answer.matching is None:
        return []
    wanted, count = asked.wanted(asked.watch), answer[asked.watch].counted
    question = asked.question if asked.refusal is None else replace(asked.question, pins={}, levers={})
    matching, every = answer.matching, asked.spine.records
    decimals = asked.estimates(asked.watch).decimals or 0
    nodes = asked.spine.nodes
    return counted_sentence(question, asked.watch, wanted, count, matching, nodes, SMALL_COUNT, every, decimals)


def also(asked: Asked, address: Address) -> list[Also]:
    """The other watched columns."""
    found = []
    for column in asked.watched[1:]:
        what, figures = also_sentence(
            asked.question,
            column,
            asked.wanted(column),
            asked.estimates(column),
            asked.spine.nodes,
            asked.blocked,
        )
        found.append(Also(column, tuple(what), tuple(figures), address(asked.question.watching(column))))
    return found


def colophon(asked: Asked, study: Study) -> str:
    """How the answer was computed."""
    links = len(asked.spine.model.links)
    words = [
        method(asked.answer),
        f"{size(links, study.links is not None)}; {intervals(asked.answer, DRAWS, EACH)}; seed {SEED}.",
    ]
    if len(asked.apart) < len(asked.question.levers):  # else the answer says so
        for lever in asked.spine.names.ordered(asked.apart):
            words.append(f"In this model no link leads from {lever} to {asked.watch}, nor any chain of them.")
    return " ".join(words)


def ranks(asked: Asked) -> list[tuple[str, str, list[Caution]]]:
    """Cautions by rank; a rank without any is left out."""
    found = [(rank, words, [each for each in asked.answer.cautions if each.rank == rank]) for rank, words in RANKS]
    return [(rank, words, cautions) for rank, words, cautions in found if cautions]


def checks(asked: Asked) -> str | None:
    """How many checks were made when none of them blocks; None where one does."""
    made = asked.answer.checks_made
    if asked.answer.blocked or not made:
        return None
    return f"{made} {'check' if made == 1 else 'checks'} made; none blocks."


def count_of_cautions(asked: Asked) -> str | None:
    """For the key strip: the highest rank that has any."""
    for rank, _, cautions in ranks(asked):
        number = f"{len(cautions)} {'caution' if len(cautions) == 1 else 'cautions'}"
        match rank:
            case "blocks":
                return f"{number} {'blocks' if len(cautions) == 1 else 'block'} it"
            case "weakens":
                return f"{number} {'weakens' if len(cautions) == 1 else 'weaken'} it"
            case _:
                return f"{number} worth knowing"
    return checks(asked)


def shows(asked: Asked, address: Address) -> list[tuple[str, str, bool]]:
    """The three ways of showing the lanes: words, address, whether it is the one."""
    words = {"touched": "Watched and touched", "moved": "Moved", "all": f"All {len(asked.spine.columns)}"}
    kept = [show for show in SHOWS if show != "moved" or asked.question.touched]
    return [
        (words[show], address(replace(asked.question, show=show, find="")), show == asked.question.show)
        for show in kept
    ]


def hidden_fields(asked: Asked) -> list[tuple[str, str]]:
    """The question as the fields that the filter sends along."""
    return parse_qsl(query(replace(asked.question, find=""), asked.spine.names))


def ways_out(asked: Asked, address: Address) -> list[WayOut]:
    """One way out for each pin and lever that the refusal is about; for all of them when it names none."""
    question, refusal = asked.question, asked.refusal
    assert refusal is not None
    named = f"{refusal.where or ''} {refusal.message}"
    about = [column for column in (*question.pins, *question.levers) if column in named]
    ways = []
    for column in about or [*question.pins, *question.levers]:
        if column in question.pins:
            pin = plain(value(asked.spine.nodes[column], question.pins[column]))
            ways.append(WayOut(f"Take out {pin}", address(question.unpinned(column))))
        if column in question.levers:
            ways.append(WayOut(f"Do not set {column}", address(question.without_lever(column))))
    return list(dict.fromkeys(ways))


def status(asked: Asked) -> str:
    """What is spoken after a change: the answer sentence only."""
    return asked.said.text if asked.refusal is None else asked.refusal.message


def title(asked: Asked) -> str:
    return plain(asked.sentence)
