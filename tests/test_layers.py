"""The house is straight: no room of engine imports one that stands after it, and engine never imports app."""

import ast
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parent.parent
ENGINE = ROOT / "engine"
ROOMS = ["refusal", "order", "records", "network", "learning", "answering", "doubting", "judging", "weighing", "model"]
ALLOWED_OUTSIDE = {"numpy", "scipy", "pandas"}
READERS = {"pyarrow", "openpyxl", "defusedxml"}  # records reads files with these


def imported(path, text=None):
    """Dotted names that a module imports, also inside functions; relative imports spelt out."""
    found = []
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8") if text is None else text)):
        if isinstance(node, ast.Import):
            found += [name.name for name in node.names]
        elif isinstance(node, ast.ImportFrom):
            module = node.module or ""
            if node.level:
                package = path.relative_to(ROOT).with_suffix("").parts[: -node.level]
                module = ".".join((*package, *([module] if module else [])))
            found += [f"{module}.{name.name}" for name in node.names] if module == "engine" else [module]
    return found


def room(path):
    parts = path.relative_to(ENGINE).with_suffix("").parts
    return "__init__" if parts == ("__init__",) else parts[0]


MODULES = sorted(ENGINE.rglob("*.py"))


def steps_back(path, text=None):
    """What a module of engine imports although it stands further down the house."""
    here = room(path)
    if here == "__init__":
        return []  # the facade may import every room
    rooms = [name.split(".")[1] if "." in name else "__init__" for name in imported(path, text) if _engine(name)]
    return [there for there in rooms if there not in ROOMS or ROOMS.index(there) > ROOMS.index(here)]


def _engine(name):
    return name == "engine" or name.startswith("engine.")


@pytest.mark.parametrize("path", MODULES, ids=lambda path: str(path.relative_to(ROOT)))
def test_a_room_imports_only_rooms_before_it(path):
    assert room(path) in (*ROOMS, "__init__"), f"{path} is in no room: add it to ROOMS where it stands"
    assert steps_back(path) == []


@pytest.mark.parametrize("path", MODULES, ids=lambda path: str(path.relative_to(ROOT)))
def test_engine_knows_no_app_and_few_packages(path):
    allowed = ALLOWED_OUTSIDE | {"engine"} | set(sys.stdlib_module_names)
    allowed |= READERS if room(path) == "records" else set()
    allowed |= {"sklearn", "threadpoolctl"} if room(path) == "judging" else set()
    assert {name.split(".")[0] for name in imported(path)} <= allowed


def test_only_the_facade_and_the_app_import_the_model():
    guilty = [path for path in MODULES if room(path) not in ("__init__", "model") and "engine.model" in imported(path)]
    assert guilty == []


def test_a_step_back_would_be_found():
    records = ENGINE / "records" / "table.py"
    assert steps_back(records, "from engine.network.network import Network") == ["network"]
    assert steps_back(records, "def late():\n    from ..learning import learn") == ["learning"]
    assert steps_back(records, "import engine") == ["__init__"]
    assert steps_back(records, "from engine.order import Order\nimport numpy") == []


def test_modules_have_telling_names_and_stay_rooms():
    forbidden = {"utils", "util", "helpers", "common", "misc", "manager"}
    for path in MODULES:
        assert path.stem not in forbidden and not any(letter.isdigit() for letter in path.stem), path
        assert len(path.read_text(encoding="utf-8").splitlines()) <= 400, f"{path} is two rooms"
