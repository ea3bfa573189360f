"""What the Trust page shows of a judgement."""

from __future__ import annotations

from dataclasses import dataclass

from markupsafe import Markup

from app.drawing import gains, reliability
from app.drawing.beam import progress
from app.drawing.scale import Scale
from app.store.judgements import Kept
from app.store.progress import JobState
from app.wording import trust as wording
from app.wording.amounts import count, listing, plural
from app.wording.figures import share
from app.wording.parts import Part
from engine.judging.judgement import ColumnScore, Judgement, Reliability
from engine.judging.rule import comes_true
from engine.records.table import SMALL_COUNT

SHOWN = 6  # dependences told at once


@dataclass(frozen=True)
class Line:
    """A figure, a sentence that reads on from it, what to do.  met: of a test, in words; else empty."""

    figure: str
    said: tuple[Part, ...]
    do: str
    met: str = ""


@dataclass(frozen=True)
class Row:
    """A column's gain.  note: outcome or changeable."""

    name: str
    note: str
    drawing: Markup
    figures: str


@dataclass(frozen=True)
class Told:
    """Whether what is said of one column comes true. cells: what was said, seen, and between what, tenth by tenth."""

    column: str
    said: tuple[Part, ...]
    drawing: Markup
    along: str
    up: str
    rows: tuple[tuple[str, tuple[str, ...]], ...]
    note: str


@dataclass(frozen=True)
class TrustView:
    """stages: (number or nothing, name, rows).  choices: (column, whether picked) whose reliability can be shown."""

    verdict: str
    deck: str
    current: bool
    rule: tuple[Line, ...]
    axis: Markup
    stages: tuple[tuple[str, tuple[Row, ...]], ...]
    scores_note: str
    choices: tuple[tuple[str, bool], ...]
    told: Told | None
    missed: tuple[Line, ...]
    more_missed: tuple[Line, ...]
    missed_note: str
    thin: tuple[Line, ...]
    blanks: tuple[Line, ...]


def view(kept: Kept, column: str | None) -> TrustView:
    """column: whose reliability to show, else the first outcome's."""
    judgement = kept.judgement
    shown = _picked(judgement, column)
    scores = [each for each in judgement.columns if each.linked or each.gain.mean or each.outcome]
    points = gains.scale(scores)
    found = sorted(judgement.dependences.missed, key=lambda each: not each.counts)
    missing = [Line(wording.missed_figure(each), *_pair(wording.missed(each))) for each in found]
    return TrustView(
        verdict=wording.VERDICTS.get(judgement.verdict or "", "No outcome is marked."),
        deck=_deck(judgement),
        current=kept.current,
        rule=tuple(
            Line(
                wording.figure(each),
                tuple(wording.told(each, judgement)),
                "" if each.met else wording.WHAT_TO_DO[each.code],
                "met" if each.met else "not met",
            )
            for each in judgement.tests
        ),
        axis=gains.axis(points),
        stages=_stages(scores, points),
        scores_note=_scores_note(judgement, scores),
        choices=tuple((each.column, each is shown) for each in judgement.reliability),
        told=None if shown is None else _told(shown),
        missed=tuple(missing[:SHOWN]),
        more_missed=tuple(missing[SHOWN:]),
        missed_note=_missed_note(judgement),
        thin=tuple(Line(*_line(wording.thin(each))) for each in judgement.thin),
        blanks=tuple(Line(*_line(wording.blank(each, judgement.rows))) for each in judgement.blanks),
    )


@dataclass(frozen=True)
class JudgingView:
    """Judging under way."""

    beam: Markup
    words: str
    said: str


def judging(state: JobState) -> JudgingView:
    """The page for a running job."""
    words = state.words[:1].lower() + state.words[1:]
    return JudgingView(progress(state.fraction, state.words), words, f"Judging: {words}.")


def ended(state: JobState | None) -> tuple[str, str] | None:
    """What to say of a job that ended without a judgement, and what to do."""
    if state is None or state.state in ("running", "done"):
        return None
    if state.state == "cancelled":
        return "Judging was cancelled.", "Start again when you like."
    return state.message or "Judging was ended; the study is as it was.", state.do or "Start judging again."


def _deck(judgement: Judgement) -> str:
    if judgement.verdict is None:
        return "Mark one on the Records page; what is said below of every column holds without it."
    return f"{wording.met(judgement.tests)} {wording.ORDER}"


def _picked(judgement: Judgement, column: str | None) -> Reliability | None:
    named = [each for each in judgement.reliability if each.column == column]
    return next(iter([*named, *judgement.reliability]), None)


