"""Counts and lists in words, as every page writes them."""

from __future__ import annotations

from collections.abc import Sequence

from engine.records import wording as in_words
from engine.records.wording import people as people  # pages write counts as the records' own sentences do

WORDS = ("no", "one", "two", "three", "four", "five", "six", "seven", "eight", "nine", "ten")


def count(number: int) -> str:
    """1847 as 1,847."""
    return f"{number:,}"


def small_word(number: int) -> str:
    """Up to ten in words, above in figures."""
    return WORDS[number] if 0 <= number < len(WORDS) else count(number)


def plural(number: int, word: str, words: str | None = None) -> str:
    """The word that goes with the number, without the number."""
    return word if number == 1 else (words or f"{word}s")


def listing(names: Sequence[str], most: int | None = None) -> str:
    """a, b and c; after `most` names "and 3 more"."""
    return in_words.listing(names, most)


def number(value: float) -> str:
    """A value of a column, without more digits than are of use."""
    whole = f"{value:,.0f}" if abs(value) >= 1000 or value == int(value) else f"{value:.4g}"
    return whole.replace("-", "−")
