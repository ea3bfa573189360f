"""What runs in processes of its own: learning, judging, and reading files that nobody vouches for.

A process can be ended at any moment without harm to the server. Where the system allows, children are forked from a
small server that has the engine loaded already; elsewhere each starts afresh and takes a second or so longer.
"""

from __future__ import annotations

import contextlib
import logging
import multiprocessing
import os
import signal
import sys
import threading
from collections.abc import Callable, Iterator
from multiprocessing import resource_tracker
from multiprocessing.connection import Connection
from multiprocessing.context import ForkServerContext, SpawnContext
from multiprocessing.process import BaseProcess
from pathlib import Path

import pandas as pd

import engine
from app.store.rows import table_of
from app.store.values import Choices, Plan
from engine.judging.archive import as_text
from engine.records import read_frame
from engine.refusal import Refusal

log = logging.getLogger("steelyard")
Report = tuple[object, ...]  # what a child sends: ("progress", fraction, words), ("done", ...), ("refused", ...), ...


def context() -> ForkServerContext | SpawnContext:
    """How children start on this system."""
    if "forkserver" in multiprocessing.get_all_start_methods():
        chosen = multiprocessing.get_context("forkserver")
        chosen.set_forkserver_preload([__name__])
        return chosen
    return multiprocessing.get_context("spawn")


def warm() -> None:
    """Start the server that children are forked from, so that the first one does not wait for it."""
    if context().get_start_method() == "forkserver":
        from multiprocessing import forkserver

        with _interrupts_held():
            forkserver.ensure_running()


def start(process: BaseProcess) -> None:
    """Start a child. Ctrl-C does not reach it: that is for the server, which ends its children."""
    with _interrupts_held():
        process.start()


def learn_study(
    pipe: Connection, records: Path, name: str, choices: str, plan: str, max_parents: int, out: Path
) -> None:
    """Learn from a study's records and write the learned file to `out`. Runs in a child."""

    def learn() -> Report:
        def progress(fraction: float, words: str) -> None:
            pipe.send(("progress", float(fraction), str(words)))

        progress(0.0, "Opening the records")
        table = table_of(pd.read_parquet(records), Choices.from_json(choices), name)
        learned = engine.learn(table, Plan.from_json(plan).order(), max_parents=max_parents, progress=progress)
        learned.save(out)
        return ("done",)

    report(pipe, learn)


def judge_study(
    pipe: Connection, records: Path, name: str, choices: str, learned: Path, links: int | None, out: Path
) -> None:
    """Judge the model of `links` links in the learned file and write the judgement to `out`. Runs in a child."""

    def judge() -> Report:
        def progress(fraction: float, words: str) -> None:
            pipe.send(("progress", float(fraction), str(words)))

        progress(0.0, "Opening the records")
        table = table_of(pd.read_parquet(records), Choices.from_json(choices), name)
        judgement = engine.judge(engine.open_learned(learned), table, progress, links)
        out.write_text(as_text(judgement), encoding="utf-8")
        return ("done",)

    report(pipe, judge)


def parse_upload(pipe: Connection, path: Path, name: str, out: Path, memory: int) -> None:
    """Read the file at `path` and write its frame to `out` as Parquet. Runs in a child.

    name: as its owner called it.  memory: bytes that reading may take.
    """

    def parse() -> Report:
        _limit_memory(memory)
        try:
            frame, warnings = read_frame(path, name)
        except Refusal as refusal:
            if _out_of_memory(refusal):
                raise MemoryError from refusal
            raise
        frame.to_parquet(out, index=False)
        return ("done", tuple(warnings))

    report(pipe, parse)


def report(pipe: Connection, work: Callable[[], Report]) -> None:
    """Do `work` and send how it ended; end at once when the server does. Runs in a child."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    threading.Thread(target=_end_with_parent, args=(pipe,), daemon=True).start()
    try:
        ended = work()
    except Refusal as refusal:
        ended = ("refused", refusal.message, refusal.where, refusal.do)
    except MemoryError:
        ended = ("memory",)
    except BrokenPipeError:
        return
    except Exception as error:
        log.exception("A child process met an error")
        ended = ("broken", type(error).__name__)
    pipe.send(ended)


@contextlib.contextmanager
def _interrupts_held() -> Iterator[None]:
    """Hold Ctrl-C back in this thread; processes started meanwhile hold it back for good."""
    if not hasattr(signal, "pthread_sigmask"):
        yield
        return
    resource_tracker.ensure_running()  # when started later it would let Ctrl-C through again
    before = signal.pthread_sigmask(signal.SIG_BLOCK, {signal.SIGINT})
    try:
        yield
    finally:
        signal.pthread_sigmask(signal.SIG_SETMASK, before)


def _end_with_parent(pipe: Connection) -> None:
    try:
        pipe.recv()  # nothing is ever sent this way: it returns when the server is gone
    except (EOFError, OSError):
        os._exit(1)


def _out_of_memory(error: BaseException | None) -> bool:
    """Whether want of memory is behind `error`; a parser may take it for a fault of the file."""
    while error is not None:
        if isinstance(error, MemoryError) or "out of memory" in str(error):
            return True
        error = error.__cause__ or error.__context__
    return False


def _limit_memory(extra: int) -> None:
    """Let this process grow by `extra` bytes and no more, where the system can enforce it."""
    if sys.platform != "linux":
        return
    import resource

    pages = int(Path("/proc/self/statm").read_text().split()[0])
    limit = pages * resource.getpagesize() + extra
    _, hard = resource.getrlimit(resource.RLIMIT_AS)
    resource.setrlimit(resource.RLIMIT_AS, (limit if hard == resource.RLIM_INFINITY else min(limit, hard), hard))
