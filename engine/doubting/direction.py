"""Does the answer rest on a link whose direction neither the order nor the records settle?"""

from __future__ import annotations

from collections.abc import Collection, Iterable

from engine.answering.answer import Caution
from engine.doubting.case import Case, Found, named
from engine.network.equivalence import unsettled_links

Link = tuple[str, str]
SHOWN = 3


def check(case: Case) -> Found | None:
    """Look for unsettled links on a path between a lever and a column in question.

    Weakens when one of them touches a lever: what a lever does depends on the direction of the links that meet it
    (Maathuis, Kalisch & Buehlmann 2009). Otherwise worth knowing.
    """
    levers = tuple(case.asked.working)
    watch = tuple(column for column in case.asked.watch if column not in levers)
    if case.order is None or not levers or not watch:
        return None
    links = case.network.links
    unsettled = case.unsettled | unsettled_links(links, case.order.may_lead)
    forward = _bearing([(target, source) for source, target in links], {link[::-1] for link in unsettled}, {*levers})
    watch = tuple(column for column in watch if column in forward)  # whatever is turned, no lever moves the others
    bearing = _bearing(links, unsettled, {*levers, *watch, *case.asked.pinned})
    near = [link for link in links if bearing.issuperset(link)]
    met = {link for lever in levers for column in watch for link in between(near, lever, column)} & unsettled
    if not met:
        return ()
    listed = [link for link in links if link in met]
    at_lever = [link for link in listed if set(link) & set(levers)]
    told = sorted(listed, key=lambda link: link not in at_lever)
    pairs = [f"{source} goes with {target}" for source, target in told[:SHOWN]]
    if len(told) > SHOWN:
        pairs.append(f"{len(told) - SHOWN} more")
    has = "has a direction" if len(met) == 1 else "have directions"
    text = (
        f"between {named(levers)} and {named(watch)} {has} that neither your order nor the records settle: "
        f"{named(pairs)}. " + ("Turned round, " if len(met) == 1 else "With any of them turned round, ")
    )
    text += "the answer may be another." if at_lever else "the path would be another, the answer much the same."
    do = "If you know which of the two comes first, put it into an earlier stage on the Order page."
    figure = "1 link" if len(met) == 1 else f"{len(met)} links"
    columns = tuple(dict.fromkeys(column for link in told for column in link))
    figures = {"links": len(met), "at the lever": len(at_lever)}
    return (Caution("weakens" if at_lever else "know", "direction", figure, text, do, figures, columns),)


def _bearing(links: Iterable[Link], unsettled: Collection[Link], start: set[str]) -> set[str]:
    """Columns that may lead to any of `start` in some equivalent model; others bear on nothing asked."""
    backward: dict[str, set[str]] = {}
    for source, target in links:
        backward.setdefault(target, set()).add(source)
        if (source, target) in unsettled:
            backward.setdefault(source, set()).add(target)
    found, waiting = set(start), list(start)
    while waiting:
        for column in backward.get(waiting.pop(), set()) - found:
            found.add(column)
            waiting.append(column)
    return found


def between(links: Collection[Link], start: str, end: str) -> frozenset[Link]:
    """Links on a path from `start` to `end` that meets no column twice, whichever way its links run.

    They are the links in one biconnected component with a link added from start to end (Hopcroft & Tarjan 1973).
    """
    added = (start, end)
    beside: dict[str, list[tuple[str, Link]]] = {}
    for link in (added, *(link for link in links if set(link) != {start, end})):
        beside.setdefault(link[0], []).append((link[1], link))
        beside.setdefault(link[1], []).append((link[0], link))
    depth = {start: 0}
    stack: list[Link] = []
    together: set[Link] = set()

    def walk(column: str, came: Link | None) -> int:
        lowest = depth[column]
        for other, link in beside[column]:
            if link == came:
                continue
            if other in depth:
                if depth[other] < depth[column]:
                    stack.append(link)
                    lowest = min(lowest, depth[other])
                continue
            depth[other] = depth[column] + 1
            stack.append(link)
            reach = walk(other, link)
            lowest = min(lowest, reach)
            if reach >= depth[column]:
                component = set(stack[stack.index(link) :])
                del stack[stack.index(link) :]
                if added in component:
                    together.update(component)
        return lowest

    walk(start, None)
    direct = {link for link in links if set(link) == {start, end}}
    return frozenset((together - {added}) | direct)
