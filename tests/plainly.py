"""The slow truth of answering: every case a network can bring forth, one by one, with levers as defined.

A lever splits its column in two: the natural value follows the column's own table, the shown value is the lever's
level with probability `reach` and the natural value otherwise, and children follow what is shown.
"""

import itertools

import numpy as np


def cases(network, levers=None, draw=0, tables=None):
    """[(natural levels, shown levels, probability)] of every possible case.

    levers: {column: (level, reach)}.  draw: which draw of `tables` (parents..., own levels, draws) to follow.
    """
    found = [({}, {}, 1.0)]
    for place, node in enumerate(network.nodes):
        table = node.table if tables is None else tables[place][..., draw]
        longer = []
        for natural, shown, probability in found:
            row = table
            for parent in node.parents:
                row = row[network.node(parent).levels.index(shown[parent])]
            for level, share in zip(node.levels, row, strict=True):
                for seen, chance in _shown(level, (levers or {}).get(node.name)):
                    weight = probability * float(share) * chance
                    if weight > 0.0:
                        longer.append((natural | {node.name: level}, shown | {node.name: seen}, weight))
        found = longer
    return found


def _shown(natural, lever):
    if lever is None:
        return [(natural, 1.0)]
    level, reach = lever
    return [(level, reach), (natural, 1.0 - reach)]


def total(every, pins):
    """Probability that the natural values match `pins`, {column: set of levels}."""
    return sum(p for natural, _, p in every if all(natural[column] in wanted for column, wanted in pins.items()))


def shares(network, every, pins, column):
    """(levels,) shares of what `column` shows among cases whose natural values match `pins`."""
    levels = network.node(column).levels
    found = np.zeros(len(levels))
    for natural, shown, p in every:
        if all(natural[pinned] in wanted for pinned, wanted in pins.items()):
            found[levels.index(shown[column])] += p
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
