"""A small table of records, and a store in a folder of its own."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from app.jobs import Jobs
from app.store import Plan, Store


@pytest.fixture(scope="session")
def visits() -> pd.DataFrame:
    """240 invented visits: a number with ties and blanks, three categories, and one column that is always the same."""
    rng = np.random.default_rng(7)
    rows = 240
    shift = rng.choice(["days", "nights", "mixed"], rows, p=[0.5, 0.3, 0.2])
    mentor = np.where(rng.random(rows) < np.where(shift == "nights", 0.7, 0.3), "yes", "no")
    passed = np.where(rng.random(rows) < 0.3 + 0.25 * (mentor == "yes") + 0.2 * (shift == "days"), "yes", "no")
    age = rng.integers(18, 70, rows).astype(float)
    age[rng.random(rows) < 0.05] = np.nan
    return pd.DataFrame({"age": age, "shift": shift, "mentor": mentor, "passed": passed, "town": "Tern"})


@pytest.fixture(scope="session")
def visits_plan() -> Plan:
    return Plan(
        stages=(("Background", ("age", "shift")), ("Programme", ("mentor",)), ("Result", ("passed",))),
        changeable=("mentor",),
        outcomes={"passed": ("yes",)},
    )


@pytest.fixture
def store(tmp_path: Path) -> Iterator[Store]:
    store = Store(tmp_path / "data")
    yield store
    store.close()


@pytest.fixture
def jobs(store: Store) -> Iterator[Jobs]:
    jobs = Jobs(store)
    yield jobs
    jobs.close()
