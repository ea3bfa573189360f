"""The bytes of a file become text: which encoding, and whether it is text at all."""

from __future__ import annotations

import re

from engine.refusal import Refusal, quoted

PROBED = 100_000  # bytes looked at for control characters
ODD = 0.01  # share of control characters from which on it is no text

_STARTS = {
    b"\x89PNG": "a picture (PNG)",
    b"\xff\xd8\xff": "a picture (JPEG)",
    b"GIF8": "a picture (GIF)",
    b"BM": "a picture (BMP)",
    b"RIFF": "a picture or a sound",
    b"%PDF": "a PDF document",
    b"PK\x03\x04": "a spreadsheet or another packed file",
    b"\xd0\xcf\x11\xe0": "an old spreadsheet (.xls)",
    b"\x1f\x8b": "a packed file (gzip)",
    b"PAR1": "a Parquet file",
    b"SQLite format 3": "a database",
}
_CONTROL = re.compile(rb"[\x00-\x08\x0e-\x1f\x7f]")


def utf_8(content: bytes, name: str) -> tuple[bytes, tuple[str, ...]]:
    """The file in UTF-8 without a byte order mark, and a sentence when another encoding had to be guessed.

    UTF-8 with or without a mark and UTF-16 with one are told from the bytes; anything else is taken as Windows-1252.
    Raises Refusal for what is no text.
    """
    for start, what in _STARTS.items():
        if content.startswith(start) and (start != b"BM" or b"\x00" in content[:64]):
            raise Refusal(
                f"{quoted(name)} is {what}, not a table of text.",
                where=name,
                do="Save the table as CSV, or give the file the ending that fits it.",
            )
    if content.startswith((b"\xff\xfe", b"\xfe\xff")):
        try:
            return content.decode("utf-16").rstrip("\x1a").encode(), ()
        except UnicodeError:
            raise _no_text(name) from None
    content = content.removeprefix(b"\xef\xbb\xbf").rstrip(b"\x1a")  # the end mark of old systems
    if b"\x00" in content or len(_CONTROL.findall(content[:PROBED])) > ODD * min(len(content), PROBED):
        raise _no_text(name)
    try:
        content.decode("utf-8")
        return content, ()
    except UnicodeDecodeError as error:
        strange = error.start
    line = content.count(b"\n", 0, strange) + 1
    try:
        text = content.decode("cp1252")
    except UnicodeDecodeError as error:
        line = content.count(b"\n", 0, error.start) + 1
        raise Refusal(
            f"{quoted(name)} holds a character that is neither UTF-8 nor Windows-1252 on line {line:,}.",
            where=f"line {line:,}",
            do="Save the table as CSV in UTF-8.",
        ) from None
    return text.encode(), (
        f"The file is not in UTF-8, so its letters were read as Windows-1252; the first is {quoted(text[strange])} "
        f"on line {line:,}.",
    )


def _no_text(name: str) -> Refusal:
    return Refusal(
        f"{quoted(name)} is not a file of text.", where=name, do="Save the table as CSV and bring that file."
    )
