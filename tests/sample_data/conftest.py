"""The evening school: its script, as a module, and the files that were made by it."""

import importlib.util
import json
import sys
from pathlib import Path

import pandas as pd
import pytest

SAMPLES = Path(__file__).parents[2] / "sample_data"
FOLDER = SAMPLES / "lantern_street"


@pytest.fixture(scope="session")
def script():
    spec = importlib.util.spec_from_file_location("make_the_samples", SAMPLES / "make.py")
    module = importlib.util.module_from_spec(spec)
    sys.modules[spec.name] = module  # dataclasses look their module up
    spec.loader.exec_module(module)
    yield module
    del sys.modules[spec.name]


@pytest.fixture(scope="session")
def records():
    return pd.read_csv(FOLDER / "records.csv", dtype=str, keep_default_na=False)


@pytest.fixture(scope="session")
def study():
    return json.loads((FOLDER / "study.json").read_text(encoding="utf-8"))


@pytest.fixture(scope="session")
def effects():
    """(column, outcome, level of shift work or None) -> the entry of truth.json."""
    entries = json.loads((FOLDER / "truth.json").read_text(encoding="utf-8"))["effects"]
    return {(each["column"], each["outcome"], each["among"].get("shift work")): each for each in entries}


@pytest.fixture(scope="session")
def codebook():
    return (FOLDER / "codebook.md").read_text(encoding="utf-8")
