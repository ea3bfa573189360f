"""Judging a model: everything that the Trust page shows."""

from __future__ import annotations

from collections.abc import Callable
from functools import partial

import numpy as np
from numpy.typing import NDArray

from engine.judging.blank import blanks
from engine.judging.calibration import brier, in_tenths, spread, tenths
from engine.judging.gains import gain
from engine.judging.judgement import ColumnScore, Judgement, Reliability
from engine.judging.missed import dependences
from engine.judging.relearned import Relearned, relearned
from engine.judging.rule import tests, verdict
from engine.judging.thin import thin
from engine.judging.yardstick import Yardstick
from engine.learning.learned import Learned
from engine.order import Order, better_levels
from engine.records.table import Table
from engine.refusal import Refusal

Floats = NDArray[np.float64]
Progress = Callable[[float, str], None]

_SHARES = (0.15, 0.20, 0.65)  # of the time: learning again, looking for dependences, the yardstick


def judge(learned: Learned, table: Table, progress: Progress | None = None, links: int | None = None) -> Judgement:
    """Judge the best model of `links` links, None for the recommended number, on the records it was learned from.

    Every figure is of records that were held out while the model, its links included, was learned again from the
    others; the parts are those of learning. The same records, order and seed give the same judgement.
    progress(fraction, words) is called often; raising inside it cancels.

    Raises Refusal for a table that the model was not learned from, a number of links that was not learned, and fewer
    groups of records than parts.
    """
    size = learned.recommended if links is None else links
    learned.parents_at(size)
    if table.digest != learned.digest:
        raise Refusal(
            "These are not the records that the model was learned from, or they are taken differently.",
            where="table",
            do="Learn again, then judge.",
        )
    import sklearn.ensemble  # noqa: F401  loaded first, for only threads of what is loaded are limited
    from threadpoolctl import threadpool_limits

    with threadpool_limits(1):  # threads that wait for each other cost more than they bring
        return _judged(learned, table, size, _Saying(progress))


def _judged(learned: Learned, table: Table, size: int, say: _Saying) -> Judgement:
    say.begin("Learning again without each part of the records", _SHARES[0])
    again = relearned(learned, size, say.within)
    say.begin("Looking for dependences that the model misses", _SHARES[1])
    missing = dependences(again, learned.order, learned.seed, say.within)
    scores, unmeasured = _scores(again, learned.order, say)
    said = _reliability(again, learned.order, learned.seed)
    found = tests(scores, said, missing)
    say.finish()
    return Judgement(
        verdict=verdict(found),
        tests=found,
        links=size,
        rows=learned.rows,
        parts=len(again.parents),
        columns=scores,
        unmeasured=unmeasured,
        reliability=said,
        dependences=missing,
        thin=thin(learned.coded, learned.order),
        blanks=blanks(table, learned.coded.names),
        digest=learned.digest,
    )


def _scores(again: Relearned, order: Order, say: _Saying) -> tuple[tuple[ColumnScore, ...], tuple[str, ...]]:
    """Outcomes first, then the others, as the order lists them; and columns that the yardstick was not tried on.

    It is tried on outcomes first, then on changeable columns.
    """
    coded = again.coded
    names = coded.names
    listed = sorted(
        range(len(names)), key=lambda at: (names[at] not in order.outcomes, names[at] not in order.changeable)
    )
    yardstick = Yardstick(again, order)
    measured = yardstick.within_reach(listed)
    say.begin("Measuring against the yardstick", _SHARES[2])
    found = {}
    for at in listed:
        base, own = again.scores(at, linked=False), again.scores(at)
        gained = gain(own - base, coded.weights, coded.group)
        box = lead = None
        if at in measured:
            boxed = yardstick.scores(at, partial(say.within, measured.index(at) / len(measured)))
            box, lead = (gain(boxed - other, coded.weights, coded.group) for other in (base, own))
        found[at] = ColumnScore(
            column=names[at],
            stage=order.stages[order.stage_of(names[at])].name,
            outcome=names[at] in order.outcomes,
            changeable=names[at] in order.changeable,
            linked=any(parents[at] for parents in again.parents),
            base=float(np.average(base, weights=coded.weights)),
            gain=gained,
            yardstick=box,
            lead=lead,
        )
    left = tuple(names[at] for at in listed if at not in measured and yardstick.before(0, at))
    return tuple(found[at] for at in sorted(listed, key=lambda at: (names[at] not in order.outcomes, at))), left


def _reliability(again: Relearned, order: Order, seed: int) -> tuple[Reliability, ...]:
    """Outcomes, then the other numbers."""
    coded = again.coded
    found = []
    for at, name in enumerate(coded.names):
        if at in coded.numbers:
            found.append(Reliability(name, name in order.outcomes, (), spread(again.below(at), coded.weights)))
        elif name in order.outcomes:
            levels = better_levels(order.outcomes[name], coded.levels[at], coded.has_blank[at])
            found.append(_of_levels(again, at, levels, seed))
    return tuple(sorted(found, key=lambda each: not each.outcome))


def _of_levels(again: Relearned, at: int, levels: tuple[str, ...], seed: int) -> Reliability:
    coded = again.coded
    places = [coded.levels[at].index(level) for level in levels]
    said = np.minimum(again.foreseen(at)[:, places].sum(axis=1), 1.0)
    happened = np.isin(coded.codes[:, at], places).astype(np.float64)
    part = in_tenths(said, np.random.default_rng([seed, at]))
    with np.errstate(divide="ignore"):
        losses = -np.log(np.where(happened > 0.0, said, 1.0 - said))
    return Reliability(
        column=coded.names[at],
        outcome=True,
        levels=levels,
        tenths=tenths(said, happened, coded.weights, part),
        brier=brier(said, happened, coded.weights, part),
        log_loss=float(np.average(losses, weights=coded.weights)),
    )


class _Saying:
    """Tells `progress` of every step; raising in there cancels."""

    def __init__(self, progress: Progress | None) -> None:
        self.progress = progress
        self.words = ""
        self.start = self.share = 0.0

    def begin(self, words: str, share: float) -> None:
        """The next step, which takes that share of the whole."""
        self.words = words
        self.start += self.share
        self.share = share
        self.within(0.0)

    def within(self, part: float) -> None:
        """`part` of the present step is done."""
        self._tell(min(self.start + self.share * min(part, 1.0), 1.0))

    def finish(self) -> None:
        """All is done."""
        self.words = "Done"
        self._tell(1.0)

    def _tell(self, fraction: float) -> None:
        if self.progress is not None:
            self.progress(fraction, self.words)
