"""Learning jobs: one process each, progress that survives a reload, a cancel that cancels."""

from __future__ import annotations

import json
import threading
import time
from dataclasses import dataclass, field, replace
from datetime import UTC, datetime
from multiprocessing.connection import Connection
from multiprocessing.process import BaseProcess
from pathlib import Path
from typing import Literal

from app import workers
from app.store import Store, Study, files
from engine.refusal import Refusal

State = Literal["running", "done", "failed", "cancelled", "died"]
BEAT = 1.0  # seconds between two signs of life in the database
SILENCE = 5.0  # seconds without one after which the server that ran the job is taken for gone
MERCY = 0.1  # seconds between asking a worker to end and ending it
STEPS_KEPT = 40


@dataclass(frozen=True)
class JobState:
    """How the learning of one study stands.

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


@dataclass
class _Job:
    """A job of this server. `state` is replaced whole; `lock` is held where its end is decided."""

    study: Study
    out: Path
    state: JobState
    lock: threading.RLock = field(default_factory=threading.RLock)
    process: BaseProcess | None = None
    thread: threading.Thread | None = None

    @property
    def running(self) -> bool:
        return self.state.state == "running"


class Jobs:
    """The learning jobs of the studies in `store`, at most one a study."""

    def __init__(self, store: Store) -> None:
        self._store = store
        self._jobs: dict[str, _Job] = {}
        self._lock = threading.RLock()

    def warm(self) -> None:
        """Make ready for the first job in the background."""
        threading.Thread(target=workers.warm, daemon=True).start()

    def start(self, key: str) -> JobState:
        """Start learning, or go on with what runs. Raises NoSuchStudy, and Refusal for a plan that is no order."""
        study = self._store.study(key)
        study.plan.order()
        with self._lock:
            now = self.state(key)
            if now is not None and now.state == "running":
                return now
            state = JobState("running", 0.0, "Starting", (), datetime.now(UTC))
            job = _Job(study, files.unfinished(self._store.files(key)), state)
            self._begin(key, state)
            self._jobs[key] = job
            job.thread = threading.Thread(target=self._run, args=(job,), daemon=True, name=f"learning {key}")
            job.thread.start()
        return state

    def state(self, key: str) -> JobState | None:
        """How the last job of this study stands, whichever server ran it; None when there was none."""
        with self._lock:
            job = self._jobs.get(key)
        return self._recorded(key) if job is None else job.state

    def cancel(self, key: str) -> JobState | None:
        """End the job at once. What was learned before stays; a job that has ended stays as it is."""
        with self._lock:
            job = self._jobs.get(key)
        if job is not None:
            self._end(job, "cancelled", None)
        else:
            with self._store.database.writing() as database:  # another server's job: it looks here at every beat
                database.execute("UPDATE jobs SET state = 'cancelled' WHERE study = ? AND state = 'running'", (key,))
        return self.state(key)

    def forget(self, key: str) -> None:
        """Forget a job that has ended, so that nothing is said of it any more."""
        with self._lock:
            state = self.state(key)
            if state is None or state.state == "running":
                return
            self._jobs.pop(key, None)
            with self._store.database.writing() as database:
                database.execute("DELETE FROM jobs WHERE study = ?", (key,))

    def close(self) -> None:
        """End every job of this server, before the store is closed."""
        with self._lock:
            jobs = list(self._jobs.values())
        for job in jobs:
            self._end(job, "died", _closed())
        for job in jobs:
            if job.thread is not None:
                job.thread.join()

    # inside: the thread of one job

    def _run(self, job: _Job) -> None:
        try:
            self._decide(job, self._listen(job))
        except Refusal as refusal:
            self._finish(job, "failed", refusal)
        finally:
            job.out.unlink(missing_ok=True)

    def _listen(self, job: _Job) -> workers.Report:
        """Start the worker and follow it until its last report; ("died", exit code) when it ended without one."""
        context = workers.context()
        ours, theirs = context.Pipe()
        arguments = (
            *(theirs, self._store.records(job.study.key), job.study.name),
            *(job.study.choices.to_json(), job.study.plan.to_json(), job.out),
        )
        process = context.Process(target=workers.learn_study, args=arguments, daemon=True)
        with job.lock:
            if not job.running:
                ours.close()
                theirs.close()
                return ("cancelled",)
            try:
                process.start()
            except OSError as error:
                ours.close()
                raise Refusal(
                    f"No process could be started for learning: {error.strerror or 'the system refused'}.",
                    do="Close other programs and start again.",
                ) from error
            finally:
                theirs.close()
            job.process = process
        try:
            return self._follow(job, ours)
        finally:
            ours.close()
            process.join(MERCY)
            if process.is_alive():
                process.kill()
                process.join()

    def _follow(self, job: _Job, pipe: Connection) -> workers.Report:
        saved = time.monotonic()
        while job.running:
            try:
                report = pipe.recv() if pipe.poll(BEAT / 4) else None
            except (EOFError, OSError):
                assert job.process is not None
                job.process.join(BEAT)
                return ("died", job.process.exitcode)
            match report:
                case None:
                    pass
                case ("progress", fraction, words):
                    self._progress(job, fraction, words)
                case _:
                    return tuple(report)
            if time.monotonic() - saved >= BEAT:
                saved = time.monotonic()
                if not self._beat(job):
                    self._end(job, "cancelled", None)
        return ("cancelled",)

    def _progress(self, job: _Job, fraction: float, words: str) -> None:
        with job.lock:
            now = job.state
            done = now.done if words == now.words else (*now.done, now.words)[-STEPS_KEPT:]
            job.state = replace(now, fraction=min(max(fraction, now.fraction), 1.0), words=words, done=done)

    def _decide(self, job: _Job, report: workers.Report) -> None:
        match report:
            case ("done",):
                with job.lock:
                    if job.running:
                        self._store.keep_learned(job.study.key, job.out, job.study.basis)
                        self._finish(job, "done", None)
            case ("refused", message, where, do):
                self._finish(job, "failed", Refusal(str(message), where=where, do=do))  # type: ignore[arg-type]
            case ("memory",):
                self._finish(job, "failed", Refusal("Learning ran out of memory.", do=_SMALLER))
            case ("broken", name):
                words = f"Learning met an error of the program ({name}) and stopped; the study is as it was."
                self._finish(job, "failed", Refusal(words, do="Start again; if it stays so, report it with this line."))
            case ("died", code):
                how = f"signal {-code}" if isinstance(code, int) and code < 0 else f"exit code {code}"
                words = f"The process that was learning was ended from outside ({how}); the study is as it was."
                self._finish(job, "died", Refusal(words, do=_SMALLER))

    # inside: ends

    def _end(self, job: _Job, state: State, refusal: Refusal | None) -> None:
        """Decide a running job's end now, and end its process."""
        with job.lock:
            if not job.running:
                return
            self._finish(job, state, refusal)
            process = job.process
        if process is not None and process.is_alive():
            process.terminate()
            process.join(MERCY)
            if process.is_alive():
                process.kill()

    def _finish(self, job: _Job, state: State, refusal: Refusal | None) -> None:
        with job.lock:
            if not job.running:
                return
            job.state = _ended(job.state, state, refusal)
        self._write(job)

    # inside: the database

    def _begin(self, key: str, state: JobState) -> None:
        with self._store.database.writing() as database:
            database.execute(
                "INSERT OR REPLACE INTO jobs (study, state, fraction, words, done, started, beat) "
                "VALUES (?, ?, ?, ?, ?, ?, ?)",
                (key, state.state, state.fraction, state.words, "[]", state.started.isoformat(), time.time()),
            )

    def _beat(self, job: _Job) -> bool:
        """Write the progress down. False when another server cancelled the job there."""
        return self._write(job, only_running=True)

    def _write(self, job: _Job, only_running: bool = False) -> bool:
        state = job.state
        with self._store.database.writing() as database:
            found = database.execute(
                "UPDATE jobs SET state = ?, fraction = ?, words = ?, done = ?, beat = ?, message = ?, place = ?, "
                "advice = ? WHERE study = ? AND started = ? AND (state = 'running' OR ?)",
                (
                    *(state.state, state.fraction, state.words, json.dumps(state.done), time.time()),
                    *(state.message, state.where, state.do),
                    *(job.study.key, state.started.isoformat(), not only_running),
                ),
            )
        return found.rowcount > 0

    def _recorded(self, key: str) -> JobState | None:
        with self._store.database.reading() as database:
            row = database.execute("SELECT * FROM jobs WHERE study = ?", (key,)).fetchone()
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
            return _ended(state, "died", _closed())
        return state


_SMALLER = "Start again; if it happens again, close other programs or leave columns out on the Records page."


def _closed() -> Refusal:
    return Refusal("Steelyard was closed while this was learning; the study is as it was.", do="Start learning again.")


def _ended(state: JobState, end: State, refusal: Refusal | None) -> JobState:
    fraction, done = (1.0, (*state.done, state.words)) if end == "done" else (state.fraction, state.done)
    if refusal is None:
        return replace(state, state=end, fraction=fraction, done=done)
    return replace(state, state=end, message=refusal.message, where=refusal.where, do=refusal.do)
