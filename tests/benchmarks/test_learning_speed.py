"""Learning against one pandas groupby per family, in the same process; and its time and memory with held-out folds."""

import json
import os
import subprocess
import sys
import time
from itertools import combinations

import numpy as np
import pandas as pd
import pytest
from scipy.special import gammaln

from engine.learning.learn import learn_coded
from engine.learning.scores import set_scores
from engine.records.counts import ArrayCounts, rank
from tests.benchmarks.many_columns import staged_records

COLUMNS, ROWS, STAGES, PARENTS = 37, 10_000, 5, 3
SAMPLE = 200  # families timed; the rest are taken to cost the same
AIM, MARGIN = 100.0, 3.0

MEASURED_APART = """
import json, time
from pathlib import Path
from engine.learning.learn import learn_coded
from tests.benchmarks.many_columns import staged_records
def peak():
    lines = Path("/proc/self/status").read_text().splitlines()
    return next(int(line.split()[1]) for line in lines if line.startswith("VmHWM")) / 1024
coded, order = staged_records({columns}, {rows}, {stages})
learn_coded(*staged_records(6, 200, 2))
before = peak()
began = time.perf_counter()
learned = learn_coded(coded, order, max_parents={parents})
seconds = time.perf_counter() - began
print(json.dumps([seconds, peak() - before, learned.recommended]))
"""


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


@pytest.mark.benchmark
def test_learning_beats_one_groupby_per_family(capsys):
    coded, order = staged_records(COLUMNS, ROWS, STAGES)
    levels = [len(each) for each in coded.levels]
    every = list(families(order))
    chosen = np.random.default_rng(1).choice(len(every), SAMPLE, replace=False)
    frame = pd.DataFrame(coded.codes)
    found = set_scores(ArrayCounts(coded.codes, levels), PARENTS + 1)

    began = time.perf_counter()
    grouped = [grouped_score(frame, levels, *every[place]) for place in chosen]
    reference = (time.perf_counter() - began) / SAMPLE * len(every)
    seconds = []
    for _ in range(3):
        began = time.perf_counter()
        learn_coded(coded, order, max_parents=PARENTS, folds=False)
        seconds.append(time.perf_counter() - began)
    ratio = reference / min(seconds)

    for place, score in zip(chosen, grouped, strict=True):
        child, parents = every[place]
        with_child = sorted((*parents, child))
        ours = found.by_size[len(with_child)][0, rank(with_child)] - found.by_size[len(parents)][0, rank(parents)]
        assert ours == pytest.approx(score, abs=1e-6, rel=0)
    with capsys.disabled():
        print(
            f"\n{len(every):,} families: {reference:.0f} s by groupby, {min(seconds):.2f} s learned, "
            f"{ratio:.0f} times faster (aim {AIM:.0f})"
        )
    assert ratio > AIM / MARGIN


@pytest.mark.benchmark
@pytest.mark.skipif(not sys.platform.startswith("linux"), reason="peak memory is read from /proc")
def test_learning_with_held_out_folds_is_timed_and_weighed(capsys):
    code = MEASURED_APART.format(columns=COLUMNS, rows=ROWS, stages=STAGES, parents=PARENTS)
    done = subprocess.run(
        [sys.executable, "-c", code],
        capture_output=True,
        text=True,
        check=True,
        env={**os.environ, "OPENBLAS_NUM_THREADS": "1"},
        cwd=os.getcwd(),
    )
    seconds, megabytes, recommended = json.loads(done.stdout)
    with capsys.disabled():
        print(
            f"\nWith held-out folds: {seconds:.1f} s (aim 12), {megabytes:.0f} MB above start (aim 250), "
            f"{recommended} links recommended"
        )
    assert megabytes < MARGIN * 250
