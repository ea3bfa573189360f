"""Held-out scores: fold by fold as computed plainly, and the paired rule that recommends a size."""

import numpy as np
import pytest

from engine.learning import held_out
from engine.learning.folds import FOLDS, folds
from engine.learning.held_out import HeldOut, Scoring
from engine.learning.learn import learn_coded
from engine.network.parameters import prior_weight, smoothed_shares
from engine.order import Order
from engine.records.counts import ArrayCounts
from tests.learning import plainly


def chain(rows=240, seed=0):
    rng = np.random.default_rng(seed)
    codes = rng.integers(0, 3, (rows, 4))
    for place in (1, 2, 3):
        copied = rng.random(rows) < 0.7
        codes[copied, place] = codes[copied, place - 1]
    order = Order([("Early", ["a", "b"]), ("Late", ["c", "d"])])
    return order, (3, 3, 3, 3), codes


def log_shares(codes, levels, child, parents):
    """Predictive log shares of one family as a dictionary by configuration."""
    shares = smoothed_shares(np.bincount(codes[:, child], minlength=levels[child]))
    shape = [levels[parent] for parent in parents]
    counts = np.zeros((*shape, levels[child]))
    for row in codes:
        counts[(*row[list(parents)], row[child])] += 1
    weight = prior_weight(counts.reshape(-1, levels[child]), shares)
    posterior = counts + weight * shares
    return np.log(posterior / posterior.sum(axis=-1, keepdims=True))


def test_each_record_is_scored_by_the_model_learned_without_its_fold():
    order, levels, codes = chain()
    coded = plainly.coded_columns(order.columns, levels, codes)
    learned = learn_coded(coded, order, max_parents=2, seed=7)
    fold = folds(len(codes), 7)
    sizes = learned.curve["links"].tolist()
    scores = np.zeros((len(sizes), len(codes)))
    for held in range(FOLDS):
        rest = codes[fold != held]
        again = learn_coded(plainly.coded_columns(order.columns, levels, rest), order, max_parents=2, folds=False)
        for place, links in enumerate(sizes):
            for child, parents in enumerate(again.chosen[links]):
                logs = log_shares(rest, levels, child, parents)
                for row in np.flatnonzero(fold == held):
                    scores[place, row] += logs[(*codes[row, list(parents)], codes[row, child])]
    best = int(scores.mean(axis=1).argmax())
    gaps = scores - scores[best]
    assert learned.curve["held_out"].to_numpy() == pytest.approx(scores.mean(axis=1), abs=1e-9)
    told = gaps.std(axis=1, ddof=1) / np.sqrt(len(codes))
    assert learned.curve["held_out_se"].to_numpy() == pytest.approx(told, abs=1e-9)
    within = np.flatnonzero(gaps.mean(axis=1) + told >= 0)
    assert learned.recommended == sizes[within[0]]


def test_the_smallest_size_within_one_paired_error_is_recommended():
    links, mean = (0, 1, 2, 3), np.asarray([-3.0, -2.02, -2.0, -2.5])
    behind = mean - mean.max()
    close = HeldOut(links, mean, behind, np.asarray([0.5, 0.03, 0.0, 0.1]))
    far = HeldOut(links, mean, behind, np.asarray([0.5, 0.01, 0.0, 0.1]))
    assert close.recommended == 1 and far.recommended == 2


def test_scoring_in_blocks_changes_nothing(monkeypatch):
    order, levels, codes = chain(rows=500)
    coded = plainly.coded_columns(order.columns, levels, codes)
    whole = learn_coded(coded, order)
    monkeypatch.setattr(held_out, "_ROWS", 17)
    blocks = learn_coded(coded, order)
    assert blocks.recommended == whole.recommended
    for name in ("held_out", "held_out_se"):
        assert blocks.curve[name].to_numpy() == pytest.approx(whole.curve[name].to_numpy(), abs=1e-9)


def test_folds_are_even_and_follow_the_seed():
    one = folds(103, 5)
    assert np.array_equal(one, folds(103, 5)) and not np.array_equal(one, folds(103, 6))
    assert np.bincount(one).tolist() == [21, 21, 21, 20, 20]


def test_a_level_seen_only_in_the_held_out_fold_scores_finitely():
    codes = np.zeros((40, 2), dtype=np.int64)
    codes[::2, 0] = 1
    codes[7, 1] = 2
    codes[8, 1] = 1
    fold = np.arange(40) % FOLDS
    coded = plainly.coded_columns(("a", "b"), (2, 3), codes)
    scoring = Scoring(coded, ArrayCounts(codes, (2, 3), fold, FOLDS), None, (0, 1))
    for held in range(FOLDS):
        scoring.take(held, {0: ((), ()), 1: ((), (0,))})
    assert np.isfinite(scoring.result().mean).all()


def test_links_that_made_the_records_are_recommended_and_no_more():
    order, levels, codes = chain(rows=3_000, seed=1)
    learned = learn_coded(plainly.coded_columns(order.columns, levels, codes), order)
    assert learned.recommended == 3
    assert {tuple(sorted(pair)) for pair in learned.network().links} == {("a", "b"), ("b", "c"), ("c", "d")}
