"""The samples that travel with the program, and opening one as a study."""

from __future__ import annotations

import json
from dataclasses import dataclass
from pathlib import Path

from app.jobs import Jobs
from app.resources import resource
from app.store import Choices, ModelUnreadable, Plan, Store, Study
from engine.records import read_frame
from engine.refusal import Refusal

FIRST = "lantern_street"  # what --sample opens


@dataclass(frozen=True)
class Sample:
    """One sample. name: its folder.  title, about: for the Shelf."""

    name: str
    title: str
    about: str
    choices: Choices
    plan: Plan
    records: Path


def samples() -> tuple[Sample, ...]:
    """Every sample, by name."""
    folders = sorted(path.parent for path in resource("sample_data").glob("*/study.json"))
    return tuple(_sample(folder) for folder in folders)


def open_sample(store: Store, jobs: Jobs, name: str) -> Study:
    """The study of this sample: brought when it is not there yet, and learning at once when nothing was learned.

    Raises Refusal when there is no such sample.
    """
    found = {sample.name: sample for sample in samples()}
    if name not in found:
        raise Refusal(f"There is no sample “{name}”.", where=name, do="Pick one on the Shelf.")
    study = store.sample(name) or _bring(store, found[name])
    if study.model == "none" or not _opens(store, study):
        jobs.start(study.key)
    return study


def _opens(store: Store, study: Study) -> bool:
    try:
        store.learned(study.key)
    except ModelUnreadable:
        return False
    return True


def _bring(store: Store, sample: Sample) -> Study:
    frame, warnings = read_frame(sample.records, sample.records.name)
    return store.bring(
        sample.title, frame, sample.records.name, sample.choices, sample.plan, warnings=warnings, sample=sample.name
    )


def _sample(folder: Path) -> Sample:
    said = json.loads((folder / "study.json").read_text(encoding="utf-8"))
    return Sample(
        name=folder.name,
        title=said["name"],
        about=said["about"],
        choices=Choices(**said["choices"]),
        plan=Plan(**said["plan"]),
        records=folder / "records.csv",
    )
