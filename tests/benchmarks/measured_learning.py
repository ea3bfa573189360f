"""Measures processor seconds of learning from categories; prints JSON. Run by test_learning_speed.py.

python -m tests.benchmarks.measured_learning       37 columns in 5 stages, up to 3 parents, against groupby
python -m tests.benchmarks.measured_learning four  the same, up to 4 parents
python -m tests.benchmarks.measured_learning wide  one stage of 18 columns
"""

import json
import sys
import time
from itertools import combinations
from pathlib import Path

import numpy as np
import pandas as pd
from scipy.special import gammaln

from engine.learning.learn import learn_coded
from engine.learning.scores import ESS, set_scores
from engine.records.counts import ArrayCounts, rank
from tests.benchmarks.many_columns import staged_records

COLUMNS, ROWS, STAGES, PARENTS = 37, 10_000, 5, 3
SAMPLE = 200  # families timed; the rest are taken to cost the same


def families(order, most=PARENTS):
    """(child, parents) of every family of up to `most` parents that the order allows, as positions."""
    names = order.columns
    for child, name in enumerate(names):
        leads = [place for place, other in enumerate(names) if order.may_lead(other, name)]
        for count in range(most + 1):
            yield from ((child, parents) for parents in combinations(leads, count))


def grouped_score(frame, levels, child, parents):
    """BDeu score of a family from one groupby."""
    configurations = int(np.prod([levels[parent] for parent in parents]))
    seen = frame.groupby([*parents, child], sort=False).size()
    counts = seen.unstack(fill_value=0).to_numpy() if parents else seen.to_numpy()[None, :]
    each, cell = ESS / configurations, ESS / (configurations * levels[child])
    score = (gammaln(counts + cell) - gammaln(cell)).sum()
    return score + (gammaln(each) - gammaln(each + counts.sum(axis=1))).sum()


def peak_megabytes():
    """Largest resident size of this process so far, from /proc."""
    lines = Path("/proc/self/status").read_text(encoding="utf-8").splitlines()
    return next(int(line.split()[1]) for line in lines if line.startswith("VmHWM")) / 1024


def learning_seconds(coded, order, most=PARENTS, **how):
    began = time.process_time()
    learn_coded(coded, order, max_parents=most, **how)
    return time.process_time() - began


def by_groupby(coded, order, most):
    """(families, seconds of all of them by groupby, those timed, their scores)."""
    levels = [len(each) for each in coded.levels]
    every = list(families(order, most))
    chosen = [every[place] for place in np.random.default_rng(1).choice(len(every), SAMPLE, replace=False)]
    frame = pd.DataFrame(coded.codes)
    began = time.process_time()
    grouped = [grouped_score(frame, levels, *family) for family in chosen]
    return len(every), (time.process_time() - began) / SAMPLE * len(every), chosen, grouped


def both_ways(columns, stages, most):
    """Learning with and without held-out folds and its memory, beside one groupby per family."""
    coded, order = staged_records(columns, ROWS, stages)
    learn_coded(*staged_records(6, 200, 2))  # imports and first calls are not what is measured
    before = peak_megabytes()
    seconds = learning_seconds(coded, order, most, folds=False)
    megabytes = peak_megabytes() - before
    with_folds = learning_seconds(coded, order, most)
    every, reference, _, _ = by_groupby(coded, order, most)
    return {
        "families": every,
        "reference": reference,
        "seconds": seconds,
        "with_folds": with_folds,
        "megabytes": megabytes,
        "table": coded.codes.size * 8 / 2**20,
    }


def measure():
    coded, order = staged_records(COLUMNS, ROWS, STAGES)
    levels = [len(each) for each in coded.levels]
    learn_coded(*staged_records(6, 200, 2))  # imports and first calls are not what is measured
    before = peak_megabytes()
    seconds = learning_seconds(coded, order, folds=False)
    grown = peak_megabytes() - before
    seconds = min(seconds, learning_seconds(coded, order, folds=False))
    with_folds = learning_seconds(coded, order)
    every, reference, chosen, grouped = by_groupby(coded, order, PARENTS)

    found = set_scores(ArrayCounts(coded.codes, levels), PARENTS + 1).by_size
    apart = 0.0
    for (child, parents), score in zip(chosen, grouped, strict=True):
        both = sorted((*parents, child))
        ours = found[len(both)][0, rank(both)] - found[len(parents)][0, rank(parents)]
        apart = max(apart, abs(ours - score))
    return {
        "families": every,
        "reference": reference,
        "seconds": seconds,
        "apart": apart,
        "with_folds": with_folds,
        "megabytes": grown,
        "table": coded.codes.size * 8 / 2**20,
    }


if __name__ == "__main__":
    what = {
        (): measure,
        ("four",): lambda: both_ways(COLUMNS, STAGES, 4),
        ("wide",): lambda: both_ways(18, 1, PARENTS),
    }
    print(json.dumps(what[tuple(sys.argv[1:])]()))
