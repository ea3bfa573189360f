"""A network as a program: a short Python text that can be read, run and kept, and needs nothing but numpy."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from itertools import product

import numpy as np

from engine.network.network import Category, Network
from engine.order import Order

WIDTH = 110  # characters in a line before a list is written one item a line
LONGEST = 32  # characters of a name in a remark; names in the code itself are whole
KINDS = {"category": "A category", "grade": "A grade, low to high", "number": "A number in bands"}

HEAD = '''"""A model learned from records, as a program that draws invented records: column by column, early to late.

    python program.py 1000      prints 1,000 rows as CSV
    python program.py 1000 7    the same with the seed 7; the same seed draws the same rows

From Python, sample(1000, seed=7) gives a dict: column -> array of its levels.
Each column is drawn from its own table: a row for each combination of its parents' levels, the last parent changing
fastest, and in it a share for each level. Shares are rounded to about four digits. The program describes how columns
go together; that a change made on purpose would work in the same way is for the order and the reader to say.
"""

import csv
import sys

import numpy as np

COLUMNS = {}  # name -> how to draw it; in the order in which they are drawn, parents before children


def category(name, levels, parents, shares):
    """A column of levels. shares: a row per combination of the parents' levels, a share per level of its own."""
    upto = np.cumsum(shares, axis=1)
    sizes = [len(COLUMNS[parent]["levels"]) for parent in parents]

    def draw(rows, rng, drawn):
        row = np.zeros(rows, dtype=int)
        for parent, size in zip(parents, sizes):
            row = row * size + drawn[parent]
        chance = rng.random(rows) * upto[row, -1]
        return (chance[:, None] >= upto[row, :-1]).sum(axis=1)

    COLUMNS[name] = {"levels": np.array(levels, dtype=object), "draw": draw}


def sample(rows, seed=0):
    """Draw `rows` invented records: a dict, column -> array of its levels."""
    rng = np.random.default_rng(seed)
    drawn = {}
    for name, column in COLUMNS.items():
        drawn[name] = column["draw"](rows, rng, drawn)
    return {name: column["levels"][drawn[name]] for name, column in COLUMNS.items()}
'''

TAIL = """
if __name__ == "__main__":
    if len(sys.argv) not in (2, 3) or not all(each.isdecimal() for each in sys.argv[1:]):
        sys.exit("How to run it: python program.py ROWS [SEED]")
    sys.stdout.reconfigure(encoding="utf-8", errors="backslashreplace", newline="")
    found = sample(*map(int, sys.argv[1:]))
    write = csv.writer(sys.stdout, lineterminator="\\n").writerow
    write(found)
    for line in zip(*found.values()):
        write(line)
"""


def program(network: Network, order: Order | None = None) -> str:
    """The network as Python text that runs on numpy alone.

    Columns stand in the order of their stages, and inside a stage parents before children. Every name and level is
    written as a literal, whatever it holds.
    """
    parts = [HEAD]
    for heading, nodes in _stages(network, order):
        if heading:
            parts.append(f"\n# {heading}\n")
        parts += [_block(node, network) for node in nodes]
    return "\n".join([*parts, TAIL])


def _stages(network: Network, order: Order | None) -> Iterator[tuple[str, list[Category]]]:
    if order is None:
        yield "", list(network.nodes)
        return
    for number, stage in enumerate(order.stages, start=1):
        inside = set(stage.columns)
        nodes = [node for node in network.nodes if node.name in inside]
        if nodes:
            yield f"Stage {number}: {_remark(stage.name)}", nodes


def _block(node: Category, network: Network) -> str:
    """One column. A kind of column that is drawn in another way gets a block of its own here and in HEAD."""
    comes = f"comes from {', '.join(_remark(parent) for parent in node.parents)}" if node.parents else "has no parents"
    lines = [
        f"# {_remark(node.name)}. {KINDS[node.kind]}; {comes}.",
        "category(",
        f"    {node.name!r},",
        *_list("levels", [repr(level) for level in node.levels]),
        *_list("parents", [repr(parent) for parent in node.parents]),
        "    shares=[",
    ]
    if node.parents:
        lines.append(f"        # each row: {', '.join(_remark(parent) for parent in node.parents)}")
    rows = np.asarray(node.table).reshape(-1, len(node.levels))
    for row, levels in zip(rows, product(*(network.node(parent).levels for parent in node.parents)), strict=True):
        given = f"  # {', '.join(_remark(level) for level in levels)}" if levels else ""
        lines.append(f"        [{', '.join(map(_share, row))}],{given}")
    return "\n".join([*lines, "    ],", ")", ""])


def _list(name: str, items: Sequence[str]) -> Iterable[str]:
    line = f"    {name}=[{', '.join(items)}],"
    return [line] if len(line) <= WIDTH else [f"    {name}=[", *(f"        {item}," for item in items), "    ],"]


def _share(share: float) -> str:
    """Four decimals, and for a small share two digits, so that nothing possible is written as 0."""
    if share == 0.0:
        return "0"
    return f"{share:.4f}" if share >= 0.001 else f"{share:.1e}"


def _remark(name: str) -> str:
    """A name in a remark: on one line, and not endless."""
    safe = name if name.isprintable() else repr(name)
    return safe if len(safe) <= LONGEST else safe[: LONGEST - 1].rstrip() + "…"
