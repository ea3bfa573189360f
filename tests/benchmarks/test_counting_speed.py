"""Counting long tables: against products of one-hot columns in the same process, and as the rows grow."""

import time

import numpy as np
import pytest

from engine.records.counts import ArrayCounts
from engine.records.products import Walk
from tests.benchmarks.many_columns import staged_records

MARGIN = 3.0  # what other work on the machine may cost
TIMES = 5.0  # as measured, at 200,000 rows and 20 columns


def seconds(blocks):
    began = time.process_time()
    assert sum(block.ranks.size for block in blocks) > 0
    return time.process_time() - began


def a_long_table(rows):
    coded, _ = staged_records(20, rows, 5)
    return np.asfortranarray(coded.codes, dtype=np.int64), [len(each) for each in coded.levels]


@pytest.mark.benchmark
def test_long_tables_are_counted_faster_than_by_products_and_in_step_with_rows(capsys):
    codes, levels = a_long_table(200_000)
    fold = np.zeros(len(codes), dtype=np.int64)
    chosen = min(seconds(ArrayCounts(codes, levels).blocks(4)) for _ in range(2))
    walked = seconds(Walk(codes, levels, fold, 1, 4, lambda part: None).blocks())
    twice = min(seconds(ArrayCounts(*a_long_table(400_000)).blocks(4)) for _ in range(2))
    with capsys.disabled():
        print(f"\n200,000 rows: {chosen:.2f} s, {walked / chosen:.1f} times faster; 400,000 rows: {twice:.2f} s")
    assert walked / chosen > TIMES / MARGIN
    assert twice / chosen < 2.0 * MARGIN
