"""The store: studies in the user's data folder, one row in SQLite and one folder of files each."""

from __future__ import annotations

import json
import re
import shutil
import sqlite3
import time
import unicodedata
from collections.abc import Iterable, Mapping
from datetime import UTC, datetime
from pathlib import Path

import pandas as pd

import engine
from app.store import files
from app.store.cache import Bounded
from app.store.lacking import ModelUnreadable, NoModelYet, NoSuchStudy, RecordsDamaged
from app.store.mending import check, first_plan, mend
from app.store.rows import study_of, table_of
from app.store.schema import Database
from app.store.values import Asked, Choices, Plan, Study
from engine.answering.answer import Caution
from engine.learning.checks import check_limits
from engine.records.table import Table
from engine.refusal import Refusal

RECORDS = "records.parquet"
TABLES_KEPT = 4
MODELS_KEPT = 4
ABANDONED = 24 * 3600.0  # seconds after which an upload or a file that no study names is swept away


class Store:
    """Studies in `folder`. Every method is safe to call from several threads; every change is all or nothing.

    Raises Refusal when the folder cannot be used or was written by a newer version.
    """

    def __init__(self, folder: Path) -> None:
        self.folder = folder
        self._studies = folder / "studies"
        self.incoming = folder / files.INCOMING
        with files.disk_in_words(folder):
            self._studies.mkdir(parents=True, exist_ok=True)
            self.incoming.mkdir(exist_ok=True)
        self.database = Database(folder / "steelyard.db")
        self._tables: Bounded[Table] = Bounded(TABLES_KEPT)
        self._learned: Bounded[engine.Learned] = Bounded(MODELS_KEPT)
        self._sweep()

    def close(self) -> None:
        self.database.close()

    # studies

    def studies(self) -> list[Study]:
        """Every study, the one asked or brought last first."""
        with self.database.reading() as database:
            rows = database.execute("SELECT * FROM studies").fetchall()
        return sorted(
            map(study_of, rows), key=lambda study: study.last.at if study.last else study.created, reverse=True
        )

    def study(self, key: str) -> Study:
        """Raises NoSuchStudy."""
        with self.database.reading() as database:
            row = database.execute("SELECT * FROM studies WHERE key = ?", (key,)).fetchone()
        if row is None:
            raise NoSuchStudy(key)
        return study_of(row)

    def sample(self, sample: str) -> Study | None:
        """The study that was made of this sample, if there is one."""
        with self.database.reading() as database:
            row = database.execute("SELECT * FROM studies WHERE sample = ?", (sample,)).fetchone()
        return None if row is None else study_of(row)

    def bring(
        self,
        name: str,
        frame: pd.DataFrame,
        source: str,
        choices: Choices | None = None,
        plan: Plan | None = None,
        warnings: Iterable[str] = (),
        sample: str | None = None,
    ) -> Study:
        """Keep a table as a new study. Without a plan every usable column is in one stage.

        Raises Refusal when no table can be made of the frame, or the choices or the plan do not fit it.
        """
        choices = choices or Choices()
        name = " ".join(name.split()) or "Untitled"
        table = table_of(frame, choices, name)
        if plan is None:
            plan = first_plan(table)
        check(plan, table)
        key = self._new_folder(name)
        try:
            files.write(self.files(key) / RECORDS, lambda path: frame.to_parquet(path, index=False))
            with self.database.writing() as database:
                database.execute(
                    "INSERT INTO studies (key, name, created, source, sample, rows, columns, digest, choices, plan, "
                    "warnings) VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?)",
                    (
                        *(key, name, datetime.now(UTC).isoformat(), source, sample, table.rows, len(table.columns)),
                        *(table.digest, choices.to_json(), plan.to_json(), json.dumps(list(warnings))),
                    ),
                )
        except BaseException as error:
            shutil.rmtree(self.files(key), ignore_errors=True)
            if isinstance(error, sqlite3.IntegrityError) and sample and (there := self.sample(sample)):
                return there  # another tab brought the same sample meanwhile
            raise
        self._tables.put((key, choices.to_json()), table)
        return self.study(key)

    # records and choices

    def files(self, key: str) -> Path:
        """The folder of a study's files."""
        return self._studies / key

    def records(self, key: str) -> Path:
        """The Parquet file of a study's records, as they were read."""
        return self.files(key) / RECORDS

    def table(self, key: str) -> Table:
        """Raises NoSuchStudy, and Refusal when the records on the disk are damaged."""
        study = self.study(key)
        return self._tables.get((key, study.choices.to_json()), lambda: self._open_table(study, study.choices))

    def save(self, key: str, choices: Choices | None = None, plan: Plan | None = None) -> Study:
        """Save choices, a plan, or both as one change; the plan is mended where it no longer fits the choices.

        What the mending did stands in `Study.mended`. Raises Refusal, and saves nothing, when they do not fit.
        """
        study = self.study(key)
        table = None if choices is None else self._open_table(study, choices, self.table(key).frame)
        with self.database.writing() as database:
            row = database.execute("SELECT * FROM studies WHERE key = ?", (key,)).fetchone()
            said: tuple[str, ...] = ()
            wanted = plan or study_of(row).plan
            if table is None:
                check(wanted, self.table(key))  # as the choices stand now: another tab may have changed them
            else:
                wanted, said = mend(wanted, table)
                check(wanted, table)
            if choices is not None and table is not None:
                database.execute(
                    "UPDATE studies SET choices = ?, digest = ?, rows = ? WHERE key = ?",
                    (choices.to_json(), table.digest, table.rows, key),
                )
                self._tables.put((key, choices.to_json()), table)
            database.execute(
                "UPDATE studies SET plan = ?, mended = ? WHERE key = ?", (wanted.to_json(), json.dumps(said), key)
            )
        return self.study(key)

    def save_choices(self, key: str, choices: Choices) -> Study:
        return self.save(key, choices=choices)

    def save_plan(self, key: str, plan: Plan) -> Study:
        return self.save(key, plan=plan)

    # models

    def keep_learned(self, key: str, path: Path, basis: str) -> None:
        """Take over the learned file at `path`, which is in the study's folder, as the study's model.

        basis: `Study.basis` when the learning started. The accepted budget is cleared: it belonged to the model before.
        Raises Refusal, and keeps the model before, when the file cannot be opened or kept.
        """
        learned = engine.open_learned(path)
        kept = path.with_name(f"{files.unfinished(path.parent).stem}.learned")
        with files.disk_in_words(path.parent):
            files.put_in_place(path, kept)
        try:
            with self.database.writing() as database:
                row = database.execute("SELECT learned_file, choices FROM studies WHERE key = ?", (key,)).fetchone()
                if row is None:
                    raise NoSuchStudy(key)
                database.execute(
                    "UPDATE studies SET learned_file = ?, learned_basis = ?, recommended = ?, links = NULL "
                    "WHERE key = ?",
                    (kept.name, basis, learned.recommended, key),
                )
        except BaseException:
            kept.unlink(missing_ok=True)
            raise
        units = Choices.from_json(row["choices"]).units
        self._learned.put((key, kept.name, _sorted(units)), learned.in_units(units))
        if row["learned_file"]:
            (self.files(key) / row["learned_file"]).unlink(missing_ok=True)

    def limit_parents(self, key: str, most: int) -> Study:
        """Let a column have at most this many parents when the study is learned the next time. Raises Refusal."""
        check_limits(None, most, 0, 0)
        with self.database.writing() as database:
            database.execute("UPDATE studies SET max_parents = ? WHERE key = ?", (most, key))
        return self.study(key)

    def learned(self, key: str) -> engine.Learned | None:
        """What was learned last, current or old, in the units that are stated now; None before the first time.

        Raises NoSuchStudy and ModelUnreadable.
        """
        with self.database.reading() as database:
            row = database.execute("SELECT learned_file, choices FROM studies WHERE key = ?", (key,)).fetchone()
        if row is None:
            raise NoSuchStudy(key)
        name, units = row["learned_file"], Choices.from_json(row["choices"]).units
        if name is None:
            return None
        return self._learned.get((key, name, _sorted(units)), lambda: self._open_learned(key, name).in_units(units))

    def model(self, key: str) -> engine.Model:
        """The model at the accepted budget, else at the recommended one. Raises NoModelYet and NoSuchStudy."""
        study, learned = self.study(key), self.learned(key)
        if learned is None:
            raise NoModelYet(study)
        return learned.model(study.links)

    def accept(self, key: str, links: int) -> Study:
        """Accept the model with this many links. Raises Refusal when there is none, NoModelYet before learning."""
        study, learned = self.study(key), self.learned(key)
        if learned is None:
            raise NoModelYet(study)
        budgets = [int(budget) for budget in learned.curve["links"]]
        if links not in budgets:
            raise Refusal(
                f"There is no model with {links} links.",
                where="links",
                do=f"Choose between {min(budgets)} and {max(budgets)}.",
            )
        with self.database.writing() as database:
            database.execute("UPDATE studies SET links = ? WHERE key = ?", (links, key))
        return self.study(key)

    # questions

    def note_question(self, key: str, query: str, sentence: str, cautions: Iterable[Caution]) -> None:
        """Remember the question answered last. The same question again (a reload) is not counted twice."""
        ranks = tuple(caution.rank for caution in cautions)
        asked = Asked(query, sentence, ranks, datetime.now(UTC))
        with self.database.writing() as database:
            row = database.execute("SELECT last FROM studies WHERE key = ?", (key,)).fetchone()
            if row is None:
                raise NoSuchStudy(key)
            again = row["last"] is not None and Asked.from_json(row["last"]).query == query
            database.execute(
                "UPDATE studies SET last = ?, asked = asked + ? WHERE key = ?", (asked.to_json(), int(not again), key)
            )

    # inside

    def _new_folder(self, name: str) -> str:
        """Make a folder with a free key; making it is what reserves the key."""
        plain = unicodedata.normalize("NFKD", name).encode("ascii", "ignore").decode().lower()
        wanted = re.sub(r"[^a-z0-9]+", "-", plain).strip("-")[:48].strip("-") or "study"
        key, number = wanted, 1
        while True:
            try:
                with files.disk_in_words(self._studies):
                    self.files(key).mkdir()
                return key
            except Refusal as refusal:
                if not isinstance(refusal.__cause__, FileExistsError):
                    raise
            number += 1
            key = f"{wanted}-{number}"

    def _open_table(self, study: Study, choices: Choices, frame: pd.DataFrame | None = None) -> Table:
        if frame is None:
            path = self.records(study.key)
            try:
                frame = pd.read_parquet(path)
            except (OSError, ValueError) as error:
                raise RecordsDamaged(study.name, path) from error
        return table_of(frame, choices, study.name)

    def _open_learned(self, key: str, name: str) -> engine.Learned:
        path = self.files(key) / name
        try:
            return engine.open_learned(path)
        except (OSError, Refusal) as error:
            raise ModelUnreadable(path) from error

    def _sweep(self) -> None:
        """Remove what a crash left behind: old files and folders that no study names."""
        with self.database.reading() as database:
            rows = database.execute("SELECT key, learned_file FROM studies").fetchall()
        named = {row["key"]: {RECORDS, row["learned_file"]} for row in rows}
        left = list(self.incoming.iterdir())
        for folder in self._studies.iterdir():
            if folder.name in named:
                left += [path for path in folder.iterdir() if path.name not in named[folder.name]]
            else:
                left.append(folder)
        for path in left:
            if time.time() - path.stat().st_mtime < ABANDONED:
                continue
            if path.is_dir():
                shutil.rmtree(path, ignore_errors=True)
            else:
                path.unlink(missing_ok=True)


def _sorted(units: Mapping[str, str]) -> tuple[tuple[str, str], ...]:
    return tuple(sorted(units.items()))
