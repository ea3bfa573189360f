"""What the printed page of one answer holds besides the answer: numbers, links, order, data, how to ask it again."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date
from importlib import metadata
from itertools import combinations

from app.drawing.answer_beam import World
from app.pages.ask_view import RANKS, WORDS, heading
from app.pages.asking import DRAWS, EACH, SEED, Asked
from app.store import Study
from app.wording.amounts import listing
from app.wording.computed import intervals, method, size
from app.wording.estimates import OVER, WITHIN, Estimate, Estimates
from app.wording.figures import counted, records, share
from app.wording.links import SETTLED, strength
from app.wording.numbers import amount
from app.wording.parts import plain
from app.wording.units import of_change
from app.wording.values import either, had_before, value
from engine.answering.answer import Caution
from engine.doubting.direction import between
from engine.order import Direction
from engine.records.table import SMALL_COUNT, Table


@dataclass(frozen=True)
class Line:
    """A row of the table of numbers. look: "", "sum" (the change) or "after" (what is told beside it)."""

    words: str
    figure: str
    interval: str
    world: World | None = None
    look: str = ""


@dataclass(frozen=True)
class Link:
    """A link in words. strength: how far it moves its child, in points."""

    source: str
    verb: str
    target: str
    strength: str
    settled: str


def interval_head(asked: Asked) -> str:
    """What the intervals are, over their column."""
    return OVER if asked.answer.doubted else f"{OVER}, {WITHIN}"


def today() -> str:
    now = date.today()
    return f"{now.day} {now:%B %Y}"


def watched_words(asked: Asked) -> str:
    wanted = asked.wanted(asked.watch)
    return plain(value(asked.spine.nodes[asked.watch], wanted)) if wanted else heading(asked)


def numbers(asked: Asked) -> list[Line]:
    """Every figure of the answer, with its interval; withheld where the answer is."""
    found = asked.estimates(asked.watch)
    spine, question, matching = asked.spine, asked.question, asked.answer.matching
    all_records = f", {records(spine.records, SMALL_COUNT)}" if matching is not None else ""
    exact = _decimals(asked, found)
    lines = [_line(f"{WORDS['recorded']}{all_records}", found, found.recorded, "recorded", exact)]
    if question.pins:
        these = "" if matching is None else f", {_these(asked, matching)}"
        lines.append(_line(f"{WORDS['among']}{these}", found, found.among, "among", exact))
    if asked.blocked:
        lines.append(Line(WORDS["set"], "withheld", "", "set"))
    elif found.set is not None:
        lines.append(_line(WORDS["set"], found, found.set, "set", exact))
    change = found.gap if not question.levers else None if asked.blocked else found.change
    if change is not None and question.touched:
        words = "Change if set" if question.levers else "Difference to all records"
        unit = of_change(found.unit) if found.of_a_number else "points"
        known = "" if change.known else change.interval
        label = f"{words}, {unit}" if unit else words
        lines.append(Line(label, change.difference.split()[0], known, look="sum"))
    if told := _counted(asked):
        lines.append(Line(f"Counted in the records{', among these' if question.pins else ''}", told, "", look="after"))
    pins = [(column, had_before(setting)) for column, (setting, _) in question.levers.items()]
    had = [plain(value(spine.nodes[column], pin)) for column, pin in pins if pin is not None]
    if found.had is not None and had and not asked.blocked:
        line = _line(f"Those with {listing(had)} anyway; not the effect", found, found.had, None)
        lines.append(Line(line.words, line.figure, line.interval, look="after"))
    return lines


def figure_head(asked: Asked) -> str:
    """What the figures of the table of numbers are."""
    return "Share" if asked.wanted(asked.watch) else "Mean"


def _decimals(asked: Asked, found: Estimates) -> int | None:
    """Those of the sentence, so that the table agrees with it."""
    if asked.question.levers and not asked.blocked:
        return None if found.change is None else found.change.decimals
    return found.gap.decimals if asked.question.pins else None


def _counted(asked: Asked) -> str | None:
    """What the records hold of the column in question, where it may be told."""
    count, wanted = asked.answer[asked.watch].counted, asked.wanted(asked.watch)
    if count is not None and count.mean is not None and not wanted:
        return f"{amount(count.mean, asked.estimates(asked.watch).decimals or 0)}, over {count.rows:,}"
    if count is None or not wanted or not count.tellable(wanted):
        return None
    return counted(sum(count.counts[level] for level in wanted), count.rows, SMALL_COUNT)


def cautions(asked: Asked) -> list[tuple[str, Caution]]:
    """Every caution with its rank in words."""
    words = dict(RANKS)
    return [(words[caution.rank], caution) for caution in asked.answer.cautions]


def order_lines(asked: Asked) -> list[str]:
    """What was insisted on, ruled out and marked."""
    order = asked.spine.order
    lines = [
        f"{verb}: {'; '.join(f'{source} leads to {target}' for source, target in links)}."
        for verb, links in (("Insisted on", order.insist), ("Ruled out", order.rule_out))
        if links
    ]
    if order.changeable:
        lines.append(f"Changeable: {listing(order.changeable)}.")
    outcomes = []
    for column in asked.spine.outcomes:
        better = order.outcomes[column]
        direction = isinstance(better, Direction)
        what = ("more" if better is Direction.MORE else "less") if direction else either(better)  # type: ignore[arg-type]
        outcomes.append(f"{column} ({what} is better)")
    if outcomes:
        lines.append(f"Outcomes: {listing(outcomes)}.")
    return lines


def links(asked: Asked) -> tuple[list[Link], list[Link]]:
    """The links this answer runs through, and the others."""
    through = _through(asked)
    told = [(link, _told(asked, *link)) for link in asked.spine.model.links]
    return [words for link, words in told if link in through], [words for link, words in told if link not in through]


def _through(asked: Asked) -> set[tuple[str, str]]:
    """With levers: links from the levers, from the pins and from what leads to a lever, on to the watched column.

    With pins, what is seen tells both ways: links on any path between the columns in question, among these and
    what comes before them. Where nothing is asked: the links that meet the watched column.
    """
    question, every = asked.question, asked.spine.model.links
    if question.levers:
        parents = {(source, target) for source, target in every if target in question.levers}
        kept = [(source, target) for source, target in every if target not in {*question.pins, *question.levers}]
        start = {*question.levers, *question.pins, *(source for source, _ in parents)}
        ahead = _reached(start, kept)
        behind = _reached({asked.watch}, [(target, source) for source, target in kept])
        moving = {(source, target) for source, target in kept if source in ahead and target in behind}
        return parents | moving | _seen(asked, [link for link in every if link not in parents])
    return _seen(asked, every) if question.pins else {link for link in every if asked.watch in link}


def _seen(asked: Asked, links: Sequence[tuple[str, str]]) -> set[tuple[str, str]]:
    """Links on any path between the pins and the watched column, among these and what comes before them."""
    columns = list(dict.fromkeys((*asked.question.pins, asked.watch)))
    before = _reached(set(columns), [(target, source) for source, target in links])
    near = [link for link in links if before.issuperset(link)]
    return {link for one, other in combinations(columns, 2) for link in between(near, one, other)}


def _reached(start: set[str], links: Sequence[tuple[str, str]]) -> set[str]:
    """Columns that the links lead to from any of `start`, these included."""
    found, waiting = set(start), list(start)
    while waiting:
        here = waiting.pop()
        for source, target in links:
            if source == here and target not in found:
                found.add(target)
                waiting.append(target)
    return found


def _told(asked: Asked, source: str, target: str) -> Link:
    spine = asked.spine
    moved = spine.model.strength(source, target)
    words = strength(moved, target in spine.numbers, spine.nodes[target].unit)
    settled = spine.settled_by(source, target)
    return Link(source, "goes with" if settled == "nobody" else "leads to", target, words, SETTLED[settled])


def data(asked: Asked, study: Study, table: Table) -> list[tuple[str, str]]:
    """What the answer was learned from, as (what, words)."""
    dropped = [f"{people} by blanks in {column}" for column, people in _dropped(table)]
    kept = f"{asked.spine.records:,}; " + (f"left out: {listing(dropped)}" if dropped else "none left out")
    used = [column for column in table.columns.values() if column.kind != "left out"]
    out = [column.name for column in table.columns.values() if column.kind == "left out"]
    rows = max(len(table.kept), 1)
    blanks = [f"{column.name} {share(column.blanks / rows)}" for column in used if column.blanks >= SMALL_COUNT]
    lines = [("records", f"{kept}; each taken as a separate case")]
    if asked.question.pins and asked.answer.matching is not None:
        lines.append(("among these", _these(asked, asked.answer.matching)))
    lines += [
        ("columns", f"{len(used)} used of {len(table.columns)}" + (f"; left out: {listing(out, 12)}" if out else "")),
        ("blanks", f"{listing(blanks, 12)}; a level of their own, unless their rows are left out" if blanks else "few"),
        ("small counts", f"under {SMALL_COUNT} are not printed"),
        ("file", f"{study.source}; with what was chosen for its columns sha256 {_short(study.digest)}"),
    ]
    return lines


def _these(asked: Asked, matching: int) -> str:
    return records(matching, SMALL_COUNT, asked.spine.records, asked.answer.matching_told)


def _short(digest: str) -> str:
    """The first sixteen digits, in fours."""
    return f"{' '.join(digest[start : start + 4] for start in range(0, 16, 4))} …"


def _dropped(table: Table) -> list[tuple[str, str]]:
    return [
        (column, records(rows, SMALL_COUNT) if rows >= SMALL_COUNT else f"under {SMALL_COUNT} records")
        for column, rows in table.dropped.items()
        if rows
    ]


def again(asked: Asked, study: Study) -> list[tuple[str, str]]:
    """What is needed to get the same answer again, as (what, words)."""
    links = len(asked.spine.model.links)
    state = "; learned before the records’ choices or the order were changed" if study.model == "old" else ""
    return [
        ("asked", f"{today()}; {study.asked:,} {'question' if study.asked == 1 else 'questions'} asked of this study"),
        ("computed", method(asked.answer)),
        (
            "intervals",
            intervals(asked.answer, DRAWS, EACH).removeprefix("intervals "),
        ),
        ("model", f"{size(links, study.links is not None)}; exact search{state}"),
        ("version", f"Steelyard {metadata.version('steelyard')}, seed {SEED}"),
    ]


def _line(words: str, found: Estimates, estimate: Estimate, world: World | None, decimals: int | None = None) -> Line:
    known = "" if estimate.known else found.span(estimate, decimals)
    return Line(words, found.figure(estimate, decimals), known, world)
