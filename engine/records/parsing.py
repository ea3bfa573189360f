"""Columns of text become numbers where every cell spells one; marks of a missing value become blanks."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from enum import Enum

import numpy as np
import pandas as pd
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from engine.records.wording import cited
from engine.refusal import quoted

MISSING = (
    "NA",
    "N/A",
    "#N/A",
    "NaN",
    "nan",
    "NULL",
    "null",
    "#NULL!",
    "#DIV/0!",
    "#VALUE!",
    "#REF!",
    "#NUM!",
    "#NAME?",
)
MOSTLY = 0.5  # share of numbers from which on a column of text is probably meant to be one

_PLAIN = r"[+-]?(\d+(\.\d*)?|\.\d+)([eE][+-]?\d+)?"
_COMMA = r"[+-]?(\d{1,3}(\.\d{3})+(,\d+)?|\d+(,\d+)?)"  # 1.234,5
_GROUPED = r"[+-]?(\d{1,3}(,\d{3})+|\d+)(\.\d+)?"  # 1,234.5
_SURELY_COMMA = r"[+-]?(\d{1,3}(\.\d{3})+,\d+|\d+,(\d{1,2}|\d{4,})|0,\d+|\d{4,},\d+)"
_SURELY_POINT = r"[+-]?(\d*\.(\d{1,2}|\d{4,})|0\.\d+|\d{4,}\.\d+)"
_DOTTED = r"[+-]?([1-9]\d{0,2}(\.\d{3})+|\d{1,3})"  # 1.234, in a file with decimal commas
_LEADING_ZERO = r"[+-]?0\d+([.,]\d+)?"
_LONG = r"[+-]?\d{16,}"  # more digits than a number can hold


_NOTHING = pa.array([""], pa.string())


class Style(Enum):
    """How a column writes its numbers."""

    PLAIN = "plain"
    COMMA = "decimal comma"
    GROUPED = "commas between thousands"
    UNSURE = "a comma that may be either"


@dataclass(frozen=True)
class _Read:
    """A column of text on the way to numbers. texts: its different cells.  codes: (rows,) into them.

    blank: (texts,) no value.  spelt: the others as numbers are written, None when they are not numbers.
    """

    name: str
    texts: pa.Array
    codes: NDArray[np.int32]
    blank: NDArray[np.bool_]
    spelt: pa.Array | None = None
    style: Style | None = None
    per_cent: bool = False
    said: tuple[str, ...] = ()


def typed(
    columns: Mapping[str, pa.Array | pd.Series], line: Callable[[int], str], separator: str = ""
) -> tuple[pd.DataFrame, tuple[str, ...]]:
    """Texts as they are, numbers as float64, blanks as None or nan; and in sentences what was read into them.

    columns: texts as arrow arrays, null or "" where blank; other columns as they are.  line: where a row stands.
    separator: of the file; a semicolon speaks for a decimal comma.
    A column is a number only if every cell that is not blank spells one, without leading zeros and without more digits
    than a number holds.
    """
    read = {name: _read(name, cells) for name, cells in columns.items() if isinstance(cells, pa.Array)}
    surely = any(_surely_comma(each) for each in read.values())
    commas = surely or (separator == ";" and not any(_surely_point(each) for each in read.values()))
    made: dict[str, object] = {}
    said: list[str] = []
    for name, cells in columns.items():
        if name in read:
            made[name], sentences = _column(read[name], commas, surely, line)
            said += sentences
        else:
            made[name] = cells
    frame = pd.DataFrame(made, copy=False)
    empty = frame.isna().all(axis=1).to_numpy()
    if empty.any() and not empty.all():
        count = int(empty.sum())
        rows = f"{count:,} rows without a single value were" if count > 1 else "1 row without a single value was"
        said.append(f"{rows} left out.")
        frame = frame[~empty].reset_index(drop=True)
    return frame, tuple(said)


def _read(name: str, cells: pa.Array) -> _Read:
    encoded = pc.dictionary_encode(pc.utf8_trim_whitespace(cells))
    texts = encoded.dictionary
    codes = encoded.indices.fill_null(len(texts)).to_numpy(zero_copy_only=False)
    missing = _which(pc.is_in(texts, pa.array(MISSING)))
    read = _Read(name, texts, codes, missing | _which(pc.equal(texts, "")))
    if missing.any():
        words = ", ".join(cited(word) for word in texts.filter(pa.array(missing)).to_pylist())
        count = int(np.append(missing, False)[codes].sum())
        cells_said = f"{count:,} cells" if count > 1 else "1 cell"
        read = replace(read, said=(f"{words} in {cells_said} of {quoted(name)} was read as blank.",))
    return _spelt(read)


def _spelt(read: _Read) -> _Read:
    """The column with its numbers as they are written and in which style, where they are numbers."""
    texts = read.texts.filter(pa.array(~read.blank))
    if not len(texts):
        return read
    plain = pc.replace_substring(texts, "−", "-")
    per_cent = _all(plain, r"[^%]*%")
    if per_cent:
        plain = pc.utf8_trim_whitespace(pc.replace_substring(plain, "%", ""))
    style = _style(plain)
    if style is None:
        return read
    for pattern, why in ((_LEADING_ZERO, "zeros in front"), (_LONG, "more digits than a number holds")):
        if _any(plain, pattern):
            example = plain.filter(pc.match_substring_regex(plain, f"^({pattern})$"))[0].as_py()
            sentence = f"{quoted(read.name)} is kept as text, because it has {why}, such as {cited(example)}."
            return replace(read, said=(*read.said, sentence))
    return replace(read, spelt=plain, style=style, per_cent=per_cent)


def _style(plain: pa.Array) -> Style | None:
    if _all(plain, _PLAIN):
        return Style.PLAIN
    grouped, comma = _all(plain, _GROUPED), _all(plain, _COMMA)
    if grouped and comma:  # every comma stands before three digits
        return Style.COMMA if _any(plain, _SURELY_COMMA) else Style.UNSURE
    return Style.GROUPED if grouped else Style.COMMA if comma else None


def _surely_comma(read: _Read) -> bool:
    return read.style is Style.COMMA and _any(read.spelt, _SURELY_COMMA)


def _surely_point(read: _Read) -> bool:
    return read.style is Style.PLAIN and _any(read.spelt, _SURELY_POINT)


def _column(
    read: _Read, commas: bool, surely: bool, line: Callable[[int], str]
) -> tuple[NDArray[np.float64] | pd.Series, tuple[str, ...]]:
    """Numbers or texts, blank where there is no value, and what was read into them.

    commas: the file writes decimal commas, as far as is known.  surely: a column leaves no doubt of it.
    """
    numbers, said = _numbers(read, commas, surely)
    if numbers is None:
        texts = pc.if_else(pa.array(np.append(read.blank, True)), None, pa.concat_arrays([read.texts, _NOTHING]))
        return texts.take(pa.array(read.codes)).to_pandas(), (*said, *_odd_one_out(read, line))
    values = np.full(len(read.texts) + 1, np.nan)
    values[:-1][~read.blank] = numbers
    return np.asarray(values[read.codes]), said


def _numbers(read: _Read, commas: bool, surely: bool) -> tuple[NDArray[np.float64] | None, tuple[str, ...]]:
    """(texts not blank,) float64 when they are numbers, else None; and the sentences."""
    if read.spelt is None:
        return None, read.said
    name, plain, said = read.name, read.spelt, list(read.said)
    style = read.style
    if style is Style.UNSURE:
        style = Style.COMMA if commas else Style.GROUPED
    if style is Style.PLAIN and surely and _any(plain, r"[^.]+\.[^.]+") and _all(plain, _DOTTED):
        plain = pc.replace_substring(plain, ".", "")
        said.append(
            f"The points in {quoted(name)} were read as marks between thousands, as the file has decimal commas."
        )
    elif style is Style.GROUPED:
        plain = pc.replace_substring(plain, ",", "")
        said.append(f"The commas in {quoted(name)} were read as marks between thousands.")
    elif style is Style.COMMA:
        plain = pc.replace_substring(pc.replace_substring(plain, ".", ""), ",", ".")
        said.append(f"The commas in {quoted(name)} were read as decimal points.")
    values = np.asarray(pc.cast(pc.replace_substring_regex(plain, r"^\+", ""), pa.float64()))
    if not np.isfinite(values).all():
        worst = cited(read.texts.filter(pa.array(~read.blank))[int(np.isinf(values).argmax())].as_py())
        return None, (*read.said, f"{quoted(name)} is kept as text, because {worst} is too large for a number.")
    if read.per_cent:
        said.append(f"{quoted(name)} was read as a number of per cent.")
    return values + 0.0, tuple(said)


def _odd_one_out(read: _Read, line: Callable[[int], str]) -> tuple[str, ...]:
    """Where a column that is mostly numbers first holds none."""
    if read.spelt is not None or not len(read.texts):
        return ()
    patterns = f"^({_PLAIN}|{_COMMA}|{_GROUPED})$"
    number = _which(pc.match_substring_regex(read.texts, patterns)) & ~read.blank
    odd = ~number & ~read.blank
    rows, odd_rows = (int(np.append(which, False)[read.codes].sum()) for which in (number, odd))
    if not odd.any() or rows <= MOSTLY * (rows + odd_rows) or number.sum() < 3:
        return ()
    row = int(np.append(odd, False)[read.codes].argmax())
    value = cited(read.texts[int(read.codes[row])].as_py())
    return (f"{quoted(read.name)} is mostly numbers, but {line(row)} holds {value}, so it was read as text.",)


def _which(found: pa.Array) -> NDArray[np.bool_]:
    return np.asarray(found.to_numpy(zero_copy_only=False), dtype=np.bool_)


def _all(texts: pa.Array, pattern: str) -> bool:
    return bool(pc.all(pc.match_substring_regex(texts, f"^({pattern})$")).as_py())


def _any(texts: pa.Array, pattern: str) -> bool:
    return bool(pc.any(pc.match_substring_regex(texts, f"^({pattern})$")).as_py())
