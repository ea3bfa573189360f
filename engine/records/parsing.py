"""Columns of text become numbers where every cell is one; marks for a missing value become blanks."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
import pandas as pd
import pyarrow as pa
import pyarrow.compute as pc

MISSING = ("NA", "N/A", "#N/A", "NaN", "nan", "NULL", "null", "#NULL!", "#DIV/0!", "#VALUE!", "#REF!")

_POINT = r"[+-]?(\d+(\.\d*)?|\.\d+)([eE][+-]?\d+)?"
_COMMA = r"[+-]?(\d{1,3}(\.\d{3})+(,\d+)?|\d+(,\d+)?)"
_GROUPED = r"[+-]?(\d{1,3}(,\d{3})+|\d+)(\.\d+)?"
_LEADING_ZERO = r"[+-]?0\d+([.,]\d+)?"


def typed(columns: Mapping[str, pa.Array | pd.Series], separator: str = "") -> tuple[pd.DataFrame, tuple[str, ...]]:
    """Texts as they are, numbers as float64, blanks as None or nan; and in sentences what was read into them.

    columns: texts as arrow arrays, null or "" where blank; other columns as they are.  separator: of the file, which
    tells a decimal comma from a comma between thousands.
    """
    said: list[str] = []
    made: dict[str, object] = {}
    for name, cells in columns.items():
        made[name] = _column(name, cells, separator, said) if isinstance(cells, pa.Array) else cells
    frame = pd.DataFrame(made, copy=False)
    empty = frame.isna().all(axis=1).to_numpy()
    if empty.any() and not empty.all():
        said.append(f"{int(empty.sum()):,} rows without a single value were left out.")
        frame = frame[~empty].reset_index(drop=True)
    return frame, tuple(said)


def _column(name: str, cells: pa.Array, separator: str, said: list[str]) -> np.ndarray:
    """float64 or object, from what the different texts of the column are."""
    encoded = pc.dictionary_encode(pc.utf8_trim_whitespace(cells))
    texts = encoded.dictionary
    codes = encoded.indices.fill_null(len(texts)).to_numpy(zero_copy_only=False)
    missing = pc.is_in(texts, pa.array(MISSING)).to_numpy(zero_copy_only=False)
    if missing.any():
        words = ", ".join(f"“{word}”" for word in MISSING if word in texts.filter(pa.array(missing)).to_pylist())
        said.append(
            f"{words} in {int(missing[codes[codes < len(texts)]].sum()):,} cells of “{name}” was read as blank."
        )
    blank = missing | pc.equal(texts, "").to_numpy(zero_copy_only=False)
    numbers = _numbers(name, texts.filter(pa.array(~blank)), separator, said)
    values = np.full(
        len(texts) + 1, None if numbers is None else np.nan, dtype=object if numbers is None else np.float64
    )
    values[:-1][~blank] = np.asarray(texts, dtype=object)[~blank] if numbers is None else numbers
    return np.asarray(values[codes])


def _numbers(name: str, texts: pa.Array, separator: str, said: list[str]) -> np.ndarray | None:
    """(texts,) float64 when every text is a number, else None."""
    if not len(texts):
        return None
    plain = pc.replace_substring(texts, "−", "-")
    per_cent = _all(plain, r"[^%]*%")
    if per_cent:
        plain = pc.utf8_trim_whitespace(pc.replace_substring(plain, "%", ""))
    if pc.any(pc.match_substring_regex(plain, f"^({_LEADING_ZERO})$")).as_py():
        return None
    if _all(plain, _POINT):
        pass
    elif _all(plain, _GROUPED) and not (separator == ";" and not pc.any(pc.match_substring(plain, ".")).as_py()):
        plain = pc.replace_substring(plain, ",", "")
        said.append(f"The commas in “{name}” were read as marks between thousands.")
    elif _all(plain, _COMMA):
        plain = pc.replace_substring(pc.replace_substring(plain, ".", ""), ",", ".")
        said.append(f"The commas in “{name}” were read as decimal points.")
    else:
        return None
    if per_cent:
        said.append(f"“{name}” was read as a number of per cent.")
    return np.asarray(pc.cast(pc.replace_substring_regex(plain, r"^\+", ""), pa.float64()))


def _all(texts: pa.Array, pattern: str) -> bool:
    return bool(pc.all(pc.match_substring_regex(texts, f"^({pattern})$")).as_py())
