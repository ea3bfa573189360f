"""A network as a program: a short Python text that can be read, run and kept, and needs nothing but numpy."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence
from itertools import product
from math import floor, log10

import numpy as np

from engine.network.network import Network
from engine.network.nodes import Category, Node, Number
from engine.network.sampling import drawn_rows
from engine.order import Order
from engine.records.wording import number_text

WIDTH = 110  # characters in a line before a list is written one item a line
LYING = 1_000  # rows that tell about where numbers lie
EXACT = 1e-15  # of a value: a smaller spread is that of rounding
LONGEST = 32  # characters of a name in a remark; names in the code itself are whole
KINDS = {"category": "A category", "grade": "A grade, low to high", "number": "A number in bands"}

HEAD = """A model learned from records, as a program that draws invented records: column by column, early to late.

    python program.py 1000      prints 1,000 rows as CSV
    python program.py 1000 7    the same with the seed 7; the same seed draws the same rows

From Python, sample(1000, seed=7) gives a dict: column -> array of its {values}.
{drawn}
The program describes how columns go together; that a change made on purpose would work in the same way is for the
order and the reader to say.
"""

CATEGORIES = """\
Each column is drawn from its own table: a row for each combination of its parents' levels, the last parent changing
fastest, and in it a share for each level. Shares are rounded to about four digits."""

BOTH_KINDS = """\
A category is drawn from a table: a row for each combination of its parents' levels, the last parent changing fastest,
and in it a share for each level, rounded to about four digits. A number among its parents acts through its bands.
A number is drawn from a normal distribution around a line: for each combination of its category parents' levels its
mean where each number parent is at its centre, a slope for each number parent, and a standard deviation."""

CODE = '''
import csv
import sys

import numpy as np

COLUMNS = {}  # name -> how to draw it; in the order in which they are drawn, parents before children


def combination(parents, rows, drawn):
    """For each row, which combination of the parents' levels it has."""
    row = np.zeros(rows, dtype=int)
    for parent in parents:
        row = row * COLUMNS[parent]["size"] + COLUMNS[parent]["place"](drawn[parent])
    return row


def category(name, levels, parents, shares):
    """A column of levels. shares: a row per combination of the parents' levels, a share per level of its own."""
    upto = np.cumsum(shares, axis=1)
    names = np.array(levels, dtype=object)

    def draw(rows, rng, drawn):
        row = combination(parents, rows, drawn)
        chance = rng.random(rows) * upto[row, -1]
        return (chance[:, None] >= upto[row, :-1]).sum(axis=1)

    COLUMNS[name] = {"draw": draw, "size": len(levels), "place": np.asarray, "shown": lambda places: names[places]}

'''

NUMBER = '''
def number(name, categories, numbers, centres, lines, bands=()):
    """A column of numbers. centres: a value of each of the numbers. lines: a row per combination of the categories'
    levels: mean at the centres, a slope for each of the numbers, standard deviation. bands: the cuts between bands."""
    lines = np.array(lines, dtype=float)

    def draw(rows, rng, drawn):
        line = lines[combination(categories, rows, drawn)]
        moved = [drawn[each] - centre for each, centre in zip(numbers, centres)]
        mean = line[:, 0] + sum(line[:, at] * more for at, more in enumerate(moved, start=1))
        return mean + line[:, -1] * rng.standard_normal(rows)

    def place(values):
        return np.searchsorted(np.array(bands, dtype=float), values, side="right")

    COLUMNS[name] = {"draw": draw, "size": len(bands) + 1, "place": place, "shown": np.asarray}

'''

SAMPLE = '''
def sample(rows, seed=0):
    """Draw `rows` invented records: a dict, column -> array of its {values}."""
    rng = np.random.default_rng(seed)
    drawn = {{}}
    for name, column in COLUMNS.items():
        drawn[name] = column["draw"](rows, rng, drawn)
    return {{name: column["shown"](drawn[name]) for name, column in COLUMNS.items()}}
