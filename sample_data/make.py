"""Makes the invented study in this folder: its records, its codebook, its order, and the effects that are really there.

    python sample_data/make.py [folder]

Nobody in it exists. The records are drawn from the small network below, so what setting a column would do is known:
it is summed over every combination of levels and written to truth.json, beside the records it explains.
"""

from __future__ import annotations

import json
import sys
from collections.abc import Mapping
from dataclasses import dataclass, field
from itertools import pairwise
from pathlib import Path

import numpy as np

ROWS = 4000
SEED = 1869  # a draw that lies close to the network; others stray further
NAME = "Lantern Street evening school"
ABOUT = "4,000 invented learners of an evening school: who had a mentor, who passed, and what a mentor would do."


@dataclass(frozen=True)
class Node:
    """A column of the generating network.

    name, stage, meaning: for the codebook.  levels: low to high.
    shares: of the levels where no parent pulls.  pulls: parent -> its level -> what that adds to the log odds of a
    higher level (proportional odds: McCullagh 1980); a level that is not named adds nothing.
    grade: whether the levels are in order.  unit, cuts, shape: for a number, which acts through its bands; `shape`
    weighs the whole numbers from 0 up, inside each band.  blank: the share whose cell is left empty, at random.
    """

    name: str
    stage: str
    meaning: str
    levels: tuple[str, ...]
    shares: tuple[float, ...]
    pulls: Mapping[str, Mapping[str, float]] = field(default_factory=dict)
    grade: bool = False
    unit: str = ""
    cuts: tuple[int, ...] = ()
    shape: np.ndarray | None = None
    blank: float = 0.0


PEOPLE = "Who they are and how they live"
OFFER = "What the school offers"
YEAR = "During the year"
AFTER = "Afterwards"
CHANGEABLE = ("mentor", "study group", "fee waived")
OUTCOMES = ("passed", "in work after a year")
RULE_OUT = tuple(
    (other, given)  # of the same stage, but nothing in it leads to anybody's age or first language
    for given in ("age band", "first language")
    for other in ("age band", "first language", "prior schooling", "children at home", "shift work", "travel time")
    if other != given
)
INSIST = (("passed", "in work after a year"),)
BY = "shift work"  # truths are given for all and at each of its levels
NO_YES = ("no", "yes")
TRY = (
    {"pins": {"shift work": ["nights"]}, "levers": {"mentor": "yes"}},
    {"pins": {"prior schooling": ["primary"]}, "levers": {"mentor": "yes"}},
    {"pins": {"shift work": ["nights"]}, "levers": {"study group": "yes"}},
)

ABOUT_THE_RECORDS = """
Invented records of 4,000 learners in one year of an evening school that does not exist. They were drawn from the small
network in `make.py`, which also makes every file in this folder. Nothing in them describes a real person or place.

One row is one learner.
"""
ABOUT_THE_COLUMNS = """
A number acts only through its bands; inside a band the figure is drawn smoothly and has no further meaning. Blanks were
made by losing cells at random, whatever the learner was like.

The draw was picked from several because it lies close to the network, so that what is learned from it can be compared
with the truth; another draw of 4,000 would stray further.

The school can set *mentor*, *study group* and *fee waived*. The outcomes are *passed* and *in work after a year*; in
both *yes* is better. *passed* comes before *in work after a year*.
"""
ABOUT_THE_FINDINGS = """
- Mentors go first to learners with less schooling and to those on nights, who pass less often anyway.
- Nights are where these records are thin. Study groups meet late, when nights begin, so fewer than ten learners on
  nights were ever in one; and of those on nights with upper schooling fewer than ten had a mentor.
- Learners in a study group had more schooling, so the recorded difference overstates what a group does.
- Waiving the fee does little to passing: about one point.

`truth.json` has these shares for every changeable column, both outcomes and every shift, free of sampling error.
"""
ABOUT_THE_TRUTH = (
    "Shares of the outcome at this level, summed over the generating network and not counted in the records. recorded: "
    "of the group. had: of those in the group who had the column at that level. set: of the group, if the column were "
    "set to that level."
)

