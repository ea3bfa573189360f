"""Spreadsheets (XLSX) of records, opened only once the packed file is known to be of a sane size."""

from __future__ import annotations

import datetime
import io
import zipfile

import openpyxl
import pandas as pd
import pyarrow as pa

from engine.records.delimited import checked_names
from engine.records.wording import number_text
from engine.refusal import Refusal

UNPACKED = 500_000_000  # bytes
RATIO = 200  # unpacked to packed
ENTRIES = 2_000


def sheet_cells(content: bytes, name: str) -> tuple[dict[str, pa.Array | pd.Series], tuple[str, ...]]:
    """Cells of the first sheet that holds any, as texts and floats, and a sentence when there are more sheets.

    Raises Refusal for what is no spreadsheet, unpacks too large, is empty, or has rows wider than its header.
    """
    _check(content, name)
    try:
        book = openpyxl.load_workbook(io.BytesIO(content), read_only=True, data_only=True)
        sheets = [(sheet.title, [list(row) for row in sheet.iter_rows(values_only=True)]) for sheet in book.worksheets]
    except Refusal:
        raise
    except Exception as error:  # whatever a damaged file sets off inside the reader
        raise _damaged(name) from error
    filled = [(title, rows) for title, rows in sheets if any(cell is not None for row in rows for cell in row)]
    if not filled:
        raise Refusal(f"“{name}” is empty.", where=name, do="Bring a table with names of columns in the first line.")
    title, rows = filled[0]
    first = next(place for place, row in enumerate(rows) if any(cell is not None for cell in row))
    header = _trimmed(rows[first])
    names = checked_names(["" if cell is None else _text(cell).strip() for cell in header], name)
    for place, row in enumerate(rows[first + 1 :], start=first + 2):
        if len(_trimmed(row)) > len(names):
            raise Refusal(
                f"Row {place:,} of the sheet “{title}” has {len(_trimmed(row))} cells; the header names {len(names)}.",
                where=f"row {place:,}",
                do="Give the extra cells a column name in the header, or clear them.",
            )
    body = [(row + [None] * len(names))[: len(names)] for row in rows[first + 1 :]]
    columns = {column: _column([row[place] for row in body]) for place, column in enumerate(names)}
    more = [other for other, _ in filled[1:]]
    said = (f"Only the sheet “{title}” was read; {', '.join(f'“{other}”' for other in more)} was not.",) if more else ()
    return columns, said


def _check(content: bytes, name: str) -> None:
    try:
        with zipfile.ZipFile(io.BytesIO(content)) as packed:
            entries = packed.infolist()
    except zipfile.BadZipFile:
        raise _damaged(name) from None
    total = sum(entry.file_size for entry in entries)
    if len(entries) > ENTRIES or total > UNPACKED or total > RATIO * max(len(content), 1):
        raise Refusal(
            f"“{name}” would unpack to {total / 1e6:,.0f} MB in {len(entries):,} parts, too much for a table.",
            where=name,
            do="Save the table as CSV and bring that file.",
        )


def _damaged(name: str) -> Refusal:
    return Refusal(
        f"“{name}” is not a spreadsheet that can be opened.", where=name, do="Save it again as XLSX or as CSV."
    )


def _trimmed(row: list[object]) -> list[object]:
    width = len(row)
    while width and row[width - 1] is None:
        width -= 1
    return row[:width]


def _column(cells: list[object]) -> pa.Array | pd.Series:
    present = [cell for cell in cells if cell is not None]
    numbers = [float(cell) for cell in present if isinstance(cell, int | float) and not isinstance(cell, bool)]
    if present and len(numbers) == len(present):
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
