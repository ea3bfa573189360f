"""Learning: a table and an order become the best model of every size."""

from __future__ import annotations

from collections.abc import Sequence
from functools import partial

import numpy as np
import pandas as pd

from engine.learning.cap import Capped, capped
from engine.learning.cap import seconds as trying_seconds
from engine.learning.checks import check_coded, check_groups, check_limits, check_rows, check_table, numbers_to_learn
from engine.learning.cuts import banded, number_cuts
from engine.learning.evidence import counts_of, moments_of
from engine.learning.families import Candidates, Families, candidates
from engine.learning.folds import FOLDS
from engine.learning.folds import folds as dealt
from engine.learning.gaussian import number_scores
from engine.learning.held_out import Scoring
from engine.learning.learned import Learned
from engine.learning.mixed import FamilyScores, MixedScores, mixed_scores
from engine.learning.posterior import posterior
from engine.learning.progress import Looking, Progress, Saying
from engine.learning.scores import ESS, set_scores
from engine.learning.search import SizeCurve, size_curve
from engine.order import Order
from engine.records.counts import LARGEST, ArrayCounts
from engine.records.moments import ArrayMoments
from engine.records.table import Coded, Table
from engine.records.wording import listing
from engine.refusal import Refusal, quoted


def learn(
    table: Table,
    order: Order,
    max_links: int | None = None,
    max_parents: int = 3,
    graphs: int = 200,
    seed: int = 0,
    progress: Progress | None = None,
    ess: float = ESS,
    folds: bool = True,
) -> Learned:
    """Find the best model at every number of links, and say which number predicts held-out records well enough.

    Numbers are learned as numbers where they vary smoothly; the others as bands, which the notes say and why.

    max_links: stop the curve there; None: every number that the order and `max_parents` (1 to 5) allow.
    graphs: how many to draw from the posterior over all graphs that the order allows.
    progress(fraction, words) is called often; raising inside it cancels.  ess: equivalent sample size of the score.
    folds: False leaves the held-out scores out and recommends the size with the best score.

    Raises Refusal for records or an order that cannot be learned from.
    """
    check_table(table, order)
    check_limits(max_links, max_parents, graphs, seed)
    check_rows(table)
    look = Looking(progress)
    numbers, notes = numbers_to_learn(table, order, max_parents, look.within)
    coded = table.coded(order.columns, numbers, partial(_linked, order))
    return learn_coded(coded, order, table.digest, max_links, max_parents, graphs, seed, look.after, ess, folds, notes)


def learn_coded(
    coded: Coded,
    order: Order,
    digest: str = "",
    max_links: int | None = None,
    max_parents: int = 3,
    graphs: int = 200,
    seed: int = 0,
    progress: Progress | None = None,
    ess: float = ESS,
    folds: bool = True,
    notes: Sequence[str] = (),
) -> Learned:
    """As `learn`, from the columns of the order as level positions and values, in the order's own sequence.

    notes: sentences about how they were coded, kept with what is learned.
    """
    check_limits(max_links, max_parents, graphs, seed)
    check_coded(coded, order)
    coded = banded(coded, number_cuts(coded))
    if folds:
        check_groups(coded.group)
    stages = candidates(order, max_parents)
    fold, parts = (dealt(coded.codes.shape[0], seed, coded.group), FOLDS) if folds else (None, 1)
    look = Looking(progress)
    counts, moments = counts_of(coded, fold, parts), moments_of(coded, fold, parts, partial(look.within, 0.0))
    say = Saying(progress, counts, moments, stages, max_parents)

    scores = _scores(counts, moments, max_parents + 1, ess, say)
    say.begin("Finding the best model of every size")
    found = size_curve(stages, scores, 0, max_parents, max_links, say.within)
    if not found.parents:
        raise Refusal(
            "No model is allowed: the links you insist on do not fit the limits.",
            where="insist",
            do="Insist on fewer links, or raise the most links or parents allowed.",
        )
    likeliest = found.parents[max(found.parents, key=lambda links: float(found.scores[links]))]
    say.expect_of_last(trying_seconds(counts.rows, coded.numbers, stages, likeliest, max_parents))
    say.begin("Weighing every model that the order allows")
    sure = posterior(stages, scores, max_parents, graphs, np.random.default_rng([seed, 1]), say.within)
    curve = _curve(found)
    recommended = int(curve["links"].iloc[int(curve["score"].to_numpy().argmax())])
    if folds:
        scoring = Scoring(coded, counts, moments, tuple(found.parents))
        for part in range(FOLDS):
            say.begin(f"Scoring part {part + 1} of {FOLDS} of the records held out")
            again = size_curve(stages, scores, 1 + part, max_parents, max_links, say.within)
            scoring.take(part, again.parents, say.still)
        judged = scoring.result()
        curve["held_out"], curve["held_out_se"] = judged.mean, judged.behind_se
        recommended = judged.recommended
    say.begin("Trying one parent more where the limit was reached")
    cap = capped(coded, counts, moments, stages, found.parents[recommended], scores, max_parents, ess, say.within)
    said = (*notes, *_left_out(stages, scores, max_parents), *at_cap(cap, max_parents))
    say.finish()
    return Learned(order, coded, curve, recommended, found.parents, sure, max_parents, seed, digest, said, cap)


def _linked(order: Order, one: str, other: str) -> bool:
    return order.may_lead(one, other) or order.may_lead(other, one)


def _scores(counts: ArrayCounts, moments: ArrayMoments | None, size: int, ess: float, say: Saying) -> MixedScores:
    say.begin("Counting how often levels occur together")
    categories = set_scores(counts, size, ess, say.within)
    if moments is None:
        return mixed_scores(categories, None, ())
    say.begin("Adding up how numbers vary together")
    numbers = number_scores(moments, size, categories.grain, say.within)
    return mixed_scores(categories, numbers, moments.numbers.columns)


def _curve(found: SizeCurve) -> pd.DataFrame:
    links = np.asarray(tuple(found.parents), dtype=np.int64)
    score = found.scores[links]
    blank = np.full(links.size, np.nan)
    return pd.DataFrame(
        {"links": links, "score": score, "bound": score, "held_out": blank, "held_out_se": blank.copy()}
    )


def _left_out(stages: tuple[tuple[Candidates, ...], ...], scores: FamilyScores, max_parents: int) -> tuple[str, ...]:
    """A sentence about families too large to count, if there are any."""
    left_out = sum(Families(who, scores, 0, max_parents).left_out() for stage in stages for who in stage)
    if not left_out:
        return ()
    what = "1 set of parents was" if left_out == 1 else f"{left_out:,} sets of parents were"
    return (f"{what} left out: with their column they have more than {LARGEST:,} combinations of levels.",)


def at_cap(cap: Sequence[Capped], max_parents: int) -> tuple[str, ...]:
    """A sentence about columns that want more parents than were allowed, if there are any."""
    if not cap:
        return ()
    names = listing([quoted(each.column) for each in cap], 12)
    verb = "is" if len(cap) == 1 else "are each"
    parents = "1 parent" if max_parents == 1 else f"{max_parents} parents"
    return (f"{names} {verb} described better with {max_parents + 1} parents than with {parents}, the most allowed.",)