MINUTES = np.arange(121.0)
PER_CENT = np.arange(101.0)

NETWORK = (
    Node(
        "age band", PEOPLE, "Age at the first evening, in years.",
        ("18 to 24", "25 to 34", "35 to 49", "50 and over"), (0.22, 0.33, 0.31, 0.14), grade=True,
    ),
    Node(
        "first language", PEOPLE, "Whether the school teaches in the language the learner grew up with.",
        ("same as taught", "another"), (0.64, 0.36),
    ),
    Node(
        "prior schooling", PEOPLE, "The highest school finished before.",
        ("primary", "lower", "upper"), (0.22, 0.36, 0.42),
        {"age band": {"25 to 34": -0.2, "35 to 49": -0.5, "50 and over": -1.3}, "first language": {"another": -0.9}},
        grade=True, blank=0.02,
    ),
    Node(
        "children at home", PEOPLE, "Children under 15 in the household.",
        ("none", "one or two", "three or more"), (0.78, 0.18, 0.04),
        {"age band": {"25 to 34": 1.5, "35 to 49": 1.9, "50 and over": -0.4}}, grade=True,
    ),
    Node(
        "shift work", PEOPLE, "When the learner works; those without work count as days.",
        ("days", "mixed", "nights"), (0.63, 0.22, 0.15),
        {"prior schooling": {"primary": 0.7, "upper": -0.5}, "first language": {"another": 0.6}},
    ),
    Node(
        "travel time", PEOPLE, "From work or home to the school.",
        ("under 20", "20 to under 45", "45 and over"), (0.36, 0.46, 0.18),
        {"shift work": {"mixed": 0.4, "nights": 1.0}},
        unit="minutes", cuts=(20, 45), shape=MINUTES**1.4 * np.exp(-MINUTES / 14.0) * (MINUTES > 2),
    ),
    Node(
        "mentor", OFFER, "Was given a mentor, an hour a week. Mentors go first to those thought to need one.",
        NO_YES, (0.84, 0.16),
        {"prior schooling": {"primary": 1.9, "upper": -1.6}, "shift work": {"mixed": 0.5, "nights": 1.0}},
    ),
    Node(
        "study group", OFFER, "Joined a study group. Groups meet late in the evening, when nights begin.",
        NO_YES, (0.64, 0.36),
        {"shift work": {"mixed": -0.6, "nights": -4.2}, "prior schooling": {"primary": -0.9, "upper": 0.8}},
    ),
    Node(
        "fee waived", OFFER, "Pays no fee.",
        NO_YES, (0.82, 0.18),
        {"children at home": {"one or two": 0.8, "three or more": 1.8}, "first language": {"another": 0.7}},
    ),
    Node(
        "missed first month", YEAR, "Came to no evening in the first month.",
        NO_YES, (0.80, 0.20),
        {"travel time": {"20 to under 45": 0.4, "45 and over": 1.1}, "fee waived": {"yes": -1.5}},
    ),
    Node(
        "attendance", YEAR, "Evenings attended, of those held after the learner enrolled.",
        ("under 60", "60 to under 80", "80 and over"), (0.22, 0.40, 0.38),
        {
            "mentor": {"yes": 1.3}, "shift work": {"mixed": -0.8, "nights": -1.8},
            "missed first month": {"yes": -1.6},
        },
        unit="% of evenings", cuts=(60, 80), shape=PER_CENT**2.0 * (100.5 - PER_CENT) ** 0.6, blank=0.04,
    ),
    Node(
        "homework handed in", YEAR, "How much of the homework set was handed in.",
        ("under half", "half or more"), (0.64, 0.36),
        {"mentor": {"yes": 1.5}, "study group": {"yes": 1.3}, "first language": {"another": -0.7}}, grade=True,
    ),
    Node(
        "passed", AFTER, "Passed the examination at the end of the year.",
        NO_YES, (0.93, 0.07),
        {
            "prior schooling": {"lower": 1.7, "upper": 3.4}, "attendance": {"60 to under 80": 1.0, "80 and over": 2.0},
            "homework handed in": {"half or more": 1.6},
        },
    ),
    Node(
        "in work after a year", AFTER, "In paid work twelve months after the examination.",
        NO_YES, (0.46, 0.54),
        {"passed": {"yes": 1.1}, "age band": {"35 to 49": -0.4, "50 and over": -1.4}},
    ),
)  # fmt: skip
AT = {node.name: axis for axis, node in enumerate(NETWORK)}


