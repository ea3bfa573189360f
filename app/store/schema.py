"""The database: its tables, its version, and the one connection to it."""

from __future__ import annotations

import sqlite3
import threading
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from engine.refusal import Refusal

VERSION = 4
PATIENCE = 10.0  # seconds to wait for another process that is writing

_JOB = """
    study TEXT PRIMARY KEY REFERENCES studies (key),
    state TEXT NOT NULL,
    fraction REAL NOT NULL,
    words TEXT NOT NULL,
    done TEXT NOT NULL,
    started TEXT NOT NULL,
    beat REAL NOT NULL,
    message TEXT,
    place TEXT,
    advice TEXT
"""
TABLES = f"""
CREATE TABLE studies (
    key TEXT PRIMARY KEY,
    name TEXT NOT NULL,
    created TEXT NOT NULL,
    source TEXT NOT NULL,
    sample TEXT UNIQUE,
    rows INTEGER NOT NULL,
    columns INTEGER NOT NULL,
    digest TEXT NOT NULL,
    choices TEXT NOT NULL,
    plan TEXT NOT NULL,
    warnings TEXT NOT NULL,
    mended TEXT NOT NULL DEFAULT '[]',
    links INTEGER,
    recommended INTEGER,
    max_parents INTEGER NOT NULL DEFAULT 3,
    learned_file TEXT,
    learned_basis TEXT,
    asked INTEGER NOT NULL DEFAULT 0,
    last TEXT
) STRICT;
CREATE TABLE jobs ({_JOB}) STRICT;
CREATE TABLE judging ({_JOB}) STRICT;
CREATE TABLE judgements (
    study TEXT PRIMARY KEY REFERENCES studies (key),
    learned_file TEXT NOT NULL,
    judgement TEXT NOT NULL
) STRICT;
"""
_TABLES = dict(zip(("studies", "jobs", "judging", "judgements"), TABLES.split(";"), strict=False))
STEPS = {  # what brings the tables of the version before to this one
    2: "ALTER TABLE studies ADD COLUMN max_parents INTEGER NOT NULL DEFAULT 3",
    3: _TABLES["judging"],
    4: _TABLES["judgements"],
}


class Database:
    """One connection in WAL mode, shared by the threads of this process; other processes may have their own."""

    def __init__(self, path: Path) -> None:
        self._path = path
        self._lock = threading.RLock()
        with self._in_words():
            self._connection = sqlite3.connect(path, timeout=PATIENCE, isolation_level=None, check_same_thread=False)
            self._connection.row_factory = sqlite3.Row
        try:
            with self._in_words():
                self._connection.execute("PRAGMA journal_mode = WAL")
                self._connection.execute("PRAGMA synchronous = FULL")
                self._connection.execute("PRAGMA foreign_keys = ON")
                self._prepare()
        except BaseException:
            self._connection.close()
            raise

    @contextmanager
    def reading(self) -> Iterator[sqlite3.Connection]:
        with self._lock, self._in_words():
            yield self._connection

    @contextmanager
    def writing(self) -> Iterator[sqlite3.Connection]:
        """One transaction: all that is done inside, or nothing when anything is raised."""
        with self._lock, self._in_words():
            self._connection.execute("BEGIN IMMEDIATE")
            try:
                yield self._connection
                self._connection.execute("COMMIT")
            except BaseException:
                if self._connection.in_transaction:
                    self._connection.execute("ROLLBACK")
                raise

    def close(self) -> None:
        with self._lock:
            self._connection.close()

    def _prepare(self) -> None:
        """Create the tables of an empty database, or bring older ones up to date; all or nothing."""
        with self.writing() as connection:
            found = int(connection.execute("PRAGMA user_version").fetchone()[0])
            if found > VERSION:
                raise Refusal(
                    f"The studies were written by a newer Steelyard (format {found}; this one reads up to {VERSION}).",
                    where=str(self._path),
                    do="Install the newer version, or give another folder with --data. Nothing here was changed.",
                )
            made = TABLES.split(";") if found == 0 else [STEPS[version] for version in range(found + 1, VERSION + 1)]
            for statement in made:
                connection.execute(statement)
            if found < VERSION:
                connection.execute(f"PRAGMA user_version = {VERSION}")

    @contextmanager
    def _in_words(self) -> Iterator[None]:
        try:
            yield
        except sqlite3.IntegrityError:
            raise  # a rule of the tables, for the caller to put in words
        except sqlite3.DatabaseError as error:
            raise Refusal(
                f"The list of studies could not be read or written: {error}.",
                where=str(self._path),
                do="Try again; if it stays so, check the disk and the folder's permissions. "
                "What was saved before is not touched.",
            ) from error
