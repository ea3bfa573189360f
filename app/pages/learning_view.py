"""What the Model page shows while learning, and what it says when learning ended without a model."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import UTC, datetime

from markupsafe import Markup

from app.drawing.beam import progress
from app.store import Study
from app.store.progress import JobState
from app.wording.amounts import plural
from engine.records.table import Table

SOON = 3.0  # seconds of work before an estimate of the time left is worth saying
STEPS = (  # how learning tells its steps: how its words may start, the step's name, and what is done in it
    (("Starting",), "Starting", "a process of its own; this page may be closed"),
    (("Opening", "Looking"), "Opening the records", "as they stand on the Records page"),
    (("Counting", "Adding"), "Counting", "how often levels occur together, and how numbers vary"),
    (("Finding",), "The best model of every size", "exactly, among all that the order allows"),
    (("Weighing",), "Weighing every model", "how sure each link is"),
    (("Scoring",), "Trying it on records held out", "learning again without each part in turn"),
    (("Trying",), "Trying one parent more", "where a column has as many as were allowed"),
    (("Done",), "Keeping the model", "it opens in a moment"),
)
TOLD = ("Looking", "Adding", "Scoring")  # words that say more of a step than its own


@dataclass(frozen=True)
class Step:
    """A step of the work. state: "done", "now" or "to come"."""

    state: str
    name: str
    told: str


@dataclass(frozen=True)
class LearningView:
    """Learning under way. left: how long it may still take, in words, or None while nobody can tell."""

    beam: Markup
    words: str
    left: str | None
    steps: tuple[Step, ...]
    said: str


def view(state: JobState, now: datetime | None = None) -> LearningView:
    """The page for a running job."""
    elapsed = ((now or datetime.now(UTC)) - state.started).total_seconds()
    words = state.words[:1].lower() + state.words[1:]
    left = None
    if elapsed >= SOON and state.fraction >= 0.05:
        left = _seconds(elapsed * (1 - state.fraction) / state.fraction)
    steps = _steps(state)
    said = next((step.name for step in steps if step.state == "now"), state.words)
    return LearningView(progress(state.fraction, state.words), words, left, steps, f"Learning: {said}.")


def way_on(state: JobState, table: Table, study: Study) -> tuple[str, str] | None:
    """Where what stopped a job can be mended: (address, words of the link); None where no page is better than another.

    table: of the study as it stands now.
    """
    home, names = f"/study/{study.key}", list(table.columns)
    if state.state != "failed" or state.where is None:
        return None
    if state.where in names:
        place = names.index(state.where)
        return f"{home}/records?open={place}#column-{place}", f"Go to {state.where} on Records"
    if state.where == "insist" or state.where in [name for name, _ in study.plan.stages]:
        return f"{home}/order", "Go to Order"
    return f"{home}/records", "Go to Records"


def mended(state: JobState, table: Table, study: Study) -> bool:
    """Whether the column that stopped a job has left the order since."""
    return state.where in table.columns and state.where not in study.plan.columns


def ended(state: JobState) -> tuple[str, str] | None:
    """What to say of a job that ended without a model, and what to do; None for one that is done or under way."""
    match state.state:
        case "cancelled":
            return "Learning was cancelled; the study is as it was.", "Start again when you like."
        case "failed":
            return state.message or "Learning failed; the study is as it was.", state.do or "Start learning again."
        case "died":
            message = state.message or "The process that was learning was ended; the study is as it was."
            return message, state.do or "Start learning again."
    return None


def _steps(state: JobState) -> tuple[Step, ...]:
    """The steps that learning is known to take, and any other that it told of."""
    told = [*state.done, state.words]
    at = next((place for place, step in enumerate(STEPS) if state.words.startswith(step[0])), None)
    if at is None:
        return tuple(Step("done" if words != state.words else "now", words, "") for words in dict.fromkeys(told))
    steps = []
    for place, (_, name, what) in enumerate(STEPS):
        now = state.words.rstrip(".") if place == at and state.words.startswith(TOLD) else what
        steps.append(Step("done" if place < at else "now" if place == at else "to come", name, now))
    return tuple(steps)


def _seconds(left: float) -> str:
    if left < 1.5:
        return "a second"
    if left < 90:
        return f"{left:.0f} seconds"
    minutes = round(left / 60)
    return f"{minutes} {plural(minutes, 'minute')}"
