"""Levels that have an order: words of degree, ranges, counted words, numbered levels."""

from __future__ import annotations

import math
import re
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

# Each ladder is low to high; words on one rung mean the same. Words are compared in lower case, with single spaces.
LADDERS: tuple[tuple[str, ...], ...] = (
    (
        "never|not at all",
        "almost never|hardly ever|very rarely|very seldom",
        "rarely|seldom",
        "occasionally|now and then",
        "sometimes",
        "often|frequently|regularly",
        "very often|mostly|usually|most of the time",
        "almost always|nearly always",
        "always|all the time",
    ),
    ("never", "less often", "yearly", "monthly", "weekly", "daily", "hourly"),
    (
        "none|nothing|not any",
        "hardly any|very little|very few",
        "little|a little|few|a few|less",
        "some|several|half",
        "much|many|a lot|lots|plenty|more",
        "most|nearly all|almost all",
        "all|everything",
    ),
    (
        "none",
        "lowest",
        "very low",
        "low",
        "fairly low|rather low|lower middle|medium low",
        "medium|middle|moderate|mid|average|normal",
        "fairly high|rather high|upper middle|medium high",
        "high",
        "very high",
        "highest",
    ),
    (
        "strongly disagree|disagree strongly|fully disagree|completely disagree|totally disagree",
        "disagree|mostly disagree",
        "slightly disagree|somewhat disagree|rather disagree|tend to disagree",
        "neither agree nor disagree|neither|neutral|undecided",
        "slightly agree|somewhat agree|rather agree|tend to agree",
        "agree|mostly agree",
        "strongly agree|agree strongly|fully agree|completely agree|totally agree",
    ),
    (
        "very poor|very bad|terrible",
        "poor|bad|inadequate",
        "fair|sufficient|needs improvement",
        "average|satisfactory|adequate|ok|acceptable",
        "good",
        "very good",
        "excellent|outstanding",
    ),
    (
        "very dissatisfied|very unsatisfied",
        "dissatisfied|unsatisfied",
        "somewhat dissatisfied",
        "neither satisfied nor dissatisfied|neither|neutral",
        "somewhat satisfied",
        "satisfied",
        "very satisfied",
    ),
    ("much worse", "worse", "about the same|same|unchanged|no change", "better", "much better"),
    (
        "very unlikely",
        "unlikely",
        "neither|about even",
        "likely",
        "very likely",
        "certain",
    ),
    (
        "not at all",
        "slightly|a little|a bit",
        "somewhat|moderately",
        "quite a bit|very much|very",
        "extremely|completely",
    ),
    ("not important", "slightly important", "somewhat important", "important", "very important"),
    ("very easy", "easy", "medium|moderate", "hard|difficult", "very hard|very difficult"),
    (
        "none|absent",
        "minimal|very mild",
        "mild|minor|light",
        "moderate|medium",
        "severe|serious|major|heavy",
        "critical",
    ),
    ("xxs", "xs|tiny|very small", "s|small", "m|medium", "l|large|big", "xl|very large|very big", "xxl|huge"),
    ("very short", "short", "medium", "long", "very long"),
    ("very young", "young|younger", "middle|middle aged|middle-aged", "old|older", "very old|oldest"),
    ("infant|baby", "child", "adolescent|teenager|youth", "adult", "senior|elderly"),
    (
        "none|no schooling|no education",
        "some primary|incomplete primary",
        "primary|elementary",
        "lower secondary|lower|middle school",
        "secondary",
        "upper secondary|upper|high school",
        "further|vocational|some college",
        "college|tertiary|higher",
        "bachelor|bachelor's|undergraduate|bachelors",
        "master|master's|postgraduate|masters",
        "doctorate|phd|doctoral",
    ),
    ("beginner|novice", "elementary", "intermediate", "upper intermediate", "advanced", "expert|proficient|fluent"),
    ("a1", "a2", "b1", "b2", "c1", "c2"),
    ("early", "mid|middle", "late"),
    ("first", "second", "third", "fourth", "fifth", "sixth", "seventh", "eighth", "ninth", "tenth"),
    ("rural", "semi-urban|suburban|peri-urban", "urban"),
)
_RUNGS = tuple(
    {word: float(rung) for rung, same in enumerate(ladder) for word in same.split("|")} for ladder in LADDERS
)
OUTSIDE = frozenset(
    [
        "don't know",
        "don’t know",
        "do not know",
        "unknown",
        "not known",
        "not sure",
        "unsure",
        "other",
        "refused",
        "declined",
        "no answer",
        "no response",
        "prefer not to say",
        "rather not say",
        "not applicable",
        "not stated",
        "not recorded",
        "missing",
        "n/a",
        "na",
        "n.a.",
        "dk",
    ]
)

NUMBER_WORDS = (
    *("zero", "one", "two", "three", "four", "five", "six", "seven", "eight", "nine", "ten", "eleven", "twelve"),
)
NUMBERED_THINGS = "level|year|grade|stage|step|phase|tier|band|wave|quintile|quartile|decile|week|month|day"

