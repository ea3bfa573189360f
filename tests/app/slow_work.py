"""Workers that behave badly on purpose. They run in child processes, so they live in a module that those can import."""

import os
import signal
import time
from pathlib import Path

from app import workers
from engine.refusal import Refusal


def waits(pipe, records, name, choices, plan, max_parents, out):
    """Says how far it is, begins its file, then takes far too long."""

    def work():
        pipe.send(("progress", 0.25, "Counting"))
        pipe.send(("progress", 0.5, "Searching"))
        Path(out).write_bytes(b"begun")
        time.sleep(600)
        return ("done",)

    workers.report(pipe, work)


def will_not_stop(pipe, records, name, choices, plan, max_parents, out):
    """Ignores a polite request to end."""
    signal.signal(signal.SIGTERM, signal.SIG_IGN)
    waits(pipe, records, name, choices, plan, max_parents, out)


def refuses(pipe, records, name, choices, plan, max_parents, out):
    def work():
        raise Refusal("The stage Background has too many columns.", where="Background", do="Split it.")

    workers.report(pipe, work)


def breaks(pipe, records, name, choices, plan, max_parents, out):
    def work():
        os.dup2(os.open(os.devnull, os.O_WRONLY), 2)  # the trace is for the console, not for the test's output
        raise ZeroDivisionError("inner words")

    workers.report(pipe, work)


def leaves_a_damaged_file(pipe, records, name, choices, plan, max_parents, out):
    def work():
        Path(out).write_bytes(b"not a model")
        return ("done",)

    workers.report(pipe, work)


def waits_judging(pipe, records, name, choices, learned, links, out):
    waits(pipe, records, name, choices, "", 3, out)


def breaks_judging(pipe, records, name, choices, learned, links, out):
    breaks(pipe, records, name, choices, "", 3, out)
