"""The answer as a sentence, and the quieter lines under it. Nothing here improves anything: it would move."""

from __future__ import annotations

from collections.abc import Collection
from dataclasses import dataclass

from app.question import By, Question, Setting
from app.typed import per_cent
from app.wording.estimates import Estimates
from app.wording.figures import Change, counted, gives_away
from app.wording.numbers import Move, amount
from app.wording.parts import Clause, Part, name, plain, say, series
from app.wording.questions import Nodes, among
from app.wording.units import apart, behind, of_change
from app.wording.values import Words, had_before, is_at, is_yes, set_to, subject, value
from engine.answering.answer import Counted
from engine.network.nodes import Node


@dataclass(frozen=True)
class Said:
    """An answer in words. headline: the sentence.  aside: its change and interval, quieter, on a line of their own."""

    headline: tuple[Part | Clause, ...]
    aside: tuple[Part | Clause, ...]

    @property
    def text(self) -> str:
        return f"{plain(self.headline)} {plain(self.aside)}".strip()


def answer_sentence(
    question: Question,
    watch: str,
    wanted: tuple[str, ...],
    found: Estimates,
    nodes: Nodes,
    records: int | None = None,
    blocked: bool = False,
    thin: bool = False,
    apart: Collection[str] = (),
) -> Said:
    """The sentence that is the page.

    wanted: the levels of `watch` in question, none for the mean of a number.  records: all of them, None when the
    model came without.
    blocked: a caution withholds what the levers would do.  thin: for most of the group the model fills in.
    apart: levers from which nothing leads to `watch`.
    """
    if question.levers and blocked:
        return _withheld(question, watch, wanted, found, nodes, records)
    if question.levers and all(
        column in apart or not reach or question.pins.get(column, ()) == had_before(setting)
        for column, (setting, reach) in question.levers.items()
    ):
        return _unmoved(question, watch, wanted, found, nodes, apart)
    if question.levers:
        return _moved(question, watch, wanted, found, nodes, thin)
    if question.pins:
        recorded, here = found.gap.ends
        words = say(_capital(among(question, nodes)), ", ", _is(nodes[watch], wanted, Part(here, "among")))
        return _said(say(words, f", {_against(recorded, found)}."), bracket(found, found.gap))
    what = _is(nodes[watch], wanted, Part(found.figure(found.recorded), "recorded"))
    return _said(say(f"Across {_all(records)} ", what, "."), _interval(found))


def had_sentence(question: Question, found: Estimates, nodes: Nodes) -> Words:
    """Those who had the levers' values without being set; empty where nobody is, or nothing is set."""
    pins = [(column, had_before(setting)) for column, (setting, _) in question.levers.items()]
    having = series([value(nodes[column], pin) for column, pin in pins if pin is not None])
    if found.had is None or not having:
        return []
    figure = Part(found.figure(found.had), "recorded")
    return say("Those with ", having, " anyway: ", figure, f"{_mean(found)}. That is not the effect.")


def counted_sentence(
    question: Question,
    watch: str,
    wanted: tuple[str, ...],
    count: Counted | None,
    matching: int,
    nodes: Nodes,
    small: int,
    records: int,
    decimals: int = 0,
) -> Words:
    """What the records hold, counted; without a number where it would give one under the small-count limit away.

    count: None where nothing may be counted.  matching: of all `records`, those that match every pin.
    decimals: of the mean of a number.
    """
    if count is None or gives_away(matching, records, small):
        these = "this value" if len(question.pins) == 1 else "all of these values"
        if matching >= small and not gives_away(matching, records, small):
            return say(f"How many records have {these} is not shown: it would give a count under {small} away.")
        which = f"Under {small} records have" if matching else "No record has"
        if matching >= small:
            which = f"All but under {small} records have"
        return say(f"{which} {these}, so nothing is counted; the figures come from the model.")
    if not wanted:
        mean = "" if count.mean is None else amount(count.mean, decimals)
        told = Part(mean, "recorded")
        over = f"{behind(nodes[watch].unit)} over {count.rows:,} records."
        return say("Counted in the records: mean ", told, over) if mean else []
    have = say("have ", value(nodes[watch], wanted))
    if not count.tellable(wanted):
        return say("How many records ", have, f" is not shown: it would give a count under {small} away.")
    held = sum(count.counts[level] for level in wanted)
    return say("Counted in the records: ", Part(counted(held, count.rows, small), "recorded"), " ", have, ".")


def also_sentence(
    question: Question, column: str, wanted: tuple[str, ...], found: Estimates, nodes: Nodes, blocked: bool
) -> tuple[Words, Words]:
    """Another watched column: what it is, and its figures."""
    what = subject(nodes[column], wanted)
    if question.levers and not blocked:
        assert found.change is not None
        start, end = found.change.ends
        if found.change.still:
            return what, say(" stays at ", Part(end, "set"), _mean(found))
        from_to = say(" from ", Part(start, "among" if question.pins else "recorded"), " to ", Part(end, "set"))
        return what, say(from_to, f"{_mean(found)} {bracket(found, found.change)}")
    if question.pins:
        recorded, here = found.gap.ends
        return what, say(
            " ", Part(here, "among"), f"{_mean(found)}, {_against(recorded, found)} {bracket(found, found.gap)}"
        )
    return what, say(" ", Part(found.figure(found.recorded), "recorded"), _mean(found))


def bracket(found: Estimates, change: Change | Move) -> str:
    """(+9 points, 90% interval +1 to +17), of a mean (+2.1 hours, 90% interval +0.4 to +3.8)"""
    difference = apart(change.difference, found.unit) if found.of_a_number else change.difference
    return f"({difference})" if change.known else f"({difference}, {found.interval} {change.interval})"