_LOW, _HIGH = (
    rf"[£$€]?\s*(?P<{end}>[-−]?\d+(?:[.,]\d+)*)(?:(?P<{end}k>[km])(?![a-z]))?(?:\s*(?:%|[a-z]+\.?))?"  # 10k, 5 kg
    for end in ("low", "high")
)
_BETWEEN = r"\s*(?:-|–|—|to under|to less than|to below|to|or|and under|up to under)\s*"
_UNDER = r"(?:under|below|less than|fewer than|up to|at most|younger than|<=?|≤|-)"
_OVER = r"(?:over|above|more than|at least|older than|from|>=?|≥)"
_RANGES = tuple(
    re.compile(pattern)
    for pattern in (
        rf"{_LOW}{_BETWEEN}{_HIGH}",
        rf"{_UNDER}\s*{_HIGH}",
        rf"{_HIGH}\s*(?:and|or|&) (?:under|less|fewer|below|younger|lower)",
        rf"{_LOW}\s*(?:\+|(?:and|or|&) (?:over|more|above|older|up|higher)|plus)(?: [a-z]+)?",
        rf"{_OVER}\s*{_LOW}",
    )
)
_COUNTED = re.compile(r"(?P<low>\d+)(?:\s+[a-z]+)?")
_NONE = re.compile(r"(?:none|no|zero|nil)(?:\s+[a-z]+)?")
_NUMBERED = re.compile(
    rf"(?:(?:{NUMBERED_THINGS})\s*(?P<thing>\d+)|(?P<first>\d+)\s*(?:[.):=]|\s[-–—]|[-–—]\s)\s*\D.*)"
)


@dataclass(frozen=True)
class Grading:
    """An order of levels.

    order: positions, low to high.  why: how it was found.  outside: positions without a place in it.
    """

    order: tuple[int, ...]
    why: str
    outside: tuple[int, ...] = ()


def grading(levels: Sequence[str]) -> Grading | None:
    """The order of `levels` when their names tell it, else None. With `outside` it is no order of all of them."""
    words = [_plain(level) for level in levels]
    outside = tuple(place for place, word in enumerate(words) if word in OUTSIDE)
    inside = [place for place in range(len(words)) if place not in outside]
    if len(inside) < 2:
        return None
    for find, why in (
        (_ranges, "Its levels are ranges or counts."),
        (_numbered, "Its levels are numbered."),
        (_ladder, "Its levels are words of degree."),
    ):
        keys = find([words[place] for place in inside])
        if keys is not None and len(set(keys)) == len(keys):
            order = sorted(range(len(inside)), key=keys.__getitem__)
            return Grading(tuple(inside[place] for place in order), why, outside)
    return None


def natural(text: str) -> tuple[tuple[tuple[int, int, str], ...], str]:
    """A key that sorts texts as people do: 2 before 10, capitals beside small letters."""
    parts = re.split(r"(\d+)", text.casefold())
    key = tuple((0, int(part), "") if part.isdecimal() and part.isascii() else (1, 0, part) for part in parts if part)
    return key, text


def _plain(level: str) -> str:
    words = " ".join(level.casefold().replace("_", " ").split())
    return words.strip(" .")


def _ladder(words: list[str]) -> list[float] | None:
    found: list[list[float]] = []
    for rungs in _RUNGS:
        if all(word in rungs for word in words):
            found.append([rungs[word] for word in words])
    if len(words) < 3 and any(len(word) == 1 for word in words):
        return None  # m and s may be sizes, or anything
    distinct = [keys for keys in found if len(set(keys)) == len(keys)]
    return distinct[0] if distinct else None


def _ranges(words: list[str]) -> list[tuple[float, float]] | None:
    counted = [_counted_word(word) for word in words]
    keys: list[tuple[float, float]] = []
    real = 0  # levels that are ranges or have an open end; counts alone are names of things as often as not
    for word in counted:
        found = _range(word)
        if found is None:
            return None
        keys.append(found[0])
        real += found[1]
    if not real:
        return None
    rising = sorted(keys)
    if any(high > next_low + abs(next_low) * 1e-9 for (_, high), (next_low, _) in pairwise(rising)):
        return None  # they overlap: no order of the people in them
    return keys


def _range(word: str) -> tuple[tuple[float, float], bool] | None:
    for pattern in _RANGES:
        if match := pattern.fullmatch(word):
            parts = match.groupdict()
            low = _value(parts["low"], parts.get("lowk") or parts.get("highk")) if parts.get("low") else -math.inf
            high = _value(parts["high"], parts.get("highk")) if parts.get("high") else math.inf
            return ((low, high), True) if low <= high else None
    if match := _COUNTED.fullmatch(word):
        value = float(match["low"])
        return (value, value), False
    if _NONE.fullmatch(word):
        return (0.0, 0.0), False
    return None


def _value(text: str, factor: str | None) -> float:
    plain = text.replace("−", "-")
    if re.fullmatch(r"-?\d{1,3}(,\d{3})+(\.\d+)?", plain):
        plain = plain.replace(",", "")
    plain = plain.replace(",", ".")
    try:
        value = float(plain)
    except ValueError:  # 1.234.567
        value = float(plain.replace(".", ""))
    return value * {"k": 1e3, "m": 1e6}.get(factor or "", 1.0)


def _counted_word(word: str) -> str:
    return re.sub(rf"\b({'|'.join(NUMBER_WORDS)})\b", lambda found: str(NUMBER_WORDS.index(found[0])), word)


def _numbered(words: list[str]) -> list[int] | None:
    keys = []
    for word in words:
        match = _NUMBERED.fullmatch(word)
        if match is None:
            return None
        keys.append(int(match["thing"] or match["first"]))
    return keys
