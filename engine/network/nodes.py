"""Columns of a network: a category with a table, a number with a regression, one per configuration of parents."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np

from engine.network.regression import Regression
from engine.records.bands import band_levels, checked_cuts
from engine.records.units import checked_unit
from engine.refusal import Refusal, quoted


@dataclass(frozen=True, eq=False)
class Category:
    """A category (or grade, or a number taken as bands) with a table per configuration of its parents.

    table: float64, one axis per parent in order, own levels last; each row sums to 1.
    dirichlet: posterior Dirichlet parameters, same shape as `table`; None when the table is known exactly.
    kind, cuts, has_blank, unit: as in engine.records.Column (a number here acts through its bands).
    Raises Refusal when the table is not an array of numbers, or the unit no short text.
    """

    name: str
    levels: tuple[str, ...]
    parents: tuple[str, ...] = ()
    table: np.ndarray | Sequence[object] = ()
    dirichlet: np.ndarray | None = None
    kind: str = "category"
    cuts: tuple[float, ...] = ()
    has_blank: bool = False
    unit: str = ""

    def __post_init__(self) -> None:
        for what, given in (("levels", self.levels), ("parents", self.parents)):
            if isinstance(given, str):
                raise Refusal(
                    f"The {what} of {quoted(self.name)} are one text, not a list.",
                    where=self.name,
                    do=f"Write [{given!r}].",
                )
        object.__setattr__(self, "unit", checked_unit(self.name, self.unit))
        object.__setattr__(self, "levels", tuple(self.levels))
        object.__setattr__(self, "parents", tuple(self.parents))
        try:
            table = np.asarray(self.table, dtype=np.float64)
        except (TypeError, ValueError):
            raise Refusal(
                f"The table of {quoted(self.name)} is not a regular table of numbers.",
                where=self.name,
                do="Give one axis per parent in order, and the column's own levels last.",
            ) from None
        object.__setattr__(self, "table", table)


@dataclass(frozen=True, eq=False)
class Number:
    """A number with a linear regression on its number parents in each configuration of its category parents.

    Conditional linear Gaussian (Lauritzen & Wermuth 1989), in the columns' own units.
    intercept, variance: float64, one axis per category parent in order.  slopes: those axes, then one last axis with
    an entry per number parent in order.  Slopes may be left out, or be empty, when there is no number parent; a
    variance of 0 means that the number follows exactly.
    bands: inner cuts, ascending, through which it acts on categories: band i holds bands[i-1] <= x < bands[i].
    regression: the posterior; None when the number's parameters are known exactly.
    unit: what it is measured in, "" where none is stated.
    Raises Refusal when one of them is not an array of numbers, for cuts that do not rise and a unit of no short text.
    """

    name: str
    parents: tuple[str, ...] = ()
    intercept: np.ndarray | Sequence[object] | float = 0.0
    slopes: np.ndarray | Sequence[object] = ()
    variance: np.ndarray | Sequence[object] | float = 1.0
    bands: tuple[float, ...] = ()
    regression: Regression | None = None
    unit: str = ""

    def __post_init__(self) -> None:
        if isinstance(self.parents, str):
            raise Refusal(
                f"The parents of {quoted(self.name)} are one text, not a list.",
                where=self.name,
                do=f"Write [{self.parents!r}].",
            )
        object.__setattr__(self, "parents", tuple(self.parents))
        arrays: dict[str, np.ndarray] = {}
        for what in ("intercept", "slopes", "variance"):
            try:
                arrays[what] = np.asarray(getattr(self, what), dtype=np.float64)
            except (TypeError, ValueError):
                raise Refusal(
                    f"The {what} of {quoted(self.name)} is not a regular array of numbers.",
                    where=self.name,
                    do="Give one axis per category parent in order, and for slopes one last axis of number parents.",
                ) from None
        if arrays["slopes"].size == 0:  # left out, or an empty list per configuration
            arrays["slopes"] = np.zeros((*arrays["intercept"].shape, 0))
        for what, array in arrays.items():
            object.__setattr__(self, what, array)
        object.__setattr__(self, "bands", checked_cuts(self.name, self.bands))
        object.__setattr__(self, "unit", checked_unit(self.name, self.unit))

    @property
    def levels(self) -> tuple[str, ...]:
        """Its bands in words."""
        return band_levels(self.bands)

    @property
    def kind(self) -> Literal["number"]:
        return "number"

    @property
    def cuts(self) -> tuple[float, ...]:
        """As `bands`; named so in a Category."""
        return self.bands

    @property
    def has_blank(self) -> bool:
        """No number stands for a blank."""
        return False


Node = Category | Number
