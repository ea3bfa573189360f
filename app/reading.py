"""Reading an uploaded file: in a child process, within a memory and a time limit."""

from __future__ import annotations

import tempfile
from pathlib import Path
from typing import IO

import pandas as pd

from app import workers
from app.settings import Settings
from app.store.files import INCOMING, disk_in_words
from engine.refusal import Refusal

BLOCK = 1_000_000  # bytes copied at a time


class TooLarge(Refusal):
    """More was sent than the settings allow."""


def read_upload(file: IO[bytes], name: str, settings: Settings) -> tuple[pd.DataFrame, tuple[str, ...]]:
    """The frame in `file`, and sentences about how it was read.

    name: as its owner called it; its ending says what it is.  The limits are those of the settings.
    Raises Refusal when the file cannot be read, and when reading it takes too much memory or time.
    """
    incoming = settings.data / INCOMING
    with disk_in_words(incoming):
        incoming.mkdir(parents=True, exist_ok=True)
    with tempfile.TemporaryDirectory(dir=incoming) as folder:
        upload, out = Path(folder) / "upload", Path(folder) / "frame.parquet"
        _copy(file, upload, settings)
        warnings = _parse(upload, name, out, settings)
        return pd.read_parquet(out), warnings


def _copy(file: IO[bytes], path: Path, settings: Settings) -> None:
    size = 0
    with disk_in_words(path.parent), path.open("wb") as copy:
        while block := file.read(BLOCK):
            size += len(block)
            if size > settings.upload_bytes:
                raise too_large(settings)
            copy.write(block)


def too_large(settings: Settings) -> TooLarge:
    return TooLarge(
        f"The file is larger than {settings.upload_limit} MB, the most that can be brought.",
        do="Leave out columns that the question does not need, or start Steelyard with a larger --upload-limit.",
    )


def _parse(upload: Path, name: str, out: Path, settings: Settings) -> tuple[str, ...]:
    context = workers.context()
    ours, theirs = context.Pipe()
    process = context.Process(
        target=workers.parse_upload,
        args=(theirs, upload, name, out, settings.reading_memory * 1_000_000),
        daemon=True,
    )
    workers.start(process)
    theirs.close()
    try:
        if not ours.poll(settings.reading_time):
            raise Refusal(
                f"Reading “{name}” took more than {settings.reading_time} seconds and was stopped.",
                where=name,
                do="Save the table as CSV or with fewer rows, or start Steelyard with a larger --reading-time.",
            )
        report = ours.recv()
    except EOFError:
        report = ("memory",)
    finally:
        ours.close()
        process.kill()
        process.join()
        process.close()
    match report:
        case ("done", warnings):
            return tuple(warnings)
        case ("refused", message, where, do):
            raise Refusal(message, where=where, do=do)
        case ("memory",):
            raise Refusal(
                f"Reading “{name}” took more memory than it may ({settings.reading_memory} MB) and was stopped.",
                where=name,
                do="Save the table as CSV or with fewer rows, or start Steelyard with a larger --reading-memory.",
            )
    raise Refusal(f"“{name}” could not be read.", where=name, do="Save it as CSV in UTF-8 and bring it again.")
