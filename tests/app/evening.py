"""An evening school in miniature with a model of it, for the tests of Ask."""

from __future__ import annotations

import numpy as np
import pandas as pd

import engine
from app.store import Plan, Store, Study
from app.store.rows import table_of


def evening(rows: int = 600, seed: int = 3) -> pd.DataFrame:
    """Invented learners. A mentor goes to those on nights and helps them pass; nobody over 60 ever had one."""
    rng = np.random.default_rng(seed)
    shift = rng.choice(["days", "nights", "mixed"], rows, p=[0.5, 0.3, 0.2])
    age = rng.choice(["under 60", "60 and over"], rows, p=[0.97, 0.03])
    mentor = np.where((rng.random(rows) < np.where(shift == "nights", 0.6, 0.2)) & (age == "under 60"), "yes", "no")
    turned_up = np.where(rng.random(rows) < 0.35 + 0.4 * (mentor == "yes"), "most", "some")
    passed = np.where(rng.random(rows) < 0.15 + 0.5 * (turned_up == "most") + 0.2 * (shift == "days"), "yes", "no")
    tutor = rng.choice([f"tutor {letter}" for letter in "abcdefghi"], rows)
    names = ["age", "shift work", "tutor", "mentor", "turned up", "passed"]
    return pd.DataFrame(dict(zip(names, [age, shift, tutor, mentor, turned_up, passed], strict=True)))


PLAN = Plan(
    stages=(
        ("Before", ("age", "shift work", "tutor")),
        ("Offered", ("mentor",)),
        ("During", ("turned up",)),
        ("After", ("passed",)),
    ),
    insist=(("age", "mentor"), ("shift work", "mentor"), ("mentor", "turned up"), ("turned up", "passed")),
    changeable=("mentor",),
    outcomes={"passed": ("yes",)},
)


def keep_a_model(store: Store, study: Study) -> Study:
    """Learn here and now, without a process of its own."""
    table = table_of(store.table(study.key).frame, study.choices, study.name)
    learned = engine.learn(table, study.plan.order())
    path = store.files(study.key) / "a.unfinished"
    learned.save(path)
    store.keep_learned(study.key, path, study.basis)
    return store.study(study.key)
