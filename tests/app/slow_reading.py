"""Readers that behave badly on purpose, in a module that child processes can import."""

import os
import signal
import time

from app import workers


def waits(pipe, path, name, out, memory):
    def work():
        time.sleep(600)
        return ("done", ())

    workers.report(pipe, work)


def dies(pipe, path, name, out, memory):
    os.kill(os.getpid(), signal.SIGKILL)