def _moved(question: Question, watch: str, wanted: tuple[str, ...], found: Estimates, nodes: Nodes, thin: bool) -> Said:
    assert found.change is not None
    what = subject(nodes[watch], wanted)
    start, end = found.change.ends
    from_to = say("from ", Part(start, "among" if question.pins else "recorded"), " to ", Part(end, "set"))
    estimate = "By this estimate, most of it filled in by the model, " if thin else "By this estimate, "
    opening = say(estimate, _group(question, nodes), _settings(question, nodes))
    moving = (" would move ", what, " ") if found.change.moves else (" may not move ", what, ": ")
    return _said(say(opening, *moving, from_to, _mean(found)), f"{bracket(found, found.change)}.")


def _unmoved(
    question: Question,
    watch: str,
    wanted: tuple[str, ...],
    found: Estimates,
    nodes: Nodes,
    apart: Collection[str],
) -> Said:
    """What no lever can move: nothing leads there from those that reach anyone who has not the value already."""
    opening = _capital(say(_group(question, nodes), _settings(question, nodes, reaches=False)))
    away = [name(column) for column in question.levers if column in apart]
    idle = [name(column) for column, (_, reach) in question.levers.items() if column not in apart and not reach]
    kept = [column for column, (_, reach) in question.levers.items() if column not in apart and reach]
    whom = "them" if question.pins else "all records"
    if kept and not away and not idle:
        have = series([value(nodes[column], question.pins[column]) for column in kept])
        why = say("all of them have ", have, " already")
    elif not away and not kept:
        why = say(f"for 0% of {whom} nothing changes")
    elif not away:
        why = say("it changes none of these records")
    elif len(question.levers) == 1:
        why = say("nothing in this model leads from one to the other")
    else:
        why = say("nothing in this model leads from ", series(away, " or "), " to it")
    if away and kept:
        have = series([value(nodes[column], question.pins[column]) for column in kept])
        why = say(why, ", and all of them have ", have, " already")
    if away and idle:
        why = say(why, ", and ", series(idle), f" {'is' if len(idle) == 1 else 'are'} set for 0% of {whom}")
    stays = say(" stays at ", Part(found.figure(found.among), "set"), _mean(found))
    if found.doubted and found.change is not None and not found.change.known:
        unit = behind(of_change(found.unit)) if found.of_a_number else " points"
        stays = say(stays, f" in this model; {found.interval} over sampled models {found.change.interval}{unit}")
    still = say("(", subject(nodes[watch], wanted), stays, ")")
    return _said(say(opening, " would not move ", name(watch), ": ", why, "."), still)


def _withheld(
    question: Question, watch: str, wanted: tuple[str, ...], found: Estimates, nodes: Nodes, records: int | None
) -> Said:
    what = subject(nodes[watch], wanted)
    words = say("These records cannot say what ", _settings(question, nodes), " would do to ", what, ".")
    it_is = "it is " if is_yes(wanted) or found.of_a_number else "that is "
    if question.pins:
        recorded, here = found.gap.ends
        known = say(_capital(among(question, nodes)), f" {it_is}", Part(here, "among"))
        known = say(known, f"{_mean(found)}, {_against(recorded, found)} {bracket(found, found.gap)}.")
    else:
        here = found.figure(found.recorded)
        known = say(f"Across {_all(records)} {it_is}", Part(here, "recorded"), f"{_mean(found)}.")
    return _said(words, say(known, " If set: ", Part("withheld", "withheld")))


def _said(headline: Words, aside: str | Words) -> Said:
    return Said(tuple(headline), tuple(say(aside)))


def _group(question: Question, nodes: Nodes) -> Words:
    return say(among(question, nodes), ", ") if question.pins else []


def _settings(question: Question, nodes: Nodes, reaches: bool = True) -> Words:
    """setting *L* to *l* for 80% of them and *M* to *m*, raising *N* by *n*: a verb stands once for those it rules."""
    whom = "them" if question.pins else "all records"
    by_verb: dict[str, list[Words]] = {}
    for column, (setting, reach) in question.levers.items():
        part_of = "" if reach == 1.0 or not reaches else f" for {per_cent(reach)}% of {whom}"
        to = name(set_to(nodes[column], setting))
        words = say(name(column), " by " if isinstance(setting, By) else " to ", to, part_of)
        by_verb.setdefault(_verb(setting), []).append(words)
    return series([say(f"{verb} ", series(found)) for verb, found in by_verb.items()])


def _verb(setting: Setting) -> str:
    if isinstance(setting, By):
        return "raising" if setting.amount > 0 else "lowering"
    return "setting"


def _is(node: Node, wanted: tuple[str, ...], here: Part) -> Words:
    """*Y* is *y* for 61%; *hours* is 12.3 a week on average"""
    if wanted:
        return say(is_at(node, wanted), " for ", here)
    return say(name(node.name), " is ", here, f"{behind(node.unit)} on average")


def _mean(found: Estimates) -> str:
    """What follows the last figure of a mean: its unit, and what it is."""
    return f"{behind(found.unit)} on average" if found.of_a_number else ""


def _against(recorded: str, found: Estimates) -> str:
    return f"against {recorded} {'across' if found.of_a_number else 'of'} all records"


def _interval(found: Estimates) -> str:
    return "" if found.recorded.known else f"({found.interval} {found.span(found.recorded)})"


def _all(records: int | None) -> str:
    return "all records" if records is None else f"all {records:,} records"


def _capital(words: Words) -> Words:
    """The same words at the start of a sentence."""
    first = words[0]
    assert isinstance(first, Part)
    return [Part(first.text[:1].upper() + first.text[1:], first.style), *words[1:]]
