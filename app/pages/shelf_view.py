"""What the Shelf shows: the studies as ledger entries with their next step, the samples."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import datetime

from app.store import Study
from app.store.progress import JobState
from app.wording.amounts import count, listing, plural, small_word

RANKS = (
    ("blocks", "{} blocks it", "{} block it"),
    ("weakens", "{} weakens it", "{} weaken it"),
    ("know", "{} is worth knowing", "{} are worth knowing"),
)


@dataclass(frozen=True)
class Entry:
    """One study.

    next_step: (words, address, whether it starts something and so is a form).  opens: where its name leads.
    """

    key: str
    name: str
    about: str
    when: str
    sentence: str
    cautions: str
    next_step: tuple[str, str, bool]
    opens: str
    figures: tuple[tuple[str, str], ...]


def entry(study: Study, state: JobState | None) -> Entry:
    """The ledger entry of `study`, whose last learning stands at `state`."""
    running = state is not None and state.state == "running"
    links = study.links if study.links is not None else study.recommended
    next_step = _next_step(study, running)
    return Entry(
        key=study.key,
        name=study.name,
        about=_about(study),
        when=f"Last asked, {_date(study.last.at)}" if study.last else f"Brought {_date(study.created)}",
        sentence=study.last.sentence if study.last else _unasked(study, running),
        cautions=_cautions(study.last.cautions) if study.last else "",
        next_step=next_step,
        opens=f"/study/{study.key}/records" if next_step[2] else next_step[1],
        figures=(
            ("records", count(study.rows)),
            ("columns", count(study.columns)),
            ("links", "none" if links is None else count(links)),
            ("questions", count(study.asked) if study.asked else "none"),
        ),
    )


def next_page(study: Study, state: JobState | None) -> str:
    """The page of the study's next step; a step that starts something waits on the Model page for a click."""
    _, address, starts = _next_step(study, state is not None and state.state == "running")
    return f"/study/{study.key}/model" if starts else address


def headline(studies: int) -> tuple[str, str]:
    """The number in bold and the words after it."""
    if studies == 0:
        return "No", "studies yet. Bring a table, or open a sample."
    return small_word(studies).capitalize(), f"{plural(studies, 'study', 'studies')} on this machine."


def _about(study: Study) -> str:
    outcomes = tuple(study.plan.outcomes)
    if not outcomes:
        return "no outcome marked yet"
    return f"{plural(len(outcomes), 'outcome')}: {listing(outcomes, 3)}"


def _in_order(study: Study) -> bool:
    return sum(bool(columns) for _, columns in study.plan.stages) > 1


def _unasked(study: Study, running: bool) -> str:
    if running:
        return "Nothing has been asked: its model is being learned."
    if study.model == "old":
        return "Nothing has been asked: its model is older than its order."
    if study.model == "current":
        return "Nothing has been asked: its model is ready."
    if _in_order(study):
        return "Nothing has been asked: its columns are in order, and no model is learned yet."
    return "Nothing has been asked: its columns are not in order yet."


def _next_step(study: Study, running: bool) -> tuple[str, str, bool]:
    here = f"/study/{study.key}"
    if running:
        return "See it learning", f"{here}/model", False
    if study.model == "old":
        return "Learn again", f"{here}/learn", True
    if study.model == "current":
        if study.last is None:
            return "Ask", f"{here}/ask", False
        return "Go on asking", f"{here}/ask" + (f"?{study.last.query}" if study.last.query else ""), False
    if _in_order(study):
        return "Learn the model", f"{here}/learn", True
    return "Put them in order", f"{here}/order", False


def _cautions(ranks: tuple[str, ...]) -> str:
    """How many cautions stood beside the answer, the gravest rank first."""
    said: list[str] = []
    for rank, one, more in RANKS:
        if number := ranks.count(rank):
            words = f"{number} {plural(number, 'caution')}" if not said else str(number)
            said.append((one if number == 1 else more).format(words))
    return f"{listing(said)}." if said else ""


def _date(at: datetime) -> str:
    local = at.astimezone()
    return f"{local.day} {local:%B %Y}"
