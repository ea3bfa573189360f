"""Learning from categories and numbers: against scoring one family at a time, and against what made the records.

A few networks are measured by default; STEELYARD_BENCHMARKS=all takes all twelve, long tables and short ones too.
"""

import json
import os
import subprocess
import sys

import pytest

ALL = os.environ.get("STEELYARD_BENCHMARKS") == "all"
AIM, MARGIN = 100.0, 3.0  # times faster; what other work on the machine may cost
FOLDS = 12.0 / 6.0  # times as long with held-out folds as without
SHARE, SHORT = 0.99, 0.03  # of the generating model's gain; nats a row


def measured(module, *how):
    done = subprocess.run(
        [sys.executable, "-m", f"tests.benchmarks.{module}", *how],
        capture_output=True,
        text=True,
        check=True,
        env={**os.environ, "OPENBLAS_NUM_THREADS": "1"},
    )
    return [json.loads(line) for line in done.stdout.splitlines()]


@pytest.mark.benchmark
@pytest.mark.skipif(not sys.platform.startswith("linux"), reason="peak memory is read from /proc")
def test_learning_numbers_beats_scoring_one_family_at_a_time(capsys):
    (found,) = measured("measured_mixed", *(["long"] if ALL else []))
    ratio = found["reference"] / found["seconds"]
    with capsys.disabled():
        print(
            f"\n18 categories and 19 numbers, {found['families']:,} families: {found['reference']:.0f} s one by one, "
            f"{found['seconds']:.1f} s learned (aim 6), {ratio:.0f} times faster (aim {AIM:.0f}); with held-out folds "
            f"{found['with_folds']:.1f} s (aim 12) and {found['megabytes']:.0f} MB above start"
        )
        if ALL:
            print(
                f"20 mixed columns without held-out folds: {found['seconds_40000']:.1f} s of 40,000 records, "
                f"{found['seconds_400000']:.1f} s of 400,000 (aim 8), {found['peak']:.0f} MB in all (aim 1,000)"
            )
    assert found["apart"] < 1e-6
    assert ratio > AIM / MARGIN
    assert found["with_folds"] / found["seconds"] < FOLDS * MARGIN
    if ALL:
        assert found["seconds_400000"] / found["seconds_40000"] < 10.0 * MARGIN
        assert found["peak"] < 1_000.0


@pytest.mark.benchmark
def test_ten_times_the_records_take_no_more_than_ten_times_as_long(capsys):
    (found,) = measured("measured_mixed", "growth")
    ratio = found["seconds_100000"] / found["seconds_10000"]
    with capsys.disabled():
        print(
            f"\n10 mixed columns with held-out folds: {found['seconds_10000']:.2f} s of 10,000 records, "
            f"{found['seconds_100000']:.2f} s of 100,000, {ratio:.1f} times"
        )
    assert ratio < 10.0


@pytest.mark.benchmark
def test_what_made_the_records_is_found_again(capsys):
    found = measured("measured_recovery", "12" if ALL else "3")
    with capsys.disabled():
        _tell("10,000 records", found)
    assert min(each["share"] for each in found) > SHARE
    assert sum(each["short"] for each in found) / len(found) < SHORT


@pytest.mark.benchmark
@pytest.mark.skipif(not ALL, reason="has no aim and is only printed: STEELYARD_BENCHMARKS=all")
@pytest.mark.parametrize("how", ["1000", "10000 skewed", "10000 logistic", "1000 skewed logistic"])
def test_what_short_tables_skewed_noise_and_logistic_causes_cost_is_told(capsys, how):
    found = measured("measured_recovery", "12", *how.split())
    with capsys.disabled():
        _tell(how, found)
    assert len(found) == 12


@pytest.mark.benchmark
@pytest.mark.skipif(not ALL, reason="takes minutes: STEELYARD_BENCHMARKS=all")
def test_arrival_delays_are_told_no_worse_than_by_least_squares_on_the_same_columns(capsys):
    (found,) = measured("measured_flights")
    error, log_density = found["least_squares_on_parents"]
    with capsys.disabled():
        print(
            f"\n{found['rows']:,} flights, up to 4 parents: {found['seconds']:.1f} s (aim 20), with held-out folds "
            f"{found['with_folds']:.1f} s, {found['megabytes']:.0f} MB in all (aim 1,200)\n"
            f"held out, given {', '.join(found['parents'])}: error and log density\n"
            f"  learned                       {found['error']:.3f} minutes  {found['log_density']:.4f}\n"
            f"  least squares on these        {error:.3f} minutes  {log_density:.4f}\n"
            "  least squares on all columns  {:.3f} minutes  {:.4f}".format(*found["least_squares_on_all"])
        )
    assert found["error"] <= error and found["log_density"] >= log_density
    assert found["megabytes"] < 1_200.0


def _tell(what, found):
    print(f"\n{what}: columns, links, found; nats a row short; share of the gain; precision, recall; seconds")
    for each in found:
        print(
            f"{each['columns']:>4} {each['links']:>3} {each['found']:>3}  {each['short']:.4f}  {each['share']:.4f}  "
            f"{each['precision']:.2f} {each['recall']:.2f}  {each['seconds']:.1f}"
        )
    short, share = (sum(each[name] for each in found) / len(found) for name in ("short", "share"))
    print(f"mean           {short:.4f}  {share:.4f}")
