"""The cells of one column, whatever pandas holds them in: numbers, or texts as positions."""

from __future__ import annotations

import datetime
import decimal
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import pandas as pd
from numpy.typing import ArrayLike, NDArray

from engine.records.wording import number_text
from engine.refusal import Refusal, quoted

EXACT = 2**53  # whole numbers above it are not all exact as floats: they are names, not amounts


@dataclass(frozen=True)
class Cells:
    """One column as read.

    distinct: every different value, as text or as float64; in rising order for numbers, in the stated order when
    `ordered`, else in the order of appearance.  codes: (rows,) int32 positions in `distinct`, -1 where blank.
    values: (rows,) float64, nan where blank; None when the column holds texts.
    ordered: the frame states an order of the texts.  dates: the frame says that these are dates.
    """

    distinct: tuple[str, ...] | NDArray[np.float64]
    codes: NDArray[np.int32]
    values: NDArray[np.float64] | None = None
    ordered: bool = False
    dates: bool = False

    @property
    def different(self) -> int:
        """How many different values there are."""
        return len(self.distinct)

    @cached_property
    def texts(self) -> tuple[str, ...]:
        """Every different value as text: what a level made of it is called."""
        if isinstance(self.distinct, tuple):
            return self.distinct
        return tuple(number_text(value) for value in self.distinct.tolist())

    @cached_property
    def blank(self) -> NDArray[np.bool_]:
        """(rows,) True where the cell holds nothing."""
        return np.asarray(self.codes < 0)

    @cached_property
    def blanks(self) -> int:
        return int(self.blank.sum())

    @cached_property
    def counts(self) -> NDArray[np.int64]:
        """(texts,) cells of each different value."""
        return np.bincount(self.codes + 1, minlength=self.different + 1)[1:]


def cells(name: str, column: pd.Series) -> Cells:
    """The cells of `column`. A text of nothing but spaces is blank. Raises Refusal for infinite and complex numbers."""
    kind = column.dtype
    if isinstance(kind, pd.CategoricalDtype):
        return _categorical(column)
    if pd.api.types.is_bool_dtype(kind) and not pd.api.types.is_object_dtype(kind):
        return _texts(column.astype("object"))
    if pd.api.types.is_complex_dtype(kind):
        raise Refusal(
            f"{quoted(name)} holds complex numbers.", where=name, do="Give their parts as columns of their own."
        )
    if pd.api.types.is_numeric_dtype(kind):
        return _numbers(name, column)
    if pd.api.types.is_datetime64_any_dtype(kind) or isinstance(kind, pd.PeriodDtype):
        return _texts(column.astype("object"), dates=True)
    if pd.api.types.is_object_dtype(kind):
        return _objects(name, column)
    return _texts(column)


def from_values(name: str, values: NDArray[np.float64]) -> Cells:
    """Cells of numbers, nan where blank. Raises Refusal for infinite ones."""
    infinite = np.isinf(values)
    if infinite.any():
        record = int(infinite.argmax()) + 1
        raise Refusal(
            f"{quoted(name)} holds a number that is infinite in {int(infinite.sum()):,} of its cells; "
            f"the first is record {record:,}.",
            where=name,
            do="Put a real number there, or leave the cell empty.",
        )
    values = values + 0.0  # no minus zero
    codes, distinct = pd.factorize(values, sort=True)
    return Cells(np.asarray(distinct), codes.astype(np.int32), values)


def as_numbers(name: str, held: Cells) -> Cells:
    """Texts taken as the numbers they spell. Raises Refusal naming the first record that spells none."""
    if held.values is not None:
        return held
    if held.dates:
        raise Refusal(f"{quoted(name)} holds dates, which are no numbers.", where=name, do="Leave it out.")
    spelt = np.full(len(held.texts), np.nan)
    for place, text in enumerate(held.texts):
        try:
            number = float(text.replace("−", "-")) if "_" not in text else np.nan
        except ValueError:
            number = np.nan
        if not np.isfinite(number):
            record = int((held.codes == place).argmax()) + 1
            raise Refusal(
                f"{quoted(name)} cannot be a number: record {record:,} holds {quoted(text)}.",
                where=name,
                do="Put a number there in the file, leave the cell empty, or choose another kind.",
            )
        spelt[place] = number
    return from_values(name, np.append(spelt, np.nan)[held.codes])


def _numbers(name: str, column: pd.Series) -> Cells:
    if pd.api.types.is_integer_dtype(column.dtype):
        blank = column.isna().to_numpy()
        whole = column[~blank]
        if len(whole) and (int(whole.max()) > EXACT or int(whole.min()) < -EXACT):
            return _texts(column.astype("object"))
    return from_values(name, column.to_numpy(dtype=np.float64, na_value=np.nan))


def _categorical(column: pd.Series) -> Cells:
    held = column.cat.remove_unused_categories()
    places, renamed = _spelt(held.cat.categories)
    return Cells(places, renamed[held.cat.codes.to_numpy()], ordered=bool(held.cat.ordered))


def _objects(name: str, column: pd.Series) -> Cells:
    kinds = {type(value) for value in column[column.notna().to_numpy()]}
    if kinds and all(_is_real(kind) for kind in kinds):
        whole = [abs(value) for value in column if isinstance(value, int)]
        if not whole or max(whole) <= EXACT:
            return from_values(name, column.to_numpy(dtype=np.float64, na_value=np.nan))
    return _texts(column, dates=bool(kinds) and all(issubclass(kind, datetime.date | pd.Period) for kind in kinds))


def _is_real(kind: type) -> bool:
    return issubclass(kind, int | float | decimal.Decimal | np.integer | np.floating) and not issubclass(kind, bool)


def _texts(column: pd.Series, dates: bool = False) -> Cells:
    try:
        codes, distinct = pd.factorize(column)
    except TypeError:  # lists and other values without a hash
        codes, distinct = pd.factorize(column.map(level_text, na_action="ignore"))
    texts, renamed = _spelt(distinct)
    return Cells(texts, renamed[codes], dates=dates)


def _spelt(distinct: ArrayLike) -> tuple[tuple[str, ...], NDArray[np.int32]]:
    """Different values as different texts, and (values + 1,) where each went: -1 for nothing but spaces, and last."""
    places: dict[str, int] = {}
    renamed = []
    for value in np.asarray(distinct, dtype=object).tolist():
        text = value if isinstance(value, str) else level_text(value)
        renamed.append(places.setdefault(text, len(places)) if text and not text.isspace() else -1)
    return tuple(places), np.array([*renamed, -1], dtype=np.int32)


def level_text(value: object) -> str:
    """What a level made of `value` is called."""
    if isinstance(value, float | np.floating):
        return number_text(float(value))
    if isinstance(value, datetime.datetime) and value.time() == datetime.time():
        return value.date().isoformat()
    return str(value)
