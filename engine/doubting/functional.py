"""What an answer is made of: shares read from the fitted joint, multiplied, summed and divided."""

from __future__ import annotations

from collections import Counter
from collections.abc import Collection, Iterable
from dataclasses import dataclass
from functools import cached_property

Columns = frozenset[str]


@dataclass(frozen=True)
class Share:
    """The share of each level of a column among cases alike in `given`."""

    column: str
    given: tuple[str, ...] = ()

    @cached_property
    def free(self) -> Columns:
        """The columns whose levels it depends on; so of every expression."""
        return frozenset((self.column, *self.given))

    def __str__(self) -> str:
        return f"P({self.column}{' | ' if self.given else ''}{', '.join(self.given)})"


@dataclass(frozen=True)
class Product:
    """All of `parts` multiplied; 1 without any."""

    parts: tuple[Expression, ...]

    @cached_property
    def free(self) -> Columns:
        return frozenset[str]().union(*(part.free for part in self.parts))

    def __str__(self) -> str:
        return " ".join(map(str, self.parts)) or "1"


@dataclass(frozen=True)
class Sum:
    """`of`, summed over every level of the columns `over`."""

    over: Columns
    of: Expression

    @cached_property
    def free(self) -> Columns:
        return self.of.free - self.over

    def __str__(self) -> str:
        return f"Σ_{{{', '.join(sorted(self.over))}}} [{self.of}]"


@dataclass(frozen=True)
class Ratio:
    """`above` divided by `below`."""

    above: Expression
    below: Expression

    @cached_property
    def free(self) -> Columns:
        return self.above.free | self.below.free

    def __str__(self) -> str:
        return f"({self.above}) / ({self.below})"


@dataclass(frozen=True)
class Set:
    """`of`, read where the levers `columns` are set."""

    columns: Columns
    of: Expression

    @cached_property
    def free(self) -> Columns:
        return self.of.free - self.columns

    def __str__(self) -> str:
        return f"{{{self.of}; set {', '.join(sorted(self.columns))}}}"


Expression = Share | Product | Sum | Ratio | Set


def product(parts: Iterable[Expression]) -> Expression:
    """Parts multiplied, without brackets inside brackets."""
    flat = [inner for part in parts for inner in parts_of(part)]
    return flat[0] if len(flat) == 1 else Product(tuple(flat))


def total(over: Collection[str], of: Expression) -> Expression:
    """`of` summed over columns. A share that alone holds its column sums to 1 and goes; what holds none stands before.

    Every column of `over` must be one whose shares `of` gives, not only one that they depend on.
    """
    left = of.free & frozenset(over)
    if isinstance(of, Sum):
        return total(left | of.over, of.of) if left else of
    parts = list(parts_of(of))
    while True:
        held = Counter(column for part in parts for column in part.free)
        whole = [part for part in parts if isinstance(part, Share) and part.column in left and held[part.column] == 1]
        if not whole:
            break
        parts.remove(whole[0])
        left -= {whole[0].column}
    if not left:
        return product(parts)
    inside = [part for part in parts if part.free & left]
    return product([*(part for part in parts if not part.free & left), Sum(left, product(inside))])


def ratio(above: Expression, below: Expression) -> Expression:
    """One divided by the other, without the parts that both have."""
    top, bottom = Counter(parts_of(above)), Counter(parts_of(below))
    both = top & bottom
    top, bottom = top - both, bottom - both
    divided = product(top.elements())
    return Ratio(divided, product(bottom.elements())) if bottom else divided


def set_at(levers: Columns, of: Expression) -> Expression:
    """`of` where those of the levers that it depends on are set."""
    concerned = of.free & levers
    return Set(concerned, of) if concerned else of


def parts_of(of: Expression) -> tuple[Expression, ...]:
    """What an expression multiplies: its parts, or itself alone."""
    return of.parts if isinstance(of, Product) else (of,)
