"""Text files of records: which separator, and whether every line fits the header."""

from __future__ import annotations

import csv
import io
import re
from collections import Counter
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from itertools import islice

import pyarrow as pa
from pyarrow import csv as arrow_csv

from engine.refusal import Refusal, quoted

SEPARATORS = {"\t": "tabs", ";": "semicolons", "|": "upright bars", ",": "commas"}  # the rarest inside texts first
HEAD = 1_000_000  # bytes in which the header and the separator are found
PROBED = 300  # records read to find the separator
LISTED = 5  # lines that do not fit, named in a refusal
LONGEST = 10_000_000  # characters of a cell
_SAID = re.compile(rb"sep=(.)(?:\r\n|\n|\r)", re.IGNORECASE)  # a first line that spreadsheets write
_BLANK_LINE = re.compile(rb"(?:\A|\n|\r(?!\n))[ \t]*[\r\n]")


@dataclass(frozen=True)
class Texts:
    """The cells of a file as text.

    columns: name -> (rows,) texts.  separator: of the file, "" when it has none.
    line: from a row's position to where it stands, such as "line 14".
    """

    columns: dict[str, pa.Array]
    separator: str
    line: Callable[[int], str]


def text_cells(content: bytes, name: str) -> Texts:
    """Every cell of a file in UTF-8, under the names of its first line. Lines without a mark on them are no records.

    Raises Refusal for an empty file, a header without a name or with one twice, a quotation mark that is never closed,
    and lines with more or fewer cells than the header names, line by line.
    """
    if not content.strip():
        raise Refusal(
            f"{quoted(name)} is empty.", where=name, do="Bring a table with names of columns in the first line."
        )
    csv.field_size_limit(LONGEST)
    said = _SAID.match(content)
    skipped = said.end() if said else 0
    above = 1 if said else 0
    head = _head(content[skipped : skipped + HEAD], len(content) - skipped > HEAD)
    mark = said[1].decode("latin-1") if said else separator(head, name)
    reader = csv.reader(io.StringIO(head, newline=""), delimiter=mark)
    try:
        header = next((row for row in reader if not _is_blank(row)), [])
    except csv.Error as error:
        raise _unreadable(name, reader.line_num + above, error) from None
    names = checked_names([cell.strip() for cell in header], name)
    lines = io.StringIO(head, newline="")
    start = skipped + sum(len(lines.readline().encode()) for _ in range(reader.line_num))
    body = content[start:]
    if len(names) < 2:
        _slow(content[skipped:].decode(), mark, names, name, above)  # a title above the header is said with its line
        raise one_column(name)
    cells = None if body.count(b'"') % 2 else _fast(body, mark, len(names))
    if cells is None:
        cells = _slow(content[skipped:].decode(), mark, names, name, above)
    first = reader.line_num + above + 1

    def line(row: int) -> str:
        if b'"' not in body and not _BLANK_LINE.search(body):
            return f"line {first + row:,}"
        records = _records(content[skipped:].decode(), mark)
        began, _ = next(islice(records, row + 1, None))  # the header is the first record
        return f"line {began + above:,}"

    return Texts(dict(zip(names, cells, strict=True)), mark, line)


def separator(head: str, name: str) -> str:
    """The separator that parts the header and most records below it into equally many cells.

    head: the start of the file, whole lines.  Raises Refusal where none parts them.
    """
    best, best_fit = "", 0.0
    for mark in SEPARATORS:
        try:
            widths = [len(row) for _, row in islice(_records(head, mark), PROBED)]
        except csv.Error:
            continue
        fit = _fit(widths)
        if fit > best_fit:
            best, best_fit = mark, fit
    if not best:
        raise one_column(name)
    return best


def one_column(name: str) -> Refusal:
    return Refusal(
        f"{quoted(name)} has one column only; no comma, semicolon, tab or upright bar parts its first line.",
        where="line 1",
        do="Bring a table with a column for each thing recorded, names of columns in the first line.",
    )


def checked_names(header: list[str], name: str) -> list[str]:
    """The names of the columns. Raises Refusal for a column without a name and for one that comes twice."""
    nameless = [place + 1 for place, column in enumerate(header) if not column]
    if nameless:
        raise Refusal(
            f"Column {nameless[0]} of {quoted(name)} has no name"
            + (f", nor do {len(nameless) - 1} more." if len(nameless) > 1 else "."),
            where="line 1",
            do="Give every column a name in the first line, or take that column out of the file.",
        )
    twice = [column for column, times in Counter(header).items() if times > 1]
    if twice:
        places = [str(place + 1) for place, column in enumerate(header) if column == twice[0]]
        raise Refusal(
            f"Two columns are called {quoted(twice[0])}: columns {' and '.join(places[:2])} of the first line.",
            where="line 1",
            do="Give each column a name of its own; spaces around a name do not count.",
        )
    if header and all(_is_number(column) for column in header):
        raise Refusal(
            f"The first line of {quoted(name)} holds numbers, not names of columns.",
            where="line 1",
            do="Put a line with the names of the columns on top.",
        )
    return header


