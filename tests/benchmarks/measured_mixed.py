"""Measures processor seconds of learning from categories and numbers; prints JSON. Run by test_mixed_learning.py.

python -m tests.benchmarks.measured_mixed          37 columns, 10,000 records
python -m tests.benchmarks.measured_mixed long     also 20 columns, 40,000 and 400,000 records
python -m tests.benchmarks.measured_mixed growth   10 columns, 10,000 and 100,000 records
"""

import json
import sys
import time

import numpy as np
import pandas as pd
from scipy.special import gammaln

from engine.learning.evidence import counts_of, moments_of
from engine.learning.gaussian import number_scores
from engine.learning.learn import learn
from engine.learning.scores import set_scores
from engine.records.counts import rank
from engine.records.table import Table
from tests.benchmarks.measured_learning import families, grouped_score, peak_megabytes
from tests.benchmarks.mixed_networks import Truth, generated

COLUMNS, ROWS, PARENTS = 37, 10_000, 3
SAMPLE = 200  # families timed; the rest are taken to cost the same


def records(columns: int, rows: int) -> tuple[Table, Truth]:
    truth = generated(columns, 0)
    return Table.from_frame(truth.frame(truth.sample(rows, np.random.default_rng(0)))), truth


def seconds(table: Table, truth: Truth, **how: int) -> float:
    began = time.process_time()
    learn(table, truth.order, max_parents=PARENTS, **how)
    return time.process_time() - began


def regressed_score(frame, standard, categories, numbers, child):
    """The score of a number's family from one groupby and a determinant a configuration."""
    groups = [standard] if not categories else [part for _, part in standard.groupby([frame[c] for c in categories])]
    total = 0.0
    for part in groups:
        logs = []
        for columns in (numbers, [*numbers, child]):
            held, rows = len(columns), len(part)
            values = part[columns].to_numpy()
            away = values - values.sum(axis=0) / (rows + 1.0)
            scatter = away.T @ away + np.outer(values.sum(axis=0), values.sum(axis=0)) / (rows + 1.0) ** 2
            shape = held + 2.0
            score = 0.5 * held * np.log(1.0 / (1.0 + rows)) - 0.5 * rows * held * np.log(np.pi)
            score += 0.5 * shape * held * np.log(0.5)
            score -= 0.5 * (shape + rows) * np.linalg.slogdet(scatter + 0.5 * np.eye(held))[1] if held else 0.0
            for place in range(held):
                score += gammaln(0.5 * (shape + rows - place)) - gammaln(0.5 * (shape - place))
            logs.append(score)
        total += logs[1] - logs[0]
    return float(total)


def reference(table: Table, truth: Truth) -> tuple[int, float, float]:
    """(families, seconds of all of them one at a time, largest difference to the scores that learning uses)."""
    order = truth.order
    numbers = [name for name in order.columns if name.startswith("number")]
    coded = table.coded(order.columns, numbers)
    levels = [len(each) for each in coded.levels]
    every = list(families(order))
    chosen = [every[place] for place in np.random.default_rng(1).choice(len(every), SAMPLE, replace=False)]
    frame = pd.DataFrame(coded.codes)
    scale = coded.values.std(axis=0)
    standard = pd.DataFrame((coded.values - coded.values.mean(axis=0)) / scale, columns=list(coded.numbers))
    scores = []
    began = time.process_time()
    for child, parents in chosen:
        if child in coded.numbers:
            categories = [parent for parent in parents if parent not in coded.numbers]
            slopes = [parent for parent in parents if parent in coded.numbers]
            scores.append(regressed_score(frame, standard, categories, slopes, child))
        else:
            scores.append(grouped_score(frame, levels, child, parents))
    spent = (time.process_time() - began) / SAMPLE * len(every)
    moments = moments_of(coded)
    assert moments is not None
    by_counts, by_moments = set_scores(counts_of(coded), PARENTS + 1), number_scores(moments, PARENTS + 1)
    apart = 0.0
    for (child, parents), score in zip(chosen, scores, strict=True):
        found = by_moments.by_size if child in coded.numbers else by_counts.by_size
        ours = found[len(parents) + 1][0, rank(sorted((*parents, child)))] - found[len(parents)][0, rank(parents)]
        if child in coded.numbers:
            ours += ROWS * np.log(scale[coded.numbers.index(child)])
        apart = max(apart, abs(ours - score))
    return len(every), spent, apart


def measure(long: bool) -> dict[str, float]:
    seconds(*records(10, 300))  # imports and first calls are not what is measured
    table, truth = records(COLUMNS, ROWS)
    before = peak_megabytes()
    with_folds = seconds(table, truth)
    megabytes = peak_megabytes() - before
    without = seconds(table, truth, folds=False)
    found = dict(zip(("families", "reference", "apart"), reference(table, truth), strict=True))
    found |= {"seconds": without, "with_folds": with_folds, "megabytes": megabytes}
    if long:
        for rows in (40_000, 400_000):
            table, truth = records(20, rows)
            before = peak_megabytes()
            found[f"seconds_{rows}"] = seconds(table, truth, folds=False)
            found[f"megabytes_{rows}"] = peak_megabytes() - before
        found["peak"] = peak_megabytes()
    return found


def growth() -> dict[str, float]:
    """Seconds with held-out folds, without drawn graphs, so that the records are most of the work."""
    seconds(*records(10, 300))
    tables = {rows: records(10, rows) for rows in (10_000, 100_000)}
    return {f"seconds_{rows}": min(seconds(*made, graphs=0) for _ in range(2)) for rows, made in tables.items()}


if __name__ == "__main__":
    print(json.dumps(growth() if "growth" in sys.argv[1:] else measure("long" in sys.argv[1:])))