def table(node: Node) -> np.ndarray:
    """Shares of the node's levels: one axis per parent, in the order of its pulls, own levels last."""
    odds = np.zeros(())
    for parent, pull in node.pulls.items():
        odds = odds[..., None] + [pull.get(level, 0.0) for level in NETWORK[AT[parent]].levels]
    above = 1.0 - np.cumsum(node.shares)[:-1]  # the share above each level but the last
    higher = 1.0 / (1.0 + (1.0 / above - 1.0) * np.exp(-odds[..., None]))
    edge = np.ones((*odds.shape, 1))
    return -np.diff(np.concatenate([edge, higher, 0.0 * edge], axis=-1))


# The truth, by enumeration


def joint(setting: Mapping[str, str] | None = None) -> np.ndarray:
    """The share of every combination of levels, one axis a column; `setting` fixes columns from outside."""
    shares = np.ones(())
    for axis, node in enumerate(NETWORK):
        if setting and node.name in setting:
            own = np.array([float(level == setting[node.name]) for level in node.levels])
        else:
            axes = [*(AT[parent] for parent in node.pulls), axis]
            sizes = [len(each.levels) if AT[each.name] in axes else 1 for each in NETWORK[: axis + 1]]
            own = table(node).transpose(np.argsort(axes)).reshape(sizes)
        shares = shares[..., None] * own
    return shares


def share(shares: np.ndarray, column: str, level: str, given: Mapping[str, str]) -> float:
    """The share with `column` at `level` among those with all of `given`."""
    among = [slice(None)] * len(NETWORK)
    for name, seen in given.items():
        position = NETWORK[AT[name]].levels.index(seen)
        among[AT[name]] = slice(position, position + 1)
    kept = shares[tuple(among)]
    return float(kept.take(NETWORK[AT[column]].levels.index(level), AT[column]).sum() / kept.sum())


def truth() -> list[dict[str, object]]:
    """For every changeable column, outcome and group: shares as recorded, among those who had it, and if set."""
    recorded = joint()
    groups: list[dict[str, str]] = [{}, *({BY: level} for level in NETWORK[AT[BY]].levels)]
    found: list[dict[str, object]] = []
    for column in CHANGEABLE:
        worlds = {level: joint({column: level}) for level in NO_YES}
        for outcome in OUTCOMES:
            for group in groups:
                entry: dict[str, object] = {"column": column, "outcome": outcome, "level": "yes", "among": group}
                entry["recorded"] = round(share(recorded, outcome, "yes", group), 6)
                entry["had"] = {
                    level: round(share(recorded, outcome, "yes", {**group, column: level}), 6) for level in NO_YES
                }
                entry["set"] = {level: round(share(worlds[level], outcome, "yes", group), 6) for level in NO_YES}
                found.append(entry)
    return found


# The records, drawn


def draw() -> dict[str, list[str]]:
    """Column -> a cell per learner, as text; an empty cell is a blank."""
    generator = np.random.default_rng(SEED)
    codes: dict[str, np.ndarray] = {}
    cells: dict[str, list[str]] = {}
    for node in NETWORK:
        chance, within, lost = generator.random((3, ROWS))
        edges = np.cumsum(table(node)[tuple(codes[parent] for parent in node.pulls)], axis=-1)[..., :-1]
        codes[node.name] = level = (chance[:, None] > edges).sum(axis=1)
        found = [node.levels[each] for each in level] if node.shape is None else numbers(node, level, within)
        cells[node.name] = ["" if gone else cell for cell, gone in zip(found, lost < node.blank, strict=True)]
    return cells


