"""A file becomes a frame of records, or a sentence that says why it cannot."""

from __future__ import annotations

import io
import os
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import IO

import pandas as pd
import pyarrow as pa

from engine.records.decoding import utf_8
from engine.records.delimited import checked_names, one_column, text_cells
from engine.records.parsing import typed
from engine.records.spreadsheets import sheet_cells
from engine.records.table import Table
from engine.refusal import Refusal, quoted

Columns = dict[str, pa.Array | pd.Series]
Source = str | os.PathLike[str] | IO[bytes] | IO[str]
TEXTS = (".csv", ".tsv", ".tab", ".txt")
SHEETS = (".xlsx", ".xlsm")
ENDINGS = (*TEXTS, *SHEETS, ".parquet")
MOST_COLUMNS = 500  # more than anybody puts in order by hand, or looks through on a page


def read_table(
    source: Source,
    name: str | None = None,
    kinds: Mapping[str, str] | None = None,
    bands: Mapping[str, Sequence[float]] | None = None,
    grades: Mapping[str, Sequence[str]] | None = None,
    blanks: Mapping[str, str] | None = None,
    units: Mapping[str, str] | None = None,
) -> Table:
    """Read a CSV, TSV, XLSX or Parquet file and decide every column's kind (see Table.from_frame).

    name: what the file is called, when `source` is an open file.  Raises Refusal with a sentence for a file that
    cannot be read.
    """
    frame, warnings = read_frame(source, name)
    return Table.from_frame(frame, kinds, bands, grades, blanks, _called(source, name), warnings, units)


def read_frame(source: Source, name: str | None = None) -> tuple[pd.DataFrame, tuple[str, ...]]:
    """The cells of a file as texts and floats, None or nan where blank; and what was read into them, in sentences.

    Raises Refusal for a file that cannot be read, saying where it goes wrong and what to do.
    """
    called = _called(source, name)
    ending = Path(called).suffix.lower()
    if ending not in ENDINGS:
        raise Refusal(
            f"{quoted(called)} has an ending that is not known here.",
            where=called,
            do="Bring a file that ends in .csv, .tsv, .xlsx or .parquet.",
        )
    content = _content(source, called)
    if not content:
        raise Refusal(
            f"{quoted(called)} is empty.", where=called, do="Bring a table with column names in its first line."
        )
    said: tuple[str, ...] = ()
    if ending in SHEETS:
        sheet = sheet_cells(content, called)
        frame, more = typed(sheet.columns, sheet.line)
        said = sheet.said
    elif ending == ".parquet":
        frame, more = typed(_parquet(content, called), _record)
    else:
        text, said = utf_8(content, called)
        texts = text_cells(text, called)
        frame, more = typed(texts.columns, texts.line, texts.separator)
    _check(frame, called)
    return frame, (*said, *more)


def _content(source: Source, called: str) -> bytes:
    if not isinstance(source, str | os.PathLike):
        content = source.read()
        return content.encode() if isinstance(content, str) else content
    try:
        return Path(source).read_bytes()
    except FileNotFoundError:
        raise Refusal(
            f"There is no file {quoted(source)}.", where=str(source), do="See how its name is spelt."
        ) from None
    except OSError as error:
        raise Refusal(
            f"{quoted(source)} cannot be opened: {error.strerror or error}.",
            where=str(source),
            do="Give the path of a file.",
        ) from None


def _record(row: int) -> str:
    return f"record {row + 1:,}"


def _called(source: Source, name: str | None) -> str:
    if name:
        return name
    return Path(source).name if isinstance(source, str | os.PathLike) else "table.csv"


def _parquet(content: bytes, name: str) -> Columns:
    import pyarrow.parquet as pq

    try:
        cells = pq.read_table(io.BytesIO(content))
    except Exception as error:  # whatever a damaged file sets off inside the reader
        raise Refusal(
            f"{quoted(name)} is not a Parquet file that can be opened.", where=name, do="Save it again."
        ) from error
    columns: Columns = {}
    for column, each in zip(checked_names(list(cells.column_names), name), cells.columns, strict=True):
        if pa.types.is_nested(each.type):
            raise Refusal(
                f"{quoted(column)} holds lists, not single values.", where=column, do="Leave that column out."
            )
        text = pa.types.is_string(each.type) or pa.types.is_large_string(each.type)
        columns[column] = each.combine_chunks().cast(pa.string()) if text else each.to_pandas()
    return columns


def _check(frame: pd.DataFrame, name: str) -> None:
    if len(frame.columns) < 2:
        raise one_column(name)
    if len(frame.columns) > MOST_COLUMNS:
        raise Refusal(
            f"{quoted(name)} has {len(frame.columns):,} columns, more than the {MOST_COLUMNS} that can be brought.",
            where=name,
            do="Keep the columns that the question is about and bring the table again.",
        )
    if frame.empty or frame.isna().all(axis=None):
        what = "a header but no records" if frame.empty else "names of columns but every cell under them is blank"
        raise Refusal(f"{quoted(name)} has {what}.", where=name, do="Bring a table with one row for each record.")
    if len(frame) < 2:
        raise Refusal(
            f"{quoted(name)} has one record only.",
            where="line 2",
            do="Bring a table with many records, one in each line.",
        )
