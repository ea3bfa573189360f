"""Learning: a table and an order become the best model of every size."""

from __future__ import annotations

from collections.abc import Callable
from numbers import Integral

import numpy as np
import pandas as pd

from engine.learning import held_out
from engine.learning.families import Candidates, Families, candidates
from engine.learning.learned import Learned
from engine.learning.posterior import posterior
from engine.learning.scores import SetScores, set_scores
from engine.learning.search import SizeCurve, check_widths, size_curve
from engine.order import Direction, Order
from engine.records.counts import LARGEST, ArrayCounts
from engine.records.table import Coded, Table
from engine.refusal import Refusal, quoted, whole

FEWEST_ROWS = 30
MOST_LEVELS = 50
MOST_PARENTS = 5

Progress = Callable[[float, str], None]


def learn(
    table: Table,
    order: Order,
    max_links: int | None = None,
    max_parents: int = 3,
    graphs: int = 200,
    seed: int = 0,
    progress: Progress | None = None,
    ess: float = 1.0,
    folds: bool = True,
) -> Learned:
    """Find the best model at every number of links, and say which number predicts held-out records well enough.

    max_links: stop the curve there; None: every number that the order and `max_parents` (1 to 5) allow.
    graphs: how many to draw from the posterior over all graphs that the order allows.
    progress(fraction, words) is called often; raising inside it cancels.  ess: equivalent sample size of the score.
    folds: False leaves the held-out scores out and recommends the size with the best score.

    Raises Refusal for records or an order that cannot be learned from.
    """
    if not isinstance(table, Table):
        raise Refusal(
            "What is to be learned from is no table of records.",
            where="table",
            do="Make one with engine.read_table(file) or engine.Table.from_frame(frame).",
        )
    if not isinstance(order, Order):
        raise Refusal(
            "The order is none.", where="order", do="State it as engine.Order([(stage, [column, ...]), ...])."
        )
    for name in order.columns:
        if name not in table.columns:
            raise Refusal(
                f"The order names the column {quoted(name)}, which the records do not have.",
                where=name,
                do="Take it out of the order.",
            )
        if table.columns[name].kind == "left out":
            raise Refusal(
                f"The column {quoted(name)} is left out of the records but stands in the order.",
                where=name,
                do="Take it out of the order, or give it a kind.",
            )
    return learn_coded(
        table.coded(order.columns), order, table.digest, max_links, max_parents, graphs, seed, progress, ess, folds
    )


def learn_coded(
    coded: Coded,
    order: Order,
    digest: str = "",
    max_links: int | None = None,
    max_parents: int = 3,
    graphs: int = 200,
    seed: int = 0,
    progress: Progress | None = None,
    ess: float = 1.0,
    folds: bool = True,
) -> Learned:
    """As `learn`, from the columns of the order as level positions, in the order's own sequence."""
    _check(coded, order, max_links, max_parents, graphs, seed)
    stages = candidates(order, max_parents)
    counts = _counts(coded, seed, folds)
    say = _Saying(progress, counts, stages, max_parents)

    say.begin("Counting how often levels occur together")
    scores = set_scores(counts, max_parents + 1, ess, say.within)
    say.begin("Finding the best model of every size")
    found = size_curve(stages, scores, 0, max_parents, max_links, say.within)
    if not found.parents:
        raise Refusal(
            "No model is allowed: the links you insist on do not fit the limits.",
            where="insist",
            do="Insist on fewer links, or raise the most links or parents allowed.",
        )
    say.begin("Weighing every model that the order allows")
    sure = posterior(stages, scores, max_parents, graphs, np.random.default_rng([seed, 1]), say.within)
    curve = _curve(found)
    recommended = int(curve["links"].iloc[int(curve["score"].to_numpy().argmax())])
    if folds:
        judged = _held_out(coded, counts, stages, scores, found, max_parents, max_links, seed, say)
        curve["held_out"], curve["held_out_se"] = judged.mean, judged.behind_se
        recommended = judged.recommended
    say.finish()
    return Learned(
        order,
        coded,
        curve,
        recommended,
        found.parents,
        sure,
        max_parents,
        seed,
        digest,
        _notes(stages, scores, max_parents),
    )


def _held_out(
    coded: Coded,
    counts: ArrayCounts,
    stages: tuple[tuple[Candidates, ...], ...],
    scores: SetScores,
    found: SizeCurve,
    max_parents: int,
    max_links: int | None,
    seed: int,
    say: _Saying,
) -> held_out.HeldOut:
    """Learn again without each fold, and score the fold."""
    scoring = held_out.Scoring(coded.codes, counts, tuple(found.parents))
    for fold in range(held_out.FOLDS):
        say.begin(f"Scoring part {fold + 1} of {held_out.FOLDS} of the records held out")
        again = size_curve(stages, scores, 1 + fold, max_parents, max_links, say.within)
        scoring.take(fold, again.parents, say.still)
    return scoring.result()


def _counts(coded: Coded, seed: int, folds: bool) -> ArrayCounts:
    levels = [len(each) for each in coded.levels]
    if not folds:
        return ArrayCounts(coded.codes, levels)
    return ArrayCounts(coded.codes, levels, held_out.folds(coded.codes.shape[0], seed), held_out.FOLDS)


