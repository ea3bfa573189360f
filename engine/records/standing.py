"""The columns that say how records count: one with their weights, one with the groups that they belong to."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.records.cells import Cells, as_numbers
from engine.records.column import SMALL_COUNT, Column
from engine.records.design_effect import DesignEffect, design_effect
from engine.records.wording import figure, listing, people
from engine.refusal import Refusal, quoted

NAMED = 5  # records that a refusal names
Kept = NDArray[np.bool_]


@dataclass(frozen=True)
class Standing:
    """What each record counts for.

    weights: (rows,) float64, summing to the effective number of records as if none belonged together.
    group: (rows,) int32 from 0, or None.  effect: what groups do to that number, None without.
    said: sentences on what weights and groups do to it.
    """

    weights: NDArray[np.float64]
    group: NDArray[np.int32] | None
    said: tuple[str, ...]
    effect: DesignEffect | None = None


def weights_of(name: str, cells: Cells, kept: Kept) -> NDArray[np.float64]:
    """(rows kept,) the weights that a column holds. Raises Refusal, naming records, unless all are numbers over 0."""
    values = as_numbers(name, cells).values
    assert values is not None
    values = values[kept]
    blank = np.isnan(values)
    if blank.any():
        raise Refusal(
            f"{quoted(name)} says how much each record counts but is blank in {_records(blank, kept)}.",
            where=name,
            do="Give those records a weight in the file, or let a blank there leave the row out.",
        )
    wrong = values <= 0
    if wrong.any():
        raise Refusal(
            f"{quoted(name)} says how much each record counts but is not over 0 in {_records(wrong, kept)}.",
            where=name,
            do="A weight is more than 0: mend those records in the file, or take them out of it.",
        )
    return values


def groups_of(name: str, cells: Cells, kept: Kept) -> NDArray[np.int32]:
    """(rows kept,) the group of each record, from 0; a blank is a group by itself.

    Raises Refusal when all records are in one group.
    """
    codes = cells.codes[kept]
    blank = codes < 0
    seen = np.flatnonzero(np.bincount(codes[~blank], minlength=cells.different))
    number = np.zeros(cells.different + 1, dtype=np.int32)
    number[seen] = np.arange(seen.size)
    groups = number[codes]
    groups[blank] = seen.size + np.arange(int(blank.sum()))
    if int(groups.max()) == 0:
        raise Refusal(
            f"{quoted(name)} puts every record into one group.",
            where=name,
            do="Choose a column that tells the groups apart, or none.",
        )
    return groups


def standing(columns: Mapping[str, Column], rows: int) -> Standing:
    """What each of the `rows` kept records counts for.

    Weights are scaled to sum to Kish's effective size, the squared sum by the sum of squares (Kish 1965); without a
    weight every record counts for 1. Groups lower that number by how alike the columns are that are learned together,
    so it is divided when these are known.
    Raises Refusal when two columns are taken as the weight, or as the group.
    """
    weight, group = _only(columns, "weight"), _only(columns, "group")
    weights = np.ones(rows)
    said: list[str] = []
    if weight is not None and weight.values is not None:
        relative = weight.values / weight.values.max()
        weights = relative * (relative.sum() / (relative**2).sum())
        said.append(
            f"By their weights in {quoted(weight.name)} the {_people(rows)} records are worth "
            f"{_worth(float(weights.sum()))} of equal weight."
        )
    if group is None:
        return Standing(weights, None, tuple(said))
    used = [column for column in columns.values() if column.used]
    effect = design_effect(group.codes, weights, used)
    said += _grouped(group, effect, rows, float(weights.sum()) / effect.factor())
    return Standing(weights, group.codes, tuple(said), effect)


def _only(columns: Mapping[str, Column], kind: str) -> Column | None:
    found = [column for column in columns.values() if column.kind == kind]
    if len(found) > 1:
        names = listing([quoted(column.name) for column in found], 12)
        raise Refusal(
            f"{names} are taken as the {kind}, and there can only be one.",
            where=found[-1].name,
            do="Give all but one of them another kind, or leave them out.",
        )
    return found[0] if found else None


def _grouped(group: Column, effect: DesignEffect, rows: int, worth: float) -> list[str]:
    """What a group does to the effective number of records, in sentences.  worth: when all columns are learned from."""
    name = quoted(group.name)
    said = []
    if effect.groups == rows:
        said.append(f"Every record is a group of its own by {name}, so grouping changes nothing.")
    elif not any(each > 0.0 for each in effect.alike.values()):
        said.append(
            f"The records stand in {_people(effect.groups)} groups by {name}. Those of one group are no more alike "
            "than others, so each counts as a case of its own."
        )
    else:
        correlation = f"{effect.correlation():.2f}"
        where = " or more in two columns" if len(effect.alike) > 1 else ""
        alike = f"alike (intraclass correlation {correlation}{where})" if float(correlation) else "a little alike"
        said.append(
            f"The records stand in {_people(effect.groups)} groups by {name}. Those of one group are {alike}, so that "
            f"all of them are worth {_worth(worth)} separate cases when all columns are learned from."
        )
        if effect.same:
            told = listing([quoted(each) for each in effect.same])
            verb = "does" if len(effect.same) == 1 else "do"
            said.append(
                f"{told} {verb} not vary inside a group: what the records say about "
                f"{'it' if len(effect.same) == 1 else 'them'} rests on {_people(effect.groups)} groups alone."
            )
    if group.blanks and group.blank == "level":
        said.append(
            f"{name} is blank in {_people(group.blanks)} records; a record without a group is a case by itself."
        )
    return said


def _people(count: int) -> str:
    return people(count, SMALL_COUNT)


def _worth(records: float) -> str:
    return "1" if records < 1.5 else f"{round(records):,}"


def _records(where: Kept, kept: Kept) -> str:
    """The first few records where something holds, by their place in the file."""
    places = np.flatnonzero(kept)[where] + 1
    named = [figure(float(place)) for place in places[:NAMED]]
    if places.size > NAMED:
        return f"records {', '.join(named)} and {places.size - NAMED:,} more"
    return f"{'record' if places.size == 1 else 'records'} {listing(named, None)}"
