"""Text files of records: which encoding, which separator, and whether every line fits the header."""

from __future__ import annotations

import csv
import io
from collections import Counter
from itertools import islice

import pandas as pd
import pyarrow as pa
import pyarrow.compute as pc
from pyarrow import csv as arrow_csv

from engine.refusal import Refusal

SEPARATORS = {",": "commas", ";": "semicolons", "\t": "tabs", "|": "upright bars"}
PROBED = 200  # lines read to find the separator
LISTED = 5  # lines that do not fit, named in a refusal
SWALLOWED = 100  # line breaks in one cell that tell of a quote never closed

_PICTURES = {
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


def decoded(content: bytes, name: str) -> str:
    """The text of a file: UTF-8 with or without a byte order mark, UTF-16 with one, else Windows-1252.

    Raises Refusal for what is no text.
    """
    for start, what in _PICTURES.items():
        if content.startswith(start) and (start != b"BM" or b"\x00" in content[:64]):
            raise Refusal(
                f"“{name}” is {what}, not a table of text.",
                where=name,
                do="Save the table as CSV, or give the file the ending that fits it.",
            )
    if content.startswith((b"\xff\xfe", b"\xfe\xff")):
        return content.decode("utf-16")
    if b"\x00" in content:
        raise Refusal(f"“{name}” is not a file of text.", where=name, do="Save the table as CSV and bring that file.")
    try:
        return content.decode("utf-8-sig")
    except UnicodeDecodeError:
        pass
    try:
        return content.decode("cp1252")
    except UnicodeDecodeError as error:
        line = content.count(b"\n", 0, error.start) + 1
        raise Refusal(
            f"“{name}” holds a character that is neither UTF-8 nor Windows-1252.",
            where=f"line {line:,}",
            do="Save the table as CSV in UTF-8.",
        ) from None


def separator(text: str, name: str) -> str:
    """The separator that parts the first lines into equally many cells. Raises Refusal where none does."""
    best, best_rank = "", (0.0, 0)
    for candidate in SEPARATORS:
        widths = Counter(len(row) for row in islice(csv.reader(io.StringIO(text), delimiter=candidate), PROBED) if row)
        width, times = max(widths.items(), key=lambda item: (item[1], item[0]), default=(0, 0))
        header = len(next(csv.reader(io.StringIO(text), delimiter=candidate), []))
        rank = (times / max(sum(widths.values()), 1) + (header == width), width)
        if header > 1 and width > 1 and rank > best_rank:
            best, best_rank = candidate, rank
    if not best:
        raise Refusal(
            f"“{name}” has one column only; no comma, semicolon, tab or upright bar parts its first line.",
            where="line 1",
            do="Bring a table with a column for each thing recorded, names of columns in the first line.",
        )
    return best


def text_cells(text: str, name: str) -> tuple[dict[str, pa.Array | pd.Series], str]:
    """Every cell as text, under the names of the first line; and the separator.

    Raises Refusal for an empty file and for lines with more or fewer cells than the header names, line by line.
    """
    text = text.lstrip("\r\n")
    if not text.strip():
        raise Refusal(f"“{name}” is empty.", where=name, do="Bring a table with names of columns in the first line.")
    csv.field_size_limit(10_000_000)
    try:
        mark = separator(text, name)
        header = [cell.strip() for cell in next(csv.reader(io.StringIO(text), delimiter=mark))]
    except csv.Error as error:
        raise Refusal(f"“{name}” cannot be read as a table: {error}.", where=name, do="Save it as CSV again.") from None
    header = checked_names(header, name)
    try:
        cells = arrow_csv.read_csv(
            io.BytesIO(text.encode()),
            read_options=arrow_csv.ReadOptions(autogenerate_column_names=True, use_threads=False, block_size=2**26),
            parse_options=arrow_csv.ParseOptions(delimiter=mark, newlines_in_values=True),
            convert_options=arrow_csv.ConvertOptions(
                column_types={f"f{place}": pa.string() for place in range(len(header))},
                strings_can_be_null=False,
                quoted_strings_can_be_null=False,
            ),
        )
    except pa.ArrowInvalid:
        raise _misfits(text, mark, header, name) or Refusal(
            f"“{name}” cannot be read as a table.", where=name, do="Save it as CSV again."
        ) from None
    if cells.num_columns != len(header):
        raise _misfits(text, mark, header, name) or AssertionError("a header that does not fit itself")
    cells = cells.slice(1)
    for place, column in enumerate(header):
        if cells.num_rows and (pc.max(pc.count_substring(cells.column(place), "\n")).as_py() or 0) >= SWALLOWED:
            raise Refusal(
                f"A cell of “{column}” holds over {SWALLOWED} lines: a quotation mark was opened and never closed.",
                where=column,
                do="Close the quotation mark, or double it inside a text.",
            )
    return {column: cells.column(place).combine_chunks() for place, column in enumerate(header)}, mark


def checked_names(header: list[str], name: str) -> list[str]:
    """The names of the columns. Raises Refusal for a column without a name and for one that comes twice."""
    nameless = [place + 1 for place, column in enumerate(header) if not column]
    if nameless:
        raise Refusal(
            f"Column {nameless[0]} of “{name}” has no name"
            + (f", nor do {len(nameless) - 1} more." if len(nameless) > 1 else "."),
            where="line 1",
            do="Give every column a name in the first line.",
        )
    twice = [column for column, times in Counter(header).items() if times > 1]
    if twice:
        places = [str(place + 1) for place, column in enumerate(header) if column == twice[0]]
        raise Refusal(
            f"Two columns are called “{twice[0]}”: columns {' and '.join(places[:2])} of the first line.",
            where="line 1",
            do="Give each column a name of its own.",
        )
    if all(_is_number(column) for column in header):
        raise Refusal(
            f"The first line of “{name}” holds numbers, not names of columns.",
            where="line 1",
            do="Put a line with the names of the columns on top.",
        )
    return header


def _is_number(text: str) -> bool:
    try:
        float(text.replace(",", "."))
    except ValueError:
        return False
    return True


def _misfits(text: str, mark: str, header: list[str], name: str) -> Refusal | None:
    """What does not fit the header, with line numbers, found by reading line by line."""
    reader = csv.reader(io.StringIO(text), delimiter=mark)
    lines, misfits, began = 0, [], 1
    try:
        for row in reader:
            if row and len(row) != len(header):
                misfits.append((began, len(row)))
            lines += bool(row)
            began = reader.line_num + 1
    except csv.Error as error:
        return Refusal(
            f"“{name}” cannot be read from line {began:,} on: {error}.",
            where=f"line {began:,}",
            do="Correct that line.",
        )
    if not misfits:
        return None
    named = [f"line {line:,} has {width} {'cell' if width == 1 else 'cells'}" for line, width in misfits[:LISTED]]
    more = f" and {len(misfits) - LISTED:,} more lines do not fit" if len(misfits) > LISTED else ""
    return Refusal(
        f"“{name}” was not read: {len(misfits):,} of {lines:,} lines do not fit its own header, which names "
        f"{len(header)} columns: {', '.join(named)}{more}.",
        where=f"line {misfits[0][0]:,}",
        do=f"Most often one of the {SEPARATORS[mark]} stands inside a text without quotation marks. Correct these "
        "lines and bring the file again; nothing was stored.",
    )
