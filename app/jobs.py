"""Jobs, learning above all: one process each, progress that survives a reload, a cancel that cancels."""

from __future__ import annotations

import logging
import threading
import time
from collections.abc import Callable
from dataclasses import dataclass, field
from datetime import UTC, datetime
from multiprocessing.connection import Connection
from multiprocessing.process import BaseProcess
from pathlib import Path

from app import workers
from app.store import Store, Study, files
from app.store.progress import JobState, Progress, State, closed
from engine.refusal import Refusal

__all__ = ["JobState", "Jobs"]

log = logging.getLogger("steelyard")
BEAT = 1.0  # seconds between two signs of life in the database
MERCY = 0.1  # seconds between asking a worker to end and ending it


@dataclass
class Job:
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
    """The learning jobs of the studies in `store`, at most one a study. `work` is what their processes run.

    Another kind of job says what it needs, what it does and what it leaves: `_ready`, `_arguments`, `_keep`.
    """

    doing = "learning"

    def __init__(self, store: Store, work: Callable[..., None] = workers.learn_study) -> None:
        self._store = store
        self._work = work
        self._progress = self._written(store)
        self._jobs: dict[str, Job] = {}
        self._lock = threading.RLock()

    def warm(self) -> None:
        """Make ready for the first job in the background."""
        threading.Thread(target=workers.warm, daemon=True).start()

    def start(self, key: str) -> JobState:
        """Start, or go on with what runs. Raises NoSuchStudy, and Refusal for a study that is not ready for it."""
        study = self._ready(key)
        with self._lock:
            now = self.state(key)
            if now is not None and now.state == "running":
                return now
            state = JobState("running", 0.0, "Starting", (), datetime.now(UTC))
            job = Job(study, files.unfinished(self._store.files(key)), state)
            self._progress.begin(key, state)
            self._jobs[key] = job
            job.thread = threading.Thread(target=self._run, args=(job,), daemon=True, name=f"{self.doing} {key}")
            job.thread.start()
        return state

    def state(self, key: str) -> JobState | None:
        """How the last job of this study stands, whichever server ran it; None when there was none."""
        with self._lock:
            job = self._jobs.get(key)
        written = self._progress.read(key)
        if job is not None and (written is None or written.started == job.state.started):
            return job.state
        return written

    def cancel(self, key: str) -> JobState | None:
        """End the job at once. What was learned before stays; a job that has ended stays as it is."""
        with self._lock:
            job = self._jobs.get(key)
        if job is not None and job.running:
            self._end(job, "cancelled", None)
        else:
            self._progress.cancel(key)
        return self.state(key)

    def forget(self, key: str) -> None:
        """Forget a job that has ended, so that nothing is said of it any more."""
        with self._lock:
            state = self.state(key)
            if state is None or state.state == "running":
                return
            self._jobs.pop(key, None)
            self._progress.forget(key)

    def close(self) -> None:
        """End every job of this server, before the store is closed."""
        with self._lock:
            jobs = list(self._jobs.values())
        for job in jobs:
            self._end(job, "died", closed(self.doing))
        for job in jobs:
            if job.thread is not None:
                job.thread.join()

    # inside: what a kind of job is

    def _written(self, store: Store) -> Progress:
        return Progress(store.database)

    def _ready(self, key: str) -> Study:
        """Raises Refusal for a plan that is no order."""
        study = self._store.study(key)
        study.plan.order()
        return study

    def _arguments(self, job: Job) -> tuple[object, ...]:
        """What the work is given after the pipe to report through."""
        study = job.study
        records, choices, plan = self._store.records(study.key), study.choices.to_json(), study.plan.to_json()
        return (records, study.name, choices, plan, study.max_parents, job.out)

    def _keep(self, job: Job) -> None:
        """Take over what the work left at `job.out`."""
        self._store.keep_learned(job.study.key, job.out, job.study.basis)

    # inside: the thread of one job

    def _run(self, job: Job) -> None:
        try:
            self._decide(job, self._listen(job))
        except Refusal as refusal:
            self._finish(job, "failed", refusal)
        except Exception as error:  # whatever it is, nobody may be left waiting for a job that is over
            log.exception("The job of %s met an error", job.study.key)
            self._finish(job, "failed", self._fault(type(error).__name__))
        finally:
            job.out.unlink(missing_ok=True)

    def _listen(self, job: Job) -> workers.Report:
        """Start the worker and follow it until its last report; ("died", exit code) when it ended without one."""
        arguments = self._arguments(job)
        context = workers.context()
        ours, theirs = context.Pipe()
        process = context.Process(target=self._work, args=(theirs, *arguments), daemon=True)
        with job.lock:
            if not job.running:
                ours.close()
                theirs.close()
                return ("cancelled",)
            try:
                workers.start(process)
            except OSError as error:
                ours.close()
                raise Refusal(
                    f"No process could be started for {self.doing}: {error.strerror or 'the system refused'}.",
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

    def _follow(self, job: Job, pipe: Connection) -> workers.Report:
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
                    with job.lock:
                        job.state = job.state.moved(fraction, words)
                case _:
                    return tuple(report)
            if time.monotonic() - saved >= BEAT:
                saved = time.monotonic()
                if not self._progress.write(job.study.key, job.state):  # cancelled by another server
                    self._end(job, "cancelled", None)
        return ("cancelled",)

    def _decide(self, job: Job, report: workers.Report) -> None:
        match report:
            case ("done",):
                with job.lock:
                    if job.running:
                        self._keep(job)
                        self._finish(job, "done", None)
            case ("refused", message, where, do):
                self._finish(job, "failed", Refusal(str(message), where=where, do=do))  # type: ignore[arg-type]
            case ("memory",):
                self._finish(job, "failed", Refusal(f"{self.doing.capitalize()} ran out of memory.", do=_SMALLER))
            case ("broken", name):
                self._finish(job, "failed", self._fault(str(name)))
            case ("died", code):
                how = f"signal {-code}" if isinstance(code, int) and code < 0 else f"exit code {code}"
                words = f"The process that was {self.doing} was ended from outside ({how}); the study is as it was."
                self._finish(job, "died", Refusal(words, do=_SMALLER))

    # inside: ends

    def _end(self, job: Job, state: State, refusal: Refusal | None) -> None:
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

    def _finish(self, job: Job, state: State, refusal: Refusal | None) -> None:
        with job.lock:
            if not job.running:
                return
            job.state = job.state.ended(state, refusal)
        self._progress.write(job.study.key, job.state)

    def _fault(self, name: str) -> Refusal:
        return Refusal(
            f"{self.doing.capitalize()} met an error of the program ({name}) and stopped; the study is as it was.",
            do="Start again; if it stays so, report this line and what the window of the program shows.",
        )


_SMALLER = "Start again; if it happens again, close other programs or leave columns out on the Records page."