def _head(content: bytes, cut: bool) -> str:
    """Whole lines of the start of a file."""
    end = max(content.rfind(b"\n"), content.rfind(b"\r")) + 1 if cut else 0
    return content[: end or len(content)].decode(errors="ignore")


def _records(text: str, mark: str) -> Iterator[tuple[int, list[str]]]:
    """The line on which each record begins, and its cells; blank lines are none."""
    reader = csv.reader(io.StringIO(text, newline=""), delimiter=mark)
    began = 1
    for row in reader:
        if not _is_blank(row):
            yield began, row
        began = reader.line_num + 1


def _is_blank(row: list[str]) -> bool:
    return not row or (len(row) == 1 and not row[0].strip())


def _fit(widths: list[int]) -> float:
    """How well a separator fits, from the number of cells of the first records: 0 not at all, 2 wholly."""
    if not widths or max(widths) < 2:
        return 0.0
    width, times = Counter(widths).most_common(1)[0]
    share = times / len(widths)
    if widths[0] < 2:
        return share / 2 if width > 1 else 0.0  # a title above the header: the refusal will show where
    return 1 + share if widths[0] == width else share


def _fast(body: bytes, mark: str, width: int) -> list[pa.Array] | None:
    """The columns, or None where something does not fit."""
    if not body.strip(b"\r\n"):
        return [pa.array([], pa.string())] * width
    names = [str(place) for place in range(width)]
    try:
        cells = arrow_csv.read_csv(
            pa.BufferReader(body),
            read_options=arrow_csv.ReadOptions(column_names=names, use_threads=False, block_size=2**26),
            parse_options=arrow_csv.ParseOptions(delimiter=mark, newlines_in_values=b'"' in body),
            convert_options=arrow_csv.ConvertOptions(
                column_types=dict.fromkeys(names, pa.string()),
                strings_can_be_null=False,
                quoted_strings_can_be_null=False,
            ),
        )
    except pa.ArrowInvalid:
        return None
    return [column.combine_chunks() for column in cells.columns]


def _slow(text: str, mark: str, names: list[str], name: str, above: int) -> list[pa.Array]:
    """The columns, record by record. Raises Refusal that says on which lines something does not fit."""
    rows: list[list[str]] = []
    misfits: list[tuple[int, int]] = []
    began = 1
    try:
        for began, row in _records(text, mark):
            rows.append(row)
            if len(row) != len(names):
                misfits.append((began + above, len(row)))
    except csv.Error as error:
        raise _unreadable(name, began + above + 1, error) from None
    if text.count('"') % 2 and _stays_open(text, began, mark):
        raise Refusal(
            f"{quoted(name)} opens a quotation mark in the record on line {began + above:,} and never closes it.",
            where=f"line {began + above:,}",
            do="Close the quotation mark, or double it where it belongs to the text.",
        )
    if misfits:
        raise _misfit(misfits, rows, mark, name)
    return [pa.array([row[place] for row in rows[1:]], pa.string()) for place in range(len(names))]


def _stays_open(text: str, began: int, mark: str) -> bool:
    """Whether the record that begins on this line, the last, would swallow a line added below it."""
    lines = io.StringIO(text, newline="")
    for _ in range(began - 1):
        lines.readline()
    return len(list(csv.reader(io.StringIO(lines.read() + "\nx", newline=""), delimiter=mark))) == 1


def _misfit(misfits: list[tuple[int, int]], rows: list[list[str]], mark: str, name: str) -> Refusal:
    width = len(rows[0])
    named = [f"line {line:,} has {cells} {'cell' if cells == 1 else 'cells'}" for line, cells in misfits[:LISTED]]
    left = len(misfits) - LISTED
    more = f" and {left:,} more {'line does' if left == 1 else 'lines do'} not fit" if left > 0 else ""
    fit = "does not fit" if len(misfits) == 1 else "do not fit"
    do = (
        f"Most often one of the {SEPARATORS.get(mark, 'separators')} stands inside a text without quotation marks. "
        "Correct these lines and bring the file again; nothing was stored."
    )
    if len(misfits) > len(rows) / 2:
        do = "See whether the first line holds the names of the columns, with no title above; nothing was stored."
    return Refusal(
        f"{quoted(name)} was not read: {len(misfits):,} of {len(rows):,} lines {fit} its own header, which names "
        f"{width} {'column' if width == 1 else 'columns'}: {', '.join(named)}{more}.",
        where=f"line {misfits[0][0]:,}",
        do=do,
    )


def _unreadable(name: str, line: int, error: csv.Error) -> Refusal:
    return Refusal(
        f"{quoted(name)} cannot be read from line {line:,} on: {error}.",
        where=f"line {line:,}",
        do="Correct that line.",
    )


def _is_number(text: str) -> bool:
    try:
        float(text.replace(",", "."))
    except ValueError:
        return False
    return True
