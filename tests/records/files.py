"""Files of records for the tests, written by the standard library and openpyxl."""

from __future__ import annotations

import csv
import io
import zipfile
from collections.abc import Sequence

import openpyxl

from engine.records import read_frame


def delimited(
    rows: Sequence[Sequence[str]], separator: str = ",", ends: str = "\r\n", encoding: str = "utf-8"
) -> bytes:
    text = io.StringIO(newline="")
    quoting = csv.QUOTE_MINIMAL if "\n" in ends else csv.QUOTE_ALL  # else the module leaves line breaks bare
    csv.writer(text, delimiter=separator, lineterminator=ends, quoting=quoting).writerows(rows)
    return text.getvalue().encode(encoding)


def spreadsheet(**sheets: Sequence[Sequence[object]]) -> bytes:
    book = openpyxl.Workbook()
    book.remove(book.active)
    for title, rows in sheets.items():
        sheet = book.create_sheet(title)
        for row in rows:
            sheet.append(list(row))
    out = io.BytesIO()
    book.save(out)
    return out.getvalue()


def changed_part(content: bytes, part: str, change) -> bytes:
    """A packed file with one of its parts changed: what other programs may write."""
    out = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(content)) as old, zipfile.ZipFile(out, "w", zipfile.ZIP_DEFLATED) as new:
        for entry in old.infolist():
            body = old.read(entry)
            new.writestr(entry.filename, change(body) if entry.filename == part else body)
    return out.getvalue()


def read(content: bytes | str, name: str = "visits.csv"):
    """The frame and the sentences about how it was read."""
    return read_frame(io.BytesIO(content.encode() if isinstance(content, str) else content), name)


def cells_of(frame) -> list[list[object]]:
    """Rows of cells, None where blank."""
    return [[None if cell != cell else cell for cell in row] for row in frame.astype(object).to_numpy().tolist()]
