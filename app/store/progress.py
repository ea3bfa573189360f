"""How learning or judging stands, written down so that a reload, a second server or a restart finds it."""

from __future__ import annotations

import json
import time
from dataclasses import dataclass, replace
from datetime import datetime
from typing import Literal

from app.store.schema import Database
from engine.refusal import Refusal

State = Literal["running", "done", "failed", "cancelled", "died"]
SILENCE = 5.0  # seconds without a sign of life after which the server that ran a job is taken for gone


@dataclass(frozen=True)
class JobState:
    """How the learning, or the judging, of one study stands.

    fraction: 0 to 1.  words: what is being done.  done: what was done before, oldest first.
    started: with its time zone.  message, where, do: why it failed or stopped, as in Refusal; None while it did not.
    """

    state: State
    fraction: float
    words: str
    done: tuple[str, ...]
    started: datetime
    message: str | None = None
    where: str | None = None
    do: str | None = None

    def moved(self, fraction: float, words: str, kept: int = 40) -> JobState:
        """Further on: the words before join what is done (the last `kept` of them), the fraction never falls."""
        done = self.done if words == self.words else (*self.done, self.words)[-kept:]
        return replace(self, fraction=min(max(fraction, self.fraction), 1.0), words=words, done=done)

    def ended(self, end: State, refusal: Refusal | None = None) -> JobState:
        if end == "done":
            return replace(self, state=end, fraction=1.0, done=(*self.done, self.words))
        if refusal is None:
            return replace(self, state=end)
        return replace(self, state=end, message=refusal.message, where=refusal.where, do=refusal.do)


def closed(doing: str = "learning") -> Refusal:
    """The program ended during that work."""
    return Refusal(f"Steelyard was closed while this was {doing}; the study is as it was.", do=f"Start {doing} again.")


class Progress:
    """The job of one kind of each study as the database has it, at most one a study.

    table: of the kind.  doing: the kind of work, in a word.
    """

    def __init__(self, database: Database, table: Literal["jobs", "judging"] = "jobs", doing: str = "learning") -> None:
        self._database = database
        self._table = table
        self._doing = doing

    def begin(self, key: str, state: JobState) -> None:
        """Write a new job down in place of the last one."""
        with self._database.writing() as database:
            database.execute(
                f"INSERT OR REPLACE INTO {self._table} (study, state, fraction, words, done, started, beat) "
                "VALUES (?, ?, ?, ?, ?, ?, ?)",
                (key, state.state, state.fraction, state.words, "[]", state.started.isoformat(), time.time()),
            )

    def write(self, key: str, state: JobState) -> bool:
        """Write how this job stands, as a sign of life too. False when it was ended or replaced in the database."""
        with self._database.writing() as database:
            found = database.execute(
                f"UPDATE {self._table} SET state = ?, fraction = ?, words = ?, done = ?, beat = ?, message = ?, "
                "place = ?, advice = ? WHERE study = ? AND started = ? AND state = 'running'",
                (
                    *(state.state, state.fraction, state.words, json.dumps(state.done), time.time()),
                    *(state.message, state.where, state.do, key, state.started.isoformat()),
                ),
            )
        return found.rowcount > 0

    def read(self, key: str) -> JobState | None:
        """How the job stands; one that runs but has been silent too long has died with its server."""
        with self._database.reading() as database:
            row = database.execute(f"SELECT * FROM {self._table} WHERE study = ?", (key,)).fetchone()
        if row is None:
            return None
        state = JobState(
            state=row["state"],
            fraction=row["fraction"],
            words=row["words"],
            done=tuple(json.loads(row["done"])),
            started=datetime.fromisoformat(row["started"]),
            message=row["message"],
            where=row["place"],
            do=row["advice"],
        )
        if state.state == "running" and time.time() - row["beat"] > SILENCE:
            return state.ended("died", closed(self._doing))
        return state

    def cancel(self, key: str) -> None:
        """Mark a job of whichever server as cancelled; its own server looks here at every sign of life."""
        with self._database.writing() as database:
            database.execute(
                f"UPDATE {self._table} SET state = 'cancelled' WHERE study = ? AND state = 'running'", (key,)
            )

    def forget(self, key: str) -> None:
        with self._database.writing() as database:
            database.execute(f"DELETE FROM {self._table} WHERE study = ?", (key,))
