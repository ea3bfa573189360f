"""The slow truth of answering: every case a network can bring forth, one by one, with levers as defined.

A lever splits its column in two: the natural value follows the column's own table, the shown value is the lever's
level with probability `reach` and the natural value otherwise, and children follow what is shown.
"""

import itertools

import numpy as np

import engine


def cases(network, levers=None, draw=0, tables=None):
    """[(natural levels, shown levels, probability)] of every possible case.

    levers: {column: (level, reach)}, or engine.Fix, Mix or Rule in place of the pair; a rule goes by what its column
    shows.  draw: which draw of `tables` (parents..., own levels, draws) to follow.
    """
    levers = levers or {}
    found = [({}, {}, 1.0)]
    for name, what in _turns(network, levers):
        longer = []
        for natural, shown, probability in found:
            node = network.node(name)
            if what == "natural":
                table = node.table if tables is None else tables[network.index[name]][..., draw]
                row = table
                for parent in node.parents:
                    row = row[network.node(parent).levels.index(shown[parent])]
                ways = zip(node.levels, row, strict=True)
            else:
                ways = _shown(natural[name], levers.get(name), shown)
            for level, share in ways:
                weight = probability * float(share)
                if weight > 0.0:
                    own = {name: level}
                    longer.append(
                        (natural | own, shown, weight) if what == "natural" else (natural, shown | own, weight)
                    )
        found = longer
    return found


def _turns(network, levers):
    """(column, "natural" or "shown") so that nothing comes before what it follows from."""
    waiting = [(name, what) for name in network.names for what in ("natural", "shown")]
    done = []
    while waiting:
        for name, what in waiting:
            if what == "natural":
                needs = [(parent, "shown") for parent in network.node(name).parents]
            else:
                ruler = getattr(levers.get(name), "column", None)
                needs = [(name, "natural"), *([] if ruler is None else [(ruler, "shown")])]
            if all(need in done for need in needs):
                done.append((name, what))
                waiting.remove((name, what))
                break
        else:
            raise AssertionError("a circle")
    return done


def _shown(natural, lever, shown):
    """[(level, probability)] of what a column shows, given its natural level and what other columns show."""
    if lever is None:
        return [(natural, 1.0)]
    if isinstance(lever, tuple):
        level, reach = lever
        return [(level, reach), (natural, 1.0 - reach)]
    if isinstance(lever, engine.Fix):
        set_to = {lever.value: 1.0}
    elif isinstance(lever, engine.Mix):
        set_to = lever.shares
    else:
        set_to = {lever.values.get(shown[lever.column], natural): 1.0}
    return [*((level, lever.reach * share) for level, share in set_to.items()), (natural, 1.0 - lever.reach)]


def total(every, pins):
    """Probability that the natural values match `pins`, {column: set of levels}."""
    return sum(p for natural, _, p in every if all(natural[column] in wanted for column, wanted in pins.items()))


def shares(network, every, pins, column, after=None):
    """(levels,) shares of what `column` shows among cases whose natural values match `pins`.

    after: pins on what is shown.
    """
    return joint(network, every, pins, [column], after)


def joint(network, every, pins, columns, after=None):
    """(levels of each column...) joint shares, as `shares`; nan where no case matches."""
    levels = [network.node(column).levels for column in columns]
    found = np.zeros([len(each) for each in levels])
    for natural, shown, p in every:
        matches = all(natural[pinned] in wanted for pinned, wanted in pins.items())
        if matches and all(shown[pinned] in wanted for pinned, wanted in (after or {}).items()):
            found[tuple(each.index(shown[column]) for each, column in zip(levels, columns, strict=True))] += p
    with np.errstate(invalid="ignore"):
        return found / found.sum()


def smallest_contradiction(every, pins):
    """The size of the smallest set of pins that no case has together."""
    for size in range(1, len(pins) + 1):
        for columns in itertools.combinations(pins, size):
            if total(every, {column: pins[column] for column in columns}) == 0.0:
                return size
    return None


def open_paths(links, start, end):
    """Every simple path between two columns along links in either direction, as a list of links."""
    found = []

    def walk(at, seen, path):
        if at == end:
            found.append(list(path))
            return
        for link in links:
            if at in link:
                other = link[1] if link[0] == at else link[0]
                if other not in seen:
                    walk(other, seen | {other}, [*path, link])

    walk(start, {start}, [])
    return found
