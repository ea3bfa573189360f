"""Numbers as people type them into a form, and as an address writes them."""

from __future__ import annotations

import math
import re

from engine.records.wording import number_text
from engine.refusal import Refusal

LARGEST = 1e15  # beyond this, numbers next to each other can no longer be told apart to a tenth
GROUPED = re.compile(r"[+-]?\d{1,3}(,\d{3})+(\.\d*)?")  # 1,200 as the pages write it; any other comma is a decimal one


def number(typed: str, column: str) -> float:
    """A value of `column`. Raises Refusal for what is no number."""
    found = _read(typed)
    if not typed.strip():
        raise Refusal(f"No number was given for {column}.", where=column, do="Give a number, such as 12 or 12.5.")
    if not abs(found) <= LARGEST:
        raise Refusal(
            f"“{typed.strip()}” is no number that {column} could be.",
            where=column,
            do="Give a number, such as 12 or 12.5.",
        )
    return found + 0.0  # no minus zero


def share(typed: str, column: str) -> float:
    """A reach, 0 to 1, typed in per cent; kept to 6 decimals. Raises Refusal for what is no share."""
    found = _read(typed.strip().removesuffix("%"))
    if not 0.0 <= found <= 100.0:
        raise Refusal(
            f"“{typed.strip()}” is no share of people for whom {column} could be set.",
            where=column,
            do="Give a number from 0 to 100.",
        )
    return round(found / 100.0, 6)


def written(value: float) -> str:
    """A number for an address: it reads back as the same number, and holds no sign that an address would change."""
    return number_text(value).replace("e+", "e")


def per_cent(share: float) -> str:
    """A share as a number of per cent, without a sign: 80, 12.5."""
    return f"{100 * share:.4f}".rstrip("0").rstrip(".")


def _read(typed: str) -> float:
    """nan for what is no number."""
    text = typed.strip().replace("\u2212", "-")
    text = text.replace(",", "") if GROUPED.fullmatch(text) else text.replace(",", ".")
    try:
        return float(text) if "_" not in text else math.nan
    except ValueError:
        return math.nan
