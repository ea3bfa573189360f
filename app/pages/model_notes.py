"""What is worth knowing about how a model was learned, on the Model page: counting, bands, limits that were reached."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from app.wording.learned import at_limit, counting, shaped
from engine.doubting.cap import odds
from engine.learning.checks import MOST_PARENTS
from engine.learning.learn import at_cap
from engine.model import Learned, Model
from engine.network.said import Words


@dataclass(frozen=True)
class Limit:
    """A column at the limit of parents that wants more. more: the limit to learn again with, None at the highest."""

    said: Words
    more: int | None


def notes(learned: Learned) -> tuple[str, ...]:
    """How the records were counted, and what the learner noted; not what `limits` says."""
    weights, group = learned.coded.weights, learned.coded.group
    equal = float(weights.sum() ** 2 / (weights**2).sum())  # Kish's effective size
    groups = None if group is None else int(np.unique(group).size)
    said = at_cap(learned.cap, learned.max_parents)
    kept = tuple(note for note in learned.notes if note not in said)
    return (*counting(learned.rows, equal, float(weights.sum()), groups), *kept)


def limits(model: Model, most: int) -> tuple[Limit, ...]:
    """A sentence for each column of `model` that wants more parents than the `most` allowed, surest first."""
    more = most + 1 if most < MOST_PARENTS else None
    return tuple(
        Limit(at_limit(each.column, model.network.node(each.column).parents, each.parents, odds(each.gain)), more)
        for each in sorted(model.capped or (), key=lambda each: -each.gain)
    )


def supports(learned: Learned, model: Model, settled: Mapping[tuple[str, str], str]) -> dict[tuple[str, str], float]:
    """How likely each link of `model` is, 0 to 1; one that nobody settled in either direction."""
    found = {}
    for source, target in model.links:
        found[source, target] = learned.support_of(source, target)
        if settled[source, target] == "nobody":
            found[source, target] = min(found[source, target] + learned.support_of(target, source), 1.0)
    return found


def settled_by_shape(learned: Learned, model: Model, settled: Mapping[tuple[str, str], str]) -> str | None:
    """Why nobody settled the links between a category and a number; None without such."""
    numbers, order = set(model.network.numbers), learned.order
    pairs = [
        link
        for link in model.links
        if settled[link] == "nobody"
        and (link[0] in numbers) != (link[1] in numbers)
        and order.stage_of(link[0]) == order.stage_of(link[1])
    ]
    return shaped(pairs) if pairs else None
