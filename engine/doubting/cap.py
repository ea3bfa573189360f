"""Does the answer run through a column that wants more parents than learning allowed?"""

from __future__ import annotations

import math
from collections.abc import Collection, Iterable, Mapping

from engine.answering.answer import Caution
from engine.answering.settings import AnySetting
from engine.doubting.case import Case, Found, named
from engine.learning.cap import Capped
from engine.learning.checks import MOST_PARENTS

SHOWN = 3
MOST = 1_000.0  # odds beyond which no figure is told


def check(case: Case) -> Found | None:
    """Weakens where a lever, a column in question or one between would gain from one parent more than was allowed.

    What the missing parent brings is then ascribed to those there are, and may be taken for what a lever does; and
    the missing parent may be the lever, or lie between.
    """
    levers = {column: None for column in (*case.asked.working, *_reaching(case.asked.against))}
    if case.capped is None or not levers:
        return None
    links = [*case.network.links, *((parent, each.column) for each in case.capped for parent in each.parents)]
    watch = [column for column in case.asked.watch if column not in levers]
    way = _reached(links, levers) & _reached([link[::-1] for link in links], watch)
    met = sorted((each for each in case.capped if each.column in way), key=lambda each: -each.gain)
    if not met:
        return ()
    most = len(met[0].parents) - 1
    allowed = "the one column" if most == 1 else f"the {most} columns"
    many = [each.column for each in met[:SHOWN]]
    if len(met) > SHOWN:
        many.append(f"{len(met) - SHOWN} more")
    if len(met) == 1:
        text = f"are the odds, by these records, that {many[0]} comes from {_missing(case, met[0])} besides {allowed}"
    else:
        text = f"are the odds for the surest of {named(many)}: each comes from more than {allowed}"
    text += f" that learning allowed. What is left out may be taken for what {named(levers)} does."
    do = f"On the Model page, learn again with up to {most + 1} parents, and ask again."
    if most >= MOST_PARENTS:
        do = "No more parents can be learned. On the Order page, insist on the links that you know to matter."
    figures = {"columns": float(len(met)), "gain": met[0].gain, "parents": float(most)}
    return (Caution("weakens", "cap", odds(met[0].gain), text, do, figures, tuple(each.column for each in met)),)


def _reaching(settings: Mapping[str, AnySetting] | None) -> list[str]:
    return [column for column, setting in (settings or {}).items() if setting.reach > 0.0]


def _reached(links: Collection[tuple[str, str]], start: Iterable[str]) -> set[str]:
    """`start`, and the columns that links lead to from there."""
    found = set(start)
    while more := {target for source, target in links if source in found} - found:
        found |= more
    return found


def _missing(case: Case, found: Capped) -> str:
    """What the column would come from as well: the one new parent, or as many as there are."""
    new = [parent for parent in found.parents if parent not in case.network.node(found.column).parents]
    return f"{new[0]}, too," if len(new) == 1 else "another column"


def odds(gain: float) -> str:
    """A difference of log marginal likelihoods as odds, both models being as likely beforehand."""
    ratio = math.exp(min(gain, math.log(2.0 * MOST)))
    return f"over {MOST:,.0f} to 1" if ratio > MOST else f"{ratio:,.0f} to 1"
