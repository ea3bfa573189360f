"""What the Trust page says of a model: the rule, what it misses, thin places, blanks, and what to do about each."""

from __future__ import annotations

import math

from app.wording.amounts import count, people, plural, small_word
from app.wording.figures import share
from app.wording.parts import Part, name, say, series
from engine.judging.blank import Blank
from engine.judging.judgement import ColumnScore, Judgement, Reliability, Test
from engine.judging.missed import Missed
from engine.judging.rule import ahead, points
from engine.judging.thin import Thin
from engine.records.table import SMALL_COUNT

Said = list[Part]

VERDICTS = {"yes": "Yes.", "in part": "In part.", "no": "No."}
ORDER = (
    "It cannot say whether the order is right: a model with some links turned round could pass all four just as well."
)
WHAT_TO_DO = {
    "base rates": "Nothing recorded before it tells much of it, or the model leaves it out: look on Model for links to "
    "it, and on Records for a column that was left out.",
    "come true": "Allow more links on Model, or cut numbers into other bands on Records.",
    "yardstick": "The columns before it tell more than the model takes from them: allow more links or one parent more "
    "on Model, or cut numbers elsewhere on Records.",
    "missed": "Allow one more link on Model, or insist on it on Order.",
}


def met(tests: tuple[Test, ...]) -> str:
    """How many are met, as a sentence."""
    held = sum(each.met for each in tests)
    if held == len(tests):
        return "All four tests are met."
    if not held:
        return "None of the four tests is met."
    number = small_word(held).capitalize()
    return f"{number} of four tests {plural(held, 'is', 'are')} met."


def figure(test: Test) -> str:
    """The figure before a test."""
    if test.code == "missed":
        return "none" if test.held == 0 else count(test.held)
    return f"{count(test.held)} of {count(test.of)}"


def told(test: Test, judgement: Judgement) -> Said:
    """What is tested and found."""
    outcomes = [each for each in judgement.columns if each.outcome]
    match test.code:
        case "base rates":
            behind = [name(each.column) for each in outcomes if not ahead(each)]
            first = "outcomes are predicted better than from their base rates, on records held out of the learning"
            return _said(first, *(("; not ", series(behind)) if behind else ()), ".")
        case "come true":
            counts = [_said(name(each.column), f" in {each.agree}") for each in judgement.reliability if each.outcome]
            first = "outcomes come true about as often as said, within what chance allows, in at least 9 of 10 tenths: "
            return _said(first, series(counts), ".")
        case "yardstick":
            gains = [
                _said(name(each.column), f" {of_yardstick(each)}") for each in outcomes if each.yardstick is not None
            ]
            first = "outcomes gain at least three quarters of what the yardstick gains"
            return _said(first, *((": ", series(gains)) if gains else ("; no column may come before them",)), ".")
    between = "between a changeable column and an outcome"
    if test.held == 1:
        return _said(f"dependence {between} is missed; none may be.")
    return _said(f"dependences {between} are missed{'; none may be' if test.held else ''}.")


def of_yardstick(score: ColumnScore) -> str:
    """8 of 9, in score points; 8 where no yardstick was tried."""
    own = points(score.gain.mean)
    return own if score.yardstick is None else f"{own} of {points(score.yardstick.mean)}"


def come_true(said: Reliability) -> Said:
    """Where said and seen differ most."""
    if not said.levels:
        off = max(said.tenths, key=lambda each: abs(each.seen - each.said))
        place = said.tenths.index(off) + 1
        return _said(
            "Of the values of ",
            name(said.column),
            f", {_hundred(off.seen)} in 100 fell into the "
            f"{_ordinal(place)} tenth of what was foreseen, where 10 should.",
        )
    off = max(said.tenths, key=lambda each: abs(each.seen - each.said))
    levels = series([name(level) for level in said.levels], " or ")
    return _said(
        f"Where it said that about {_hundred(off.said)} in 100 would be ",
        levels,
        f", {_hundred(off.seen)} in 100 were.",
    )


def another_shape(said: Reliability) -> str:
    """What to do about a number whose values do not spread as foreseen."""
    return (
        f"Said and seen agree in {said.agree} of {len(said.tenths)} tenths: {said.column} is spread in another shape "
        "than the model takes for it. Lean on its mean, not on shares of its ends; or take it as a grade on Records."
    )


def missed_figure(missed: Missed) -> str:
    return "" if math.isnan(missed.seen) else share(missed.seen)


def missed(found: Missed) -> tuple[Said, str]:
    """What is missed, reading on from the figure, and what to do."""
    earlier, later, *others = found.columns
    if math.isnan(found.seen):
        by = _said(" differently by ", name(others[0])) if others else []
        sentence = _said(
            name(later),
            " depends on ",
            name(earlier),
            by,
            f" more than the model says; only groups of under {SMALL_COUNT} records show it.",
        )
    else:
        group = series([_said(name(column), " = ", name(level)) for column, level in found.when])
        levels = series([name(level) for level in found.levels], " or ")
        sentence = _said(
            "of those with ", group, " had ", name(later), " = ", levels, f"; the model says {share(found.said)}."
        )
    if found.counts and others:
        return sentence, (
            f"What {earlier} does differs by {others[0]}: allow links from both to {later} on Model, or pin "
            f"{others[0]} only with this in mind."
        )
    if found.counts:
        return sentence, WHAT_TO_DO["missed"]
    return sentence, "Neither a changeable column with an outcome: leave it, or allow one more link."


def thin(found: Thin) -> tuple[str, Said, str]:
    """Figure, sentence, what to do."""
    figure = "no" if found.records == 0 else people(found.records, SMALL_COUNT)
    noun = "record has" if found.records == 0 else "records have"
    group = series([_said(name(column), " = ", name(level)) for column, level in found.places], " with ")
    if len(found.places) == 1:
        return (
            figure,
            _said(f"{noun} ", group, "."),
            "Join it to another level in the table, or ask nothing of it alone.",
        )
    lever, level = found.places[0]
    if found.records < SMALL_COUNT:
        return figure, _said(f"{noun} ", group, "."), f"Do not set {lever} to {level} among them."
    return figure, _said(f"{noun} ", group, ". Answers there lean on the model."), "Pin fewer columns, or record more."


def blank(found: Blank, rows: int) -> tuple[str, Said, str]:
    """Figure, sentence, what to do."""
    figure = (
        share(found.share) if found.blanks >= SMALL_COUNT else f"under {max(math.ceil(100 * SMALL_COUNT / rows), 1)}%"
    )
    if found.taken == "drop row":
        sentence = _said("of ", name(found.column), ", and those rows are left out.")
        return figure, sentence, "If they differ from the others, answers hold only for those who stayed."
    if found.by is None:
        return figure, _said("of ", name(found.column), ", about the same in every group; a blank is a level."), ""
    column, level = found.by
    sentence = _said(
        *("of ", name(found.column), f": {share(found.there)} where ", name(column), " = ", name(level)),
        f", {share(found.elsewhere)} elsewhere. A blank is a level.",
    )
    return figure, sentence, "Find out why it was left blank there before leaning on either column."


def _said(*parts: object) -> Said:
    return [part for part in say(*parts) if isinstance(part, Part)]  # type: ignore[arg-type]


def _hundred(part: float) -> str:
    return share(part).removesuffix("%")


def _ordinal(place: int) -> str:
    return ("first", "second", "third", "fourth", "fifth", "sixth", "seventh", "eighth", "ninth", "last")[place - 1]
