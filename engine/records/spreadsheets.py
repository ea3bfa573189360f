"""Spreadsheets (XLSX) of records, opened only once the packed file is known to be of a sane size."""

from __future__ import annotations

import datetime
import io
import zipfile
import zlib
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

import openpyxl
import pandas as pd
import pyarrow as pa

from engine.records.delimited import checked_names
from engine.records.wording import cited, listing, number_text
from engine.refusal import Refusal, quoted

UNPACKED = 500_000_000  # bytes
RATIO = 200  # unpacked to packed, from `HARMLESS` bytes on
HARMLESS = 50_000_000
ENTRIES = 2_000
BLOCK = 1_000_000


@dataclass(frozen=True)
class Sheet:
    """The cells of a sheet.

    columns: name -> (rows,) texts as an arrow array, or numbers as float64.  said: sentences about how it was read.
    line: from a row's position to where it stands, such as "row 14".
    """

    columns: dict[str, pa.Array | pd.Series]
    said: tuple[str, ...]
    line: Callable[[int], str]


def sheet_cells(content: bytes, name: str) -> Sheet:
    """The first sheet that holds anything, under the names of its first row that does.

    Raises Refusal for what is no spreadsheet, unpacks too large, is empty, has rows wider than its header, or holds
    formulas without their results.
    """
    formulas = _check(content, name)
    try:
        title, rows, others = _first_filled(content)
        if formulas and (cell := _without_result(content, title, rows)):
            raise Refusal(
                f"The formula in {cell} of the sheet {cited(title)} has no stored result.",
                where=cell,
                do="Open the file in a spreadsheet program, save it, and bring it again; or save it as CSV.",
            )
    except Refusal:
        raise
    except Exception as error:  # whatever a damaged file sets off inside the reader
        raise _damaged(name) from error
    first = next((place for place, row in enumerate(rows) if row), None)
    if first is None:
        raise Refusal(
            f"{quoted(name)} is empty.", where=name, do="Bring a table with names of columns in the first line."
        )
    names = checked_names(["" if cell is None else _text(cell).strip() for cell in rows[first]], name)
    for place, row in enumerate(rows[first + 1 :], start=first + 2):
        if len(row) > len(names):
            raise Refusal(
                f"Row {place:,} of the sheet {cited(title)} has {len(row)} cells; the header names {len(names)}.",
                where=f"row {place:,}",
                do="Give the extra cells a column name in the header, or clear them.",
            )
    body = [row + [None] * (len(names) - len(row)) for row in rows[first + 1 :]]
    columns = {column: _column([row[place] for row in body]) for place, column in enumerate(names)}
    said = (f"Only the sheet {cited(title)} was read, not {listing([cited(each) for each in others])}.",)
    return Sheet(columns, said if others else (), lambda row: f"row {row + first + 2:,}")


def _check(content: bytes, name: str) -> bool:
    """Whether any sheet holds a formula. Raises Refusal for what is no packed file or unpacks too large."""
    if content.startswith(b"\xd0\xcf\x11\xe0"):
        raise Refusal(
            f"{quoted(name)} is an old spreadsheet (.xls) or one with a password.",
            where=name,
            do="Save it as XLSX without a password, or as CSV.",
        )
    try:
        with zipfile.ZipFile(io.BytesIO(content)) as packed:
            entries = packed.infolist()
            total = sum(entry.file_size for entry in entries)
            bloated = total > HARMLESS and total > RATIO * len(content)
            if len(entries) > ENTRIES or total > UNPACKED or bloated:
                raise Refusal(
                    f"{quoted(name)} would unpack to {total / 1e6:,.0f} MB in {len(entries):,} parts, "
                    "too much for a table.",
                    where=name,
                    do="Save the table as CSV and bring that file.",
                )
            return any(_holds_formula(packed, entry) for entry in entries if "worksheets/" in entry.filename)
    except (zipfile.BadZipFile, zlib.error, NotImplementedError, RuntimeError, OSError, EOFError):
        raise _damaged(name) from None


def _holds_formula(packed: zipfile.ZipFile, entry: zipfile.ZipInfo) -> bool:
    tail = b""
    with packed.open(entry) as part:
        while block := part.read(BLOCK):
            if any(mark in tail + block for mark in (b"<f>", b"<f ", b":f>", b":f ")):
                return True
            tail = block[-4:]
    return False


def _first_filled(content: bytes) -> tuple[str, list[list[Any]], list[str]]:
    """The title of the first sheet that holds anything, its rows without blank ends, and the other such sheets."""
    book = openpyxl.load_workbook(io.BytesIO(content), read_only=True, data_only=True)
    title, others = "", list[str]()
    rows: list[list[Any]] = []
    for sheet in book.worksheets:
        sheet.reset_dimensions()  # what the file says of its size may be wrong
        if rows:
            others += [sheet.title] if any(_trimmed(row) for row in sheet.iter_rows(values_only=True)) else []
            continue
        title, rows = sheet.title, [_trimmed(row) for row in sheet.iter_rows(values_only=True)]
        while rows and not rows[-1]:
            rows.pop()
    book.close()
    return title, rows, others


def _without_result(content: bytes, title: str, rows: list[list[Any]]) -> str | None:
    """The first cell that holds a formula but no result."""
    book = openpyxl.load_workbook(io.BytesIO(content), read_only=True)
    book[title].reset_dimensions()
    for place, cells in enumerate(book[title].iter_rows()):
        for cell in cells:
            if cell.data_type == "f":
                row = rows[place] if place < len(rows) else []
                if cell.column > len(row) or row[cell.column - 1] is None:
                    return str(cell.coordinate)
    return None


def _damaged(name: str) -> Refusal:
    return Refusal(
        f"{quoted(name)} is not a spreadsheet that can be opened.", where=name, do="Save it again as XLSX or as CSV."
    )


def _trimmed(row: Sequence[Any]) -> list[Any]:
    width = len(row)
    while width and (row[width - 1] is None or (isinstance(row[width - 1], str) and not row[width - 1].strip())):
        width -= 1
    return list(row[:width])


def _column(cells: list[Any]) -> pa.Array | pd.Series:
    present = [cell for cell in cells if cell is not None]
    if present and all(isinstance(cell, int | float) and not isinstance(cell, bool) for cell in present):
        return pd.Series(cells, dtype="float64")
    return pa.array([None if cell is None else _text(cell) for cell in cells], pa.string())


def _text(cell: object) -> str:
    if isinstance(cell, bool):
        return str(cell).upper()
    if isinstance(cell, int | float):
        return number_text(float(cell))
    if isinstance(cell, datetime.datetime) and cell.time() == datetime.time():
        return cell.date().isoformat()
    if isinstance(cell, datetime.datetime):
        return cell.isoformat(sep=" ")
    return str(cell)
