"""What an answer is: marginals of each watched column in each world, with draws, and the change between worlds."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Mapping
from dataclasses import dataclass, field

import numpy as np
import pandas as pd

from engine.answering.marginal import Marginal, Wanted, spread
from engine.records.wording import listing
from engine.refusal import Refusal, quoted

__all__ = ["Answer", "Caution", "Counted", "Doubt", "Marginal", "Reading", "Wanted", "spread"]


@dataclass(frozen=True)
class Counted:
    """Straight from the records: `rows` that match every pin, and how many of them hold each level or band.

    mean: of a number over these rows, None for others.
    weighed: level -> its share where records do not all count the same, None where they do.
    hidden: levels that are told together or not at all, for their counts one by one would give a small one away.
    """

    rows: int
    counts: Mapping[str, int]
    hidden: frozenset[str] = frozenset()
    mean: float | None = None
    weighed: Mapping[str, float] | None = None

    @property
    def shares(self) -> dict[str, float]:
        if self.weighed is not None:
            return dict(self.weighed)
        return {level: count / self.rows for level, count in self.counts.items()}

    def tellable(self, levels: Iterable[str]) -> bool:
        """Whether the count of these levels together leaves every hidden one hidden."""
        wanted = frozenset(levels)
        return not self.hidden & wanted or self.hidden <= wanted


@dataclass(frozen=True, eq=False)
class Reading:
    """One column in every world asked about.

    recorded: no pins.  among: pins.  set: pins and levers, None without levers.
    had: pins and the levers' values as pins, None unless all levers fix a value, where no such record can be, and for
    columns that are only read beside those in question.
    against: pins and the second set of levers, None without one.
    counted: from the records, None without them and where the number of those that match is not told.
    """

    column: str
    recorded: Marginal
    among: Marginal
    set: Marginal | None = None
    had: Marginal | None = None
    counted: Counted | None = None
    against: Marginal | None = None


@dataclass(frozen=True)
class Caution:
    """A reason to distrust an answer.

    rank: "blocks", "weakens" or "know".  code: stable name of the check.
    figure: the number as shown, such as "38 of 412"; `text` is a sentence that reads on from it.
    do: one thing to do.  figures: the numbers behind it by name.  columns: those concerned.
    """

    rank: str
    code: str
    figure: str
    text: str
    do: str
    figures: Mapping[str, float]
    columns: tuple[str, ...]


@dataclass(frozen=True)
class Doubt:
    """The plausible graphs that an answer's draws were pooled over.

    graphs: drawn from the posterior; different: of these, how many are not the same; effective: how many independent
    draws they are worth.  left_out: of the graphs, those in which the question could not be asked, and why the first
    of them refused it.  apart: watched column -> of the others, those in which nothing leads to it from any lever.
    """

    graphs: int
    different: int
    effective: float
    left_out: int = 0
    why: str | None = None
    apart: Mapping[str, int] = field(default_factory=dict)


@dataclass(frozen=True, eq=False)
class Answer:
    """Readings of every column asked for, and how they were come by.

    watch: the columns the question is about; cautions concern these.  readings also holds those read beside them.
    matching: records that match every pin, None without records.
    matching_told: whether that number may be shown; where not, it would give a count under the limit away.
    method: "exact" or "sampled", and by which route.  cost: table cells times draws.  milliseconds: wall time.
    mc_error: largest Monte Carlo standard error, 0 when exact.
    effective: fewest effective particles of any world, infinite when exact.
    log_evidence: natural log of the pins' probability, or density where a number is pinned to a value.
    pinned_after: columns pinned after the levers; what is set is then told of other people than `among`.
    cautions: those that block first, then those that weaken, then those worth knowing.
    checks_made: how many checks for cautions could be made of this question.
    doubt: what graphs the draws were pooled over, None while they are those of one model.  again: how to ask it with
    (graphs, draws), None where there are no graphs to ask.
    """

    watch: tuple[str, ...]
    readings: Mapping[str, Reading]
    method: str
    cost: float
    milliseconds: float
    log_evidence: float
    matching: int | None = None
    matching_told: bool = True
    mc_error: float = 0.0
    cautions: tuple[Caution, ...] = ()
    checks_made: int = 0
    doubt: Doubt | None = None
    again: Callable[[int, int], Answer] | None = field(default=None, repr=False)
    effective: float = np.inf
    pinned_after: tuple[str, ...] = ()
    joints: Callable[[tuple[str, ...]], Mapping[str, tuple[np.ndarray, bool]]] | None = field(default=None, repr=False)

    @property
    def doubted(self) -> bool:
        """Whether the intervals are over plausible models; else they are within the one model."""
        return self.doubt is not None and self.doubt.left_out < self.doubt.graphs

    def with_doubt(self, graphs: int = 50, draws: int = 20) -> Answer:
        """The same answer, its intervals over sampled graphs as well: `draws` of the parameters in each of `graphs`.

        The points stay those of this model. An answer of a network given as it is has no doubt to add: it is returned
        as it is. Raises Refusal for numbers of graphs or draws from which no interval can be told.
        """
        return self if self.again is None else self.again(graphs, draws)

    @property
    def blocked(self) -> bool:
        """Whether a caution blocks the answer: what the levers would do is then withheld wherever it is shown."""
        return any(caution.rank == "blocks" for caution in self.cautions)

    def __getitem__(self, column: str) -> Reading:
        """The reading of one column. Raises Refusal for a column that was not asked for."""
        if not isinstance(column, str) or column not in self.readings:
            raise Refusal(
                f"The column {quoted(column)} was not asked for.",
                where=str(column),
                do=f"Watch it; this answer holds {listing(tuple(self.readings), 12)}.",
            )
        return self.readings[column]

    def __iter__(self) -> Iterator[str]:
        return iter(self.readings)

    def change(self, column: str, wanted: Wanted | None = None, coverage: float = 0.90) -> tuple[float, float, float]:
        """(change, low, high): what is set minus among these, or minus against, over common draws.

        wanted: of the share of these levels or bands; None: of a number's mean.
        Raises Refusal without levers, with pins after them, and for a column that was not asked for.
        """
        reading = self[column]
        if reading.set is None:
            raise Refusal("Nothing is set, so nothing changes.", do="Set a lever first.")
        if self.pinned_after:
            raise Refusal(
                f"The people told of if set are picked by {listing(self.pinned_after)} after the lever, and are others "
                "than before it, so there is no change to tell.",
                where=column,
                do="Take out the pins after the lever, or read each world by itself.",
            )
        before = reading.among if reading.against is None else reading.against
        if wanted is None:
            change = reading.set.mean - before.mean
            assert reading.set.mean_draws is not None and before.mean_draws is not None
            return change, *spread(reading.set.mean_draws - before.mean_draws, change, coverage)
        change = reading.set.share(wanted) - before.share(wanted)
        return change, *spread(reading.set.share_draws(wanted) - before.share_draws(wanted), change, coverage)

    def joint(self, columns: Iterable[str], coverage: float = 0.90) -> dict[str, pd.DataFrame]:
        """Joint shares of a few columns that were asked for, in "recorded", "among", "set" and "against" as they are.

        Each frame has the columns' levels, or bands, as its index, and share, low and high, over draws of this model;
        its attrs["method"] is "exact" or "sampled".
        Raises Refusal for no columns, one that was not asked for, and where that costs too much.
        """
        names = (columns,) if isinstance(columns, str) else tuple(dict.fromkeys(columns))
        if not names or self.joints is None:
            raise Refusal(
                "No column is named.", where="columns", do=f"Name some of {listing(tuple(self.readings), 12)}."
            )
        levels = [self[name].recorded.levels for name in names]
        index = pd.MultiIndex.from_product(levels, names=list(names))
        found: dict[str, pd.DataFrame] = {}
        for world, (shares, sampled) in self.joints(names).items():
            rows = shares.reshape(len(index), -1)
            point = rows[:, 0]
            ends = np.array([spread(row[1:], float(row[0]), coverage) for row in rows])
            found[world] = pd.DataFrame({"share": point, "low": ends[:, 0], "high": ends[:, 1]}, index=index)
            found[world].attrs["method"] = "sampled" if sampled else "exact"
        return found
