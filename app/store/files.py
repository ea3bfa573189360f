"""Writing files so that a reader finds the old content or the new, never half of either."""

from __future__ import annotations

import contextlib
import os
import secrets
from collections.abc import Callable, Iterator
from pathlib import Path

from engine.refusal import Refusal

INCOMING = "incoming"  # folder in the data folder for uploads that are being read
UNFINISHED = ".unfinished"  # suffix of files that nobody may read yet


def unfinished(folder: Path) -> Path:
    """A new path in `folder` for a file that is still being written. Nothing is created."""
    return folder / (secrets.token_hex(8) + UNFINISHED)


def write(path: Path, fill: Callable[[Path], object]) -> None:
    """Let `fill` write a file beside `path`, then put it in place whole.

    Raises Refusal when the disk refuses; `path` then still holds what it held before.
    """
    temporary = unfinished(path.parent)
    try:
        with disk_in_words(path.parent):
            fill(temporary)
            put_in_place(temporary, path)
    finally:
        temporary.unlink(missing_ok=True)


def put_in_place(temporary: Path, path: Path) -> None:
    """Force `temporary` to the disk, then rename it to `path` in one step. Both are in the same folder."""
    with temporary.open("rb+") as file:
        os.fsync(file.fileno())
    os.replace(temporary, path)
    _settle_folder(path.parent)


@contextlib.contextmanager
def disk_in_words(folder: Path) -> Iterator[None]:
    """Turn the disk's own errors into a Refusal."""
    try:
        yield
    except OSError as error:
        raise Refusal(
            f"The data folder {folder} could not be written: {error.strerror or 'the disk refused'}.",
            where=str(folder),
            do="Make room on the disk or check the folder's permissions, then try again. What was saved is intact.",
        ) from error


def _settle_folder(folder: Path) -> None:
    """Force the rename itself to the disk, where folders can be opened (not on Windows)."""
    if os.name != "posix":
        return
    handle = os.open(folder, os.O_RDONLY)
    try:
        os.fsync(handle)
    finally:
        os.close(handle)
