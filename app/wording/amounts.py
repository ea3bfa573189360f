"""Counts, shares and lists in words, as every page writes them."""

from __future__ import annotations

from collections.abc import Sequence

WORDS = ("no", "one", "two", "three", "four", "five", "six", "seven", "eight", "nine", "ten")


def count(number: int) -> str:
    """1847 as 1,847."""
    return f"{number:,}"


def small_word(number: int) -> str:
    """Up to ten in words, above in figures."""
    return WORDS[number] if 0 <= number < len(WORDS) else count(number)


def people(number: int, small: int) -> str:
    """A count of records; under the small-count limit only "under 10" is said."""
    return count(number) if number == 0 or number >= small else f"under {small}"


def plural(number: int, word: str, words: str | None = None) -> str:
    """The word that goes with the number, without the number."""
    return word if number == 1 else (words or f"{word}s")


def share(part: float) -> str:
    """A share, 0 to 1, in whole per cent; what is not quite none or all is said so."""
    if part <= 0:
        return "0%"
    if part >= 1:
        return "100%"
    if part < 0.01:
        return "under 1%"
    return "over 99%" if part > 0.99 else f"{100 * part:.0f}%"


def listing(names: Sequence[str], most: int | None = None) -> str:
    """a, b and c; after `most` names "and 3 more"."""
    if most is not None and len(names) > most:
        return f"{', '.join(names[:most])} and {len(names) - most} more"
    if len(names) < 2:
        return "".join(names)
    return f"{', '.join(names[:-1])} and {names[-1]}"


def number(value: float) -> str:
    """A value of a column, without more digits than are of use."""
    whole = f"{value:,.0f}" if abs(value) >= 1000 or value == int(value) else f"{value:.4g}"
    return whole.replace("-", "−")
