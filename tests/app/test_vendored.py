"""Vendored browser libraries: licence, version, checksum."""

import hashlib
import json
from pathlib import Path

import pytest

VENDOR = Path(__file__).parents[2] / "static" / "vendor"
ENTRIES = json.loads((VENDOR / "VENDORED.json").read_text(encoding="utf-8"))


@pytest.mark.parametrize("entry", ENTRIES, ids=lambda entry: entry["name"])
def test_every_file_is_the_one_that_was_recorded(entry):
    for name, recorded in entry["files"].items():
        assert hashlib.sha256((VENDOR / name).read_bytes()).hexdigest() == recorded, name


@pytest.mark.parametrize("entry", ENTRIES, ids=lambda entry: entry["name"])
def test_every_library_carries_its_version_and_its_licence(entry):
    licence = [name for name in entry["files"] if name.endswith("LICENSE")]
    scripts = [name for name in entry["files"] if name.endswith(".js")]
    assert len(licence) == 1
    assert scripts
    assert entry["licence"]
    for name in scripts:
        assert entry["version"] in (VENDOR / name).read_text(encoding="utf-8")


def test_nothing_is_vendored_that_is_not_recorded():
    lying = {path.relative_to(VENDOR).as_posix() for path in VENDOR.rglob("*") if path.is_file()} - {"VENDORED.json"}
    assert lying == {name for entry in ENTRIES for name in entry["files"]}
