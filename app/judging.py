"""Judging jobs: as learning jobs are, of the model that a study has."""

from __future__ import annotations

from collections.abc import Callable

from app import workers
from app.jobs import Job, Jobs
from app.store import NoModelYet, Store, Study
from app.store.judgements import Judgements
from app.store.progress import Progress
from engine.refusal import Refusal


class JudgingJobs(Jobs):
    """The judging jobs of the studies in `store`, at most one a study."""

    doing = "judging"

    def __init__(self, store: Store, work: Callable[..., None] = workers.judge_study) -> None:
        super().__init__(store, work)
        self._judgements = Judgements(store.database)
        self._files: dict[str, str] = {}  # of the model that is judged, by study

    def _written(self, store: Store) -> Progress:
        return Progress(store.database, "judging", self.doing)

    def _ready(self, key: str) -> Study:
        """Raises NoModelYet, and Refusal for a model of other records or of another order than the study has now."""
        study = self._store.study(key)
        if study.model == "none":
            raise NoModelYet(study)
        if study.model == "old":
            raise Refusal(
                "The records or the order changed since the model was learned.",
                where=study.name,
                do="Learn it again on the Model page, then judge it.",
            )
        return study

    def _arguments(self, job: Job) -> tuple[object, ...]:
        study = job.study
        learned = self._judgements.learned_file(study.key)
        if learned is None:
            raise NoModelYet(study)
        self._files[study.key] = learned
        path = self._store.files(study.key) / learned
        links = study.recommended if study.links is None else study.links
        return (self._store.records(study.key), study.name, study.choices.to_json(), path, links, job.out)

    def _keep(self, job: Job) -> None:
        key = job.study.key
        self._judgements.keep(key, self._files[key], job.out.read_text(encoding="utf-8"))