def _stages(scores: list[ColumnScore], points: Scale) -> tuple[tuple[str, tuple[Row, ...]], ...]:
    """The outcomes, then the others by stage."""
    groups: dict[str, list[Row]] = {}
    for each in scores:
        note = "changeable" if each.changeable else ""
        group = "Outcomes" if each.outcome else each.stage
        groups.setdefault(group, []).append(Row(each.column, note, gains.row(each, points), wording.of_yardstick(each)))
    return tuple((name, tuple(rows)) for name, rows in groups.items())


def _scores_note(judgement: Judgement, shown: list[ColumnScore]) -> str:
    alone = [each.column for each in judgement.columns if each not in shown]
    said = []
    if alone:
        verb = (
            "has no link leading to it and scores its"
            if len(alone) == 1
            else "have no link leading to them and score their"
        )
        said.append(f"{count(len(alone))} {plural(len(alone), 'column')} {verb} base rate: {listing(alone, 12)}.")
    if judgement.unmeasured:
        left = [name for name in judgement.unmeasured if name not in alone]
        if left:
            said.append(f"To save work the yardstick was not tried on {listing(left, 12)}.")
    said.append(
        f"One score point is 0.01 nat a record; {judgement.parts} parts of the {count(judgement.rows)} records were "
        "held out in turn, cut alike for the model, its base rates and the yardstick, and the links learned again "
        "without each. The yardstick, boosted trees, sees the columns that may come before and no other."
    )
    return " ".join(said)


def _told(said: Reliability) -> Told:
    tenths = said.tenths
    rows: tuple[tuple[str, tuple[str, ...]], ...]
    some = min(each.records for each in tenths)
    if said.levels:
        score = said.brier
        assert score is not None
        words = "; ".join(f"said {share(each.said)}, seen {share(each.seen)}" for each in tenths)
        each = f"about {count(some)}" if some >= SMALL_COUNT else f"under {SMALL_COUNT}"
        note = (
            f"Ten tenths of {each} held-out records each, from least to most likely; the intervals hold all ten at "
            f"once in 90 of 100 cases. Brier score {score.score:.3f}: uncertainty {score.uncertainty:.3f}, less "
            f"resolution {score.resolution:.3f}, plus reliability {score.reliability:.4f}, plus "
            f"{_signed(score.within)} within tenths."
        )
        rows = (
            ("Said", tuple(_cell(each.said) for each in tenths)),
            ("Seen", tuple(_cell(each.seen) for each in tenths)),
        )
        drawing = reliability.reliability(tenths, f"Reliability of {said.column}: {words}.")
        levels = listing(said.levels)
        along, up = (
            f"along: how many in 100 it said would be {levels}",
            "up: how many in 100 were, with what chance allows",
        )
    else:
        words = "; ".join(f"{share(each.seen)}" for each in tenths)
        note = (
            "Each held-out record's value is placed in what was foreseen for that record; where the shape of the model "
            "is right, every tenth holds 10 in 100. The intervals hold all ten at once in 90 of 100 cases."
        )
        if not comes_true(said):
            note = f"{wording.another_shape(said)} {note}"
        rows = (("Seen", tuple(_cell(each.seen) for each in tenths)),)
        drawing = reliability.spread(tenths, f"Shares of the records in each tenth foreseen of {said.column}: {words}.")
        along, up = "along: tenths of what was foreseen, low to high", "up: how many in 100 fell into each"
    return Told(said.column, tuple(wording.come_true(said)), drawing, along, up, rows, note)


def _missed_note(judgement: Judgement) -> str:
    found = judgement.dependences
    pairs = sum(len(each.columns) == 2 for each in found.missed)
    said = f"{count(pairs)} of {count(found.pairs)} {plural(found.pairs, 'pair')}"
    if found.triples:
        said += f", and {count(len(found.missed) - pairs)} of {count(found.triples)} that may differ by a third column"
    return f"{said}; false discoveries held to 5 in 100."


def _cell(part: float) -> str:
    return f"{100 * part:.0f}"


def _signed(value: float) -> str:
    return f"{round(value, 4) + 0.0:.4f}".replace("-", "−")


def _pair(found: tuple[list[Part], str]) -> tuple[tuple[Part, ...], str]:
    return tuple(found[0]), found[1]


def _line(found: tuple[str, list[Part], str]) -> tuple[str, tuple[Part, ...], str]:
    return found[0], tuple(found[1]), found[2]
