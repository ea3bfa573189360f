"""From a row of the database to a Study, and from a frame and choices to a Table."""

from __future__ import annotations

import json
import sqlite3
from datetime import datetime

import pandas as pd

from app.store.values import Asked, Choices, Plan, Study, basis
from engine.records.table import Table


def study_of(row: sqlite3.Row) -> Study:
    choices, plan = Choices.from_json(row["choices"]), Plan.from_json(row["plan"])
    current = row["learned_basis"] == basis(row["digest"], choices, plan)
    return Study(
        key=row["key"],
        name=row["name"],
        created=datetime.fromisoformat(row["created"]),
        source=row["source"],
        sample=row["sample"],
        rows=row["rows"],
        columns=row["columns"],
        digest=row["digest"],
        choices=choices,
        plan=plan,
        warnings=tuple(json.loads(row["warnings"])),
        mended=tuple(json.loads(row["mended"])),
        links=row["links"],
        recommended=row["recommended"],
        max_parents=row["max_parents"],
        model="none" if row["learned_file"] is None else "current" if current else "old",
        asked=row["asked"],
        last=None if row["last"] is None else Asked.from_json(row["last"]),
    )


def table_of(frame: pd.DataFrame, choices: Choices, name: str) -> Table:
    """Raises Refusal when the frame holds nothing to learn from or the choices do not fit it."""
    return Table.from_frame(
        frame,
        kinds=dict(choices.kinds),
        bands={column: list(cuts) for column, cuts in choices.bands.items()},
        grades={column: list(levels) for column, levels in choices.grades.items()},
        blanks=dict(choices.blanks),
        units=dict(choices.units),
        name=name,
    )