def _curve(found: SizeCurve) -> pd.DataFrame:
    links = np.asarray(tuple(found.parents), dtype=np.int64)
    score = found.scores[links]
    blank = np.full(links.size, np.nan)
    return pd.DataFrame(
        {"links": links, "score": score, "bound": score, "held_out": blank, "held_out_se": blank.copy()}
    )


def _check(coded: Coded, order: Order, max_links: int | None, max_parents: int, graphs: int, seed: int) -> None:
    if coded.names != order.columns:
        raise AssertionError("the coded columns are not those of the order")
    if not coded.names:
        raise Refusal("The order holds no column.", where="stages", do="Put at least one column into a stage.")
    if isinstance(max_parents, bool) or not isinstance(max_parents, Integral) or not 1 <= max_parents <= MOST_PARENTS:
        raise Refusal(
            f"A column may have at most 1 to {MOST_PARENTS} parents, not {max_parents}.",
            where="max_parents",
            do="The usual number is 3.",
        )
    if max_links is not None:
        whole(max_links, "max_links", 0, "Leave it out for no limit.")
    whole(graphs, "graphs", 0, "The usual number is 200.")
    whole(seed, "seed", 0, "Give a whole number, 0 or more.")
    rows = coded.codes.shape[0]
    if rows < FEWEST_ROWS:
        raise Refusal(
            f"There are {rows} records to learn from; at least {FEWEST_ROWS} are needed.",
            where="records",
            do="Bring more records, or keep those that blanks have dropped.",
        )
    for place, (name, levels) in enumerate(zip(coded.names, coded.levels, strict=True)):
        codes = coded.codes[:, place]
        if len(levels) < 2 or codes.min() == codes.max():
            raise Refusal(
                f"Every record has the same value in {quoted(name)}, so nothing can be learned from it.",
                where=name,
                do="Take it out of the order.",
            )
        if len(levels) > MOST_LEVELS:
            raise Refusal(
                f"The column {quoted(name)} has {len(levels)} levels; at most {MOST_LEVELS} can be learned from.",
                where=name,
                do="Merge rare levels, or leave the column out.",
            )
        better = order.outcomes.get(name, ())
        if isinstance(better, Direction) and coded.kinds[place] == "category":
            raise Refusal(
                f"The outcome {quoted(name)} is a category: its levels have no order, so more of it "
                "can be neither better nor worse.",
                where=name,
                do="Name its better level or levels, or make it a grade with its levels from low to high.",
            )
        for level in () if isinstance(better, Direction) else better:
            if level not in levels:
                raise Refusal(
                    f"The outcome {quoted(name)} has no level {quoted(level)}.",
                    where=name,
                    do=f"Choose from: {', '.join(levels)}.",
                )
    check_widths([(stage.name, len(stage.columns)) for stage in order.stages])


def _notes(stages: tuple[tuple[Candidates, ...], ...], scores: SetScores, max_parents: int) -> tuple[str, ...]:
    if not any(np.isneginf(each[0]).any() for each in scores.by_size):
        return ()
    left_out = sum(Families(who, scores, 0, max_parents).left_out() for stage in stages for who in stage)
    if not left_out:
        return ()
    what = "1 set of parents was" if left_out == 1 else f"{left_out:,} sets of parents were"
    return (f"{what} left out: with their column they have more than {LARGEST:,} combinations of levels.",)


class _Saying:
    """Tells how far learning is: the fraction by a rough estimate of the seconds of each step, and words."""

    def __init__(
        self,
        progress: Progress | None,
        counts: ArrayCounts,
        stages: tuple[tuple[Candidates, ...], ...],
        max_parents: int,
    ) -> None:
        self.progress = progress
        columns = len(counts.levels)
        size = min(max_parents + 1, columns)
        parts = counts.folds if counts.folds > 1 else 0
        thousands = max(1.0, counts.rows / 1_000)
        counting = counts.seconds(size) * (2.0 if parts else 1.5)
        searching = sum(len(stage) * 2.0 ** len(stage) * columns * 2e-8 for stage in stages) + 0.02 * columns / 10
        scoring = 0.001 * columns * max_parents + 1.5e-4 * columns * thousands
        weighing = sum(len(stage) * (4.0 ** min(len(stage), 10)) * 2e-7 for stage in stages) + 0.003 * columns
        self.steps = [counting, searching, weighing, *[searching + scoring] * parts]
        self.at = -1
        self.words = ""
        self.fraction = 0.0

    def begin(self, words: str) -> None:
        self.at += 1
        self.words = words
        self.within(0.0)

    def within(self, part: float) -> None:
        """`part` of the present step is done."""
        done = sum(self.steps[: self.at]) + min(part, 1.0) * self.steps[self.at]
        self.fraction = min(max(done / sum(self.steps), self.fraction), 1.0)
        self.still()

    def still(self) -> None:
        """No further yet, but a chance to cancel."""
        if self.progress is not None:
            self.progress(self.fraction, self.words)

    def finish(self) -> None:
        self.fraction, self.words = 1.0, "Done"
        self.still()
