"""Measures learning in a process of its own with one BLAS thread; prints JSON. Run by test_learning_speed.py."""

import json
import time
from itertools import combinations
from pathlib import Path

import numpy as np
import pandas as pd
from scipy.special import gammaln

from engine.learning.learn import learn_coded
from engine.learning.scores import set_scores
from engine.records.counts import ArrayCounts, rank
from tests.benchmarks.many_columns import staged_records

COLUMNS, ROWS, STAGES, PARENTS = 37, 10_000, 5, 3
SAMPLE = 200  # families timed; the rest are taken to cost the same


def families(order):
    """(child, parents) of every family the order allows, as positions."""
    names = order.columns
    for child, name in enumerate(names):
        leads = [place for place, other in enumerate(names) if order.may_lead(other, name)]
        for count in range(PARENTS + 1):
            yield from ((child, parents) for parents in combinations(leads, count))


def grouped_score(frame, levels, child, parents):
    """BDeu score of a family from one groupby."""
    configurations = int(np.prod([levels[parent] for parent in parents]))
    seen = frame.groupby([*parents, child], sort=False).size()
    counts = seen.unstack(fill_value=0).to_numpy() if parents else seen.to_numpy()[None, :]
    each, cell = 1.0 / configurations, 1.0 / (configurations * levels[child])
    score = (gammaln(counts + cell) - gammaln(cell)).sum()
    return score + (gammaln(each) - gammaln(each + counts.sum(axis=1))).sum()


def peak_megabytes():
    """Largest resident size of this process so far, from /proc."""
    lines = Path("/proc/self/status").read_text(encoding="utf-8").splitlines()
    return next(int(line.split()[1]) for line in lines if line.startswith("VmHWM")) / 1024


def learning_seconds(coded, order, **how):
    began = time.perf_counter()
    learn_coded(coded, order, max_parents=PARENTS, **how)
    return time.perf_counter() - began


def measure():
    coded, order = staged_records(COLUMNS, ROWS, STAGES)
    levels = [len(each) for each in coded.levels]
    learn_coded(*staged_records(6, 200, 2))  # imports and first calls are not what is measured
    before = peak_megabytes()
    with_folds = learning_seconds(coded, order)
    grown = peak_megabytes() - before

    every = list(families(order))
    chosen = [every[place] for place in np.random.default_rng(1).choice(len(every), SAMPLE, replace=False)]
    frame = pd.DataFrame(coded.codes)
    began = time.perf_counter()
    grouped = [grouped_score(frame, levels, *family) for family in chosen]
    reference = (time.perf_counter() - began) / SAMPLE * len(every)
    seconds = min(learning_seconds(coded, order, folds=False) for _ in range(3))

    found = set_scores(ArrayCounts(coded.codes, levels), PARENTS + 1).by_size
    apart = 0.0
    for (child, parents), score in zip(chosen, grouped, strict=True):
        both = sorted((*parents, child))
        ours = found[len(both)][0, rank(both)] - found[len(parents)][0, rank(parents)]
        apart = max(apart, abs(ours - score))
    return {
        "families": len(every),
        "reference": reference,
        "seconds": seconds,
        "apart": apart,
        "with_folds": with_folds,
        "megabytes": grown,
    }


if __name__ == "__main__":
    print(json.dumps(measure()))
