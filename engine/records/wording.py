"""How the records' own sentences write names, numbers and counts."""

from __future__ import annotations

from collections.abc import Sequence
from decimal import Decimal

from engine.refusal import quoted

SHOWN = 40  # characters of a value that a sentence repeats


def number_text(value: float) -> str:
    """A number as a level's name: the shortest text that reads back as the same number, without ".0"."""
    if value == 0:
        return "0"
    return f"{int(value)}" if value.is_integer() and abs(value) < 1e16 else repr(float(value))


def figure(value: float, commas: bool = True) -> str:
    """A number as people read it: every digit it has, a comma between thousands, a true minus sign."""
    if value == 0:
        return "0"
    if not 1e-6 <= abs(value) < 1e16:
        return repr(float(value)).replace("-", "−")
    exact = Decimal(repr(float(value)))
    exact = exact.quantize(Decimal(1)) if exact == exact.to_integral_value() else exact.normalize()
    return (f"{exact:,f}" if commas else f"{exact:f}").replace("-", "−")


def people(count: int, small: int) -> str:
    """A count of records; under the small-count limit only "under 10" is said."""
    return f"{count:,}" if count == 0 or count >= small else f"under {small}"


def per_cent(share: float) -> str:
    """A share, 0 to 1, in whole per cent; halves go up, the hair is for halves that binary numbers miss."""
    return f"{int(100 * share + 0.5 + 1e-9)}%"


def listing(names: Sequence[str], most: int | None = 4, joint: str = "and") -> str:
    """a, b and c; after `most` names "and 3 more". most: None for every name.  joint: the word before the last."""
    if most is not None and len(names) > most:
        return f"{', '.join(names[:most])} and {len(names) - most:,} more"
    return "".join(names) if len(names) < 2 else f"{', '.join(names[:-1])} {joint} {names[-1]}"


def cited(text: str) -> str:
    """A value between quotation marks, cut short when it is long."""
    return quoted(text if len(text) <= SHOWN else text[: SHOWN - 1] + "…")
