"""What a study may lack: refusals that the store raises, each with its own way on."""

from __future__ import annotations

from pathlib import Path

from app.store.values import Study
from engine.refusal import Refusal


class NoSuchStudy(Refusal):
    """The address names a study that is not on the Shelf."""

    def __init__(self, key: str) -> None:
        super().__init__(f"There is no study “{key}”.", where=key, do="Pick one on the Shelf.")


class ModelUnreadable(Refusal):
    """What was learned cannot be opened: the file is damaged, missing or of another version."""

    def __init__(self, path: Path) -> None:
        super().__init__(
            "The model of this study cannot be opened: its file is damaged, or another version of Steelyard wrote it.",
            where=str(path),
            do="Learn it again; the records and the order are as they were.",
        )


class NoModelYet(Refusal):
    """A question was asked before anything was learned."""

    def __init__(self, study: Study) -> None:
        super().__init__(f"“{study.name}” has no model yet.", where=study.name, do="Start learning on the Model page.")


class RecordsDamaged(Refusal):
    """A file of records cannot be read any more."""

    def __init__(self, name: str, path: Path) -> None:
        super().__init__(
            f"A file of “{name}” is missing or damaged.",
            where=str(path),
            do="Bring the table again as a new study, or put the file back from a copy.",
        )