'''

TAIL = """
if __name__ == "__main__":
    if len(sys.argv) not in (2, 3) or not all(each.isdecimal() for each in sys.argv[1:]):
        sys.exit("How to run it: python program.py ROWS [SEED]")
    sys.stdout.reconfigure(encoding="utf-8", errors="backslashreplace", newline="")
    found = sample(*map(int, sys.argv[1:]))
    write = csv.writer(sys.stdout, lineterminator="\\n").writerow
    write(found)
    for line in zip(*(values.tolist() for values in found.values())):
        write(line)
"""


def program(network: Network, order: Order | None = None, units: Mapping[str, str] | None = None) -> str:
    """The network as Python text that runs on numpy alone.

    Columns stand in the order of their stages, and inside a stage parents before children. Every name and level is
    written as a literal, whatever it holds.
    units: number -> what it is measured in, told in its remark where it is known.
    """
    parts = [_head(bool(network.numbers))]
    lies = _lies(network)
    for heading, nodes in _stages(network, order):
        if heading:
            parts.append(f"\n# {heading}\n")
        for node in nodes:
            if isinstance(node, Category):
                parts.append(_category(node, network, (units or {}).get(node.name)))
            else:
                parts.append(_number(node, network, lies, (units or {}).get(node.name)))
    return "\n".join([*parts, TAIL])


def _head(numbers: bool) -> str:
    values, drawn = ("levels or numbers", BOTH_KINDS) if numbers else ("levels", CATEGORIES)
    told = HEAD.format(values=values, drawn=drawn)
    return f'"""{told}"""\n{CODE}{NUMBER if numbers else ""}{SAMPLE.format(values=values)}'


def _stages(network: Network, order: Order | None) -> Iterator[tuple[str, list[Node]]]:
    if order is None:
        yield "", list(network.nodes)
        return
    for number, stage in enumerate(order.stages, start=1):
        inside = set(stage.columns)
        nodes = [node for node in network.nodes if node.name in inside]
        if nodes:
            yield f"Stage {number}: {_remark(stage.name)}", nodes


def _category(node: Category, network: Network, unit: str | None) -> str:
    kind = f"{KINDS[node.kind]}, in {_remark(unit)}" if unit else KINDS[node.kind]
    lines = [
        f"# {_remark(node.name)}. {kind}; {_comes(node)}.",
        "category(",
        f"    {node.name!r},",
        *_list("levels", [repr(level) for level in node.levels]),
        *_list("parents", [repr(parent) for parent in node.parents]),
        "    shares=[",
    ]
    if node.parents:
        lines.append(f"        # each row: {', '.join(_remark(parent) for parent in node.parents)}")
    rows = np.asarray(node.table).reshape(-1, len(node.levels))
    for row, given in zip(rows, _configurations(network, node.parents), strict=True):
        lines.append(f"        [{', '.join(map(_share, row))}],{given}")
    return "\n".join([*lines, "    ],", ")", ""])


def _lies(network: Network) -> dict[str, tuple[float, float]]:
    """Number -> about where it lies, rounded to be read, and how far it spreads: by rows that are always the same."""
    if not network.numbers:
        return {}
    values = drawn_rows(network, LYING, seed=0).values
    return {name: _centre(float(np.mean(values[name])), float(np.std(values[name]))) for name in network.numbers}


def _centre(mean: float, sd: float) -> tuple[float, float]:
    return (round(mean, -floor(log10(sd))) if sd > abs(mean) * EXACT else mean), sd


def _number(node: Number, network: Network, lies: Mapping[str, tuple[float, float]], unit: str | None) -> str:
    categories, numbers = network.category_parents(node.name), network.number_parents(node.name)
    kind = f"A number, in {_remark(unit)}" if unit else "A number"
    columns = [
        "mean at the centres" if numbers else "mean",
        *(f"slope of {_remark(parent)}" for parent in numbers),
        "standard deviation",
    ]
    of = f"; {', '.join(_remark(parent) for parent in categories)}" if categories else ""
    lines = [
        f"# {_remark(node.name)}. {kind}; {_comes(node)}.",
        "number(",
        f"    {node.name!r},",
        *_list("categories", [repr(parent) for parent in categories]),
        *_list("numbers", [repr(parent) for parent in numbers]),
        *_list("centres", [number_text(lies[parent][0]) for parent in numbers]),
        "    lines=[",
        f"        # each row: {', '.join(columns)}{of}",
    ]
    intercept = np.asarray(node.intercept).reshape(-1)
    slopes = np.asarray(node.slopes).reshape(intercept.size, len(numbers))
    means = intercept + slopes @ np.array([lies[parent][0] for parent in numbers])
    sds = np.sqrt(np.asarray(node.variance)).reshape(-1)
    for at, given in enumerate(_configurations(network, categories)):
        row = [_mean(means[at], sds[at] or lies[node.name][1]), *map(_slope, slopes[at]), f"{sds[at]:.4g}"]
        lines.append(f"        [{', '.join(row)}],{given}")
    lines.append("    ],")
    if any(isinstance(child, Category) and node.name in child.parents for child in network.nodes):
        lines += _list("bands", [repr(cut) for cut in node.bands])
    return "\n".join([*lines, ")", ""])


def _comes(node: Node) -> str:
    return f"comes from {', '.join(_remark(parent) for parent in node.parents)}" if node.parents else "has no parents"


def _configurations(network: Network, parents: Sequence[str]) -> Iterator[str]:
    """A remark for each combination of the levels of `parents`, the last changing fastest."""
    for levels in product(*(network.node(parent).levels for parent in parents)):
        yield f"  # {', '.join(_remark(level) for level in levels)}" if levels else ""


def _list(name: str, items: Sequence[str]) -> Iterable[str]:
    line = f"    {name}=[{', '.join(items)}],"
    return [line] if len(line) <= WIDTH else [f"    {name}=[", *(f"        {item}," for item in items), "    ],"]


def _share(share: float) -> str:
    """Four decimals, and for a small share two digits, so that nothing possible is written as 0."""
    if share == 0.0:
        return "0"
    return f"{share:.4f}" if share >= 0.001 else f"{share:.1e}"


def _mean(value: float, sd: float) -> str:
    """To a millionth of the standard deviation, and seven digits at least: it may lie far from 0."""
    if not sd > abs(value) * EXACT:
        return number_text(float(value))
    far = floor(log10(abs(value) / sd)) if value != 0.0 else 0
    return f"{value:.{min(max(7, far + 7), 17)}g}"


def _slope(value: float) -> str:
    """Seven digits: it is multiplied by what its parent is away from its centre."""
    return f"{value:.7g}"


def _remark(name: str) -> str:
    """A name in a remark: on one line, and not endless."""
    safe = name if name.isprintable() else repr(name)
    return safe if len(safe) <= LONGEST else safe[: LONGEST - 1].rstrip() + "…"
