"""What was found out about the model of each study, kept beside it."""

from __future__ import annotations

from dataclasses import dataclass

from app.store.schema import Database
from app.store.values import Study
from engine.judging.archive import from_text
from engine.judging.judgement import Judgement
from engine.refusal import Refusal


@dataclass(frozen=True)
class Kept:
    """The last judgement of a study.  current: whether it is of the model that answers now, as the study stands."""

    judgement: Judgement
    current: bool


class Judgements:
    """At most one a study."""

    def __init__(self, database: Database) -> None:
        self._database = database

    def learned_file(self, key: str) -> str | None:
        """The file of the model that a judgement would be of."""
        with self._database.reading() as database:
            row = database.execute("SELECT learned_file FROM studies WHERE key = ?", (key,)).fetchone()
        return None if row is None else row["learned_file"]

    def keep(self, key: str, learned_file: str, text: str) -> None:
        """Keep a judgement, as text, of the model in that file. Raises Refusal when another was learned meanwhile."""
        with self._database.writing() as database:
            found = database.execute(
                "INSERT OR REPLACE INTO judgements (study, learned_file, judgement) "
                "SELECT key, learned_file, ? FROM studies WHERE key = ? AND learned_file = ?",
                (text, key, learned_file),
            )
        if found.rowcount < 1:
            raise Refusal("The model was learned again meanwhile.", do="Judge the new one.")

    def of(self, study: Study) -> Kept | None:
        """The last judgement; None before the first, and where this version cannot read it."""
        with self._database.reading() as database:
            row = database.execute(
                "SELECT judgement, judgements.learned_file = studies.learned_file AS same FROM judgements "
                "JOIN studies ON studies.key = judgements.study WHERE study = ?",
                (study.key,),
            ).fetchone()
        if row is None:
            return None
        try:
            judgement = from_text(row["judgement"])
        except Refusal:
            return None
        links = study.recommended if study.links is None else study.links
        return Kept(judgement, bool(row["same"]) and judgement.links == links and study.model == "current")