def numbers(node: Node, band: np.ndarray, chance: np.ndarray) -> list[str]:
    """A whole number inside each learner's band, as `node.shape` weighs them."""
    edges = [0, *node.cuts, node.shape.size]
    found = np.zeros(band.size, dtype=int)
    for each, (low, high) in enumerate(pairwise(edges)):
        here = band == each
        weight = np.cumsum(node.shape[low:high])
        found[here] = low + np.searchsorted(weight / weight[-1], chance[here], side="right")
    return [str(number) for number in found]


# The files


def study() -> dict[str, object]:
    """What a user would state about the study on the Records and Order pages."""
    stages = {node.stage: [each.name for each in NETWORK if each.stage == node.stage] for node in NETWORK}
    return {
        "name": NAME,
        "about": ABOUT,
        "choices": {
            "kinds": {},
            "bands": {node.name: node.cuts for node in NETWORK if node.cuts},
            "grades": {node.name: node.levels for node in NETWORK if node.grade},
            "blanks": {node.name: "level" for node in NETWORK if node.blank},
            "units": {node.name: node.unit for node in NETWORK if node.unit},
        },
        "plan": {
            "stages": list(stages.items()),
            "insist": INSIST,
            "rule_out": RULE_OUT,
            "changeable": CHANGEABLE,
            "outcomes": {outcome: ["yes"] for outcome in OUTCOMES},
        },
        "try": TRY,
    }


def codebook(cells: Mapping[str, list[str]], effects: list[dict[str, object]]) -> str:
    """What every column and level means, and what is worth finding, in Markdown."""
    lines = [f"# {NAME}", "", *ABOUT_THE_RECORDS.strip().splitlines(), "", "## Columns", ""]
    lines += ["| column | stage | kind | levels | meaning | blanks |", "|---|---|---|---|---|---|"]
    for node in NETWORK:
        kind = "number" if node.cuts else "grade" if node.grade else "category"
        levels = f"{node.unit}; bands {', '.join(node.levels)}" if node.cuts else ", ".join(node.levels)
        blanks = cells[node.name].count("") or "none"
        lines.append(f"| {node.name} | {node.stage} | {kind} | {levels} | {node.meaning} | {blanks} |")
    lines += ["", *ABOUT_THE_COLUMNS.strip().splitlines(), "", "## What is worth finding", ""]
    for group, found in (({}, "Of all"), ({BY: "nights"}, "Of those on nights")):
        truth = next(each for each in effects if (each["column"], each["among"]) == ("mentor", group))
        lines.append(
            f"- {found} {truth['recorded']:.0%} passed: {truth['had']['yes']:.0%} of those with a mentor and "
            f"{truth['had']['no']:.0%} of those without.\n  A mentor for everybody would make it "
            f"{truth['set']['yes']:.0%}, for nobody {truth['set']['no']:.0%}."
        )
    lines += ABOUT_THE_FINDINGS.strip().splitlines()
    return "\n".join(lines) + "\n"


def write(folder: Path) -> None:
    """Write records.csv, study.json, truth.json and codebook.md."""
    cells, effects = draw(), truth()
    rows = [",".join(cells), *(",".join(row) for row in zip(*cells.values(), strict=True))]
    written = {
        "records.csv": "\n".join(rows) + "\n",
        "study.json": json.dumps(study(), indent=2) + "\n",
        "truth.json": json.dumps({"about": ABOUT_THE_TRUTH, "effects": effects}, indent=2) + "\n",
        "codebook.md": codebook(cells, effects),
    }
    folder.mkdir(parents=True, exist_ok=True)
    for name, text in written.items():
        (folder / name).write_text(text, encoding="utf-8", newline="\n")


if __name__ == "__main__":
    write(Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).parent / "lantern_street")
