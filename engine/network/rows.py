"""Rows of a table as a network reads them: level positions of categories, values and bands of numbers."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from engine.network.network import Network
from engine.network.nodes import Category, Number
from engine.records.bands import band_codes
from engine.records.cells import Cells, as_numbers, cells
from engine.records.wording import cited, listing
from engine.refusal import Refusal, quoted

NAMED = 5  # rows that a refusal names

Codes = NDArray[np.integer]


@dataclass(frozen=True, eq=False)
class Rows:
    """Rows without blanks, a column each.

    count: of rows.  codes: column -> (rows,) positions of levels, or of bands where the column is a number.
    values: number -> (rows,) in its own unit, finite.
    """

    count: int
    codes: Mapping[str, Codes]
    values: Mapping[str, NDArray[np.float64]]

    def some(self, places: Codes) -> Rows:
        """The rows at those places."""
        codes = {name: column[places] for name, column in self.codes.items()}
        return Rows(len(places), codes, {name: column[places] for name, column in self.values.items()})

    def configurations(self, network: Network, parents: tuple[str, ...]) -> Codes:
        """(rows,) which configuration of `parents` each row is in, the last parent changing fastest."""
        at = np.zeros(self.count, dtype=np.int64)
        for parent in parents:
            at = at * len(network.node(parent).levels) + self.codes[parent]
        return at

    def numbers(self, names: tuple[str, ...]) -> NDArray[np.float64]:
        """(rows, names) the values of those numbers."""
        return np.column_stack([np.empty((self.count, 0)), *(self.values[name] for name in names)])


def read_rows(network: Network, frame: pd.DataFrame) -> Rows:
    """As `read_with_blanks`. Raises Refusal for a blank where no level stands for it, too."""
    rows, blanks = read_with_blanks(network, frame)
    for name, blank in blanks.items():
        raise refused_blank(name, blank, "no level of this model stands for a blank there")
    return rows


def read_with_blanks(network: Network, frame: pd.DataFrame) -> tuple[Rows, dict[str, NDArray[np.bool_]]]:
    """Every column of `network` from a table as it was brought, and which cells of which columns are blank.

    Levels are texts, numbers numbers or texts that spell them; a number taken as bands is either a number or the name
    of a band. A blank for which a level stands is that level; of any other, what the rows hold means nothing. Columns
    without such a blank are not among the blanks.
    Raises Refusal for a missing column, one that the network does not have, a level that it does not know, and what
    is no finite number.
    """
    if not isinstance(frame, pd.DataFrame):
        raise Refusal("The rows are no DataFrame.", where="rows", do="Bring them as a pandas DataFrame.")
    _check_columns(network, frame)
    codes: dict[str, Codes] = {}
    values: dict[str, NDArray[np.float64]] = {}
    blanks: dict[str, NDArray[np.bool_]] = {}
    for node in network.nodes:
        held = cells(node.name, frame[node.name])
        if isinstance(node, Number):
            read = as_numbers(node.name, held).values
            assert read is not None
            blank = np.isnan(read)
            values[node.name] = np.where(blank, 0.0, read)
            codes[node.name] = band_codes(values[node.name], node.bands)
        else:
            blank = np.zeros(len(frame), dtype=bool) if node.has_blank else held.blank
            codes[node.name] = _levels(node, held)
        if blank.any():
            blanks[node.name] = blank
    return Rows(len(frame), codes, values), blanks


def _check_columns(network: Network, frame: pd.DataFrame) -> None:
    columns = list(frame.columns)
    if missing := [name for name in network.names if name not in columns]:
        raise Refusal(
            f"The rows have no column {listing([quoted(name) for name in missing])}.",
            where=missing[0],
            do="Bring every column of the model.",
        )
    if strange := [str(name) for name in columns if name not in network.index]:
        raise Refusal(
            f"This model has no column {listing([quoted(name) for name in strange])}.",
            where=strange[0],
            do="Take it out of the rows.",
        )
    if len(columns) > len(network.names):
        twice = next(name for name in network.names if columns.count(name) > 1)
        raise Refusal(f"The rows have the column {quoted(twice)} twice.", where=twice, do="Give each column once.")


def _levels(node: Category, held: Cells) -> Codes:
    """(rows,) level positions; 0 for a blank that no level stands for."""
    places = np.full(held.different + 1, -1, dtype=np.int64)
    known = {level: place for place, level in enumerate(node.levels)}
    for at, text in enumerate(held.texts):
        places[at] = known.get(text, _band(node, text))
    unknown = np.flatnonzero(places[:-1] < 0)
    if unknown.size:
        texts = [cited(held.texts[place]) for place in unknown]
        raise Refusal(
            f"{quoted(node.name)} holds {listing(texts)} in {_named(np.isin(held.codes, unknown))}; "
            "this model knows no such level.",
            where=node.name,
            do=f"Its levels are {listing(node.levels, 12)}.",
        )
    places[-1] = len(node.levels) - 1 if node.has_blank else 0
    return np.asarray(places[held.codes])


def _band(node: Category, text: str) -> int:
    """The band of a text that spells a number, where the column is a number taken as bands; else -1."""
    if node.kind != "number":
        return -1
    try:
        value = float(text.replace("−", "-")) if "_" not in text else np.nan
    except ValueError:
        return -1
    return int(band_codes(np.array([value]), node.cuts)[0]) if np.isfinite(value) else -1


def refused_blank(name: str, blank: NDArray[np.bool_], why: str) -> Refusal:
    """blank: (rows,) where the column is."""
    return Refusal(
        f"{quoted(name)} is blank in {_named(blank)}, and {why}.",
        where=name,
        do="Fill that cell in, or leave the row out."
        if blank.sum() == 1
        else "Fill those cells in, or leave the rows out.",
    )


def _named(rows: NDArray[np.bool_]) -> str:
    """Rows counted from 1, the first few by number."""
    places = np.flatnonzero(rows) + 1
    told = [f"{place:,}" for place in places[:NAMED]]
    if places.size > NAMED:
        return f"rows {', '.join(told)} and {places.size - NAMED:,} more"
    return f"{'row' if places.size == 1 else 'rows'} {listing(told, NAMED)}"
