"""What travels in the wheel, and that an installed copy finds it."""

import subprocess
import sys
import zipfile
from pathlib import Path

import pytest

from app.resources import resource

ROOT = Path(__file__).parents[2]


@pytest.fixture(scope="module")
def wheel(tmp_path_factory):
    """The wheel, built without a network by the build backend of this environment."""
    folder = tmp_path_factory.mktemp("wheel")
    script = "import sys; from hatchling.build import build_wheel; print(build_wheel(sys.argv[1]))"
    built = subprocess.run(
        [sys.executable, "-c", script, str(folder)], cwd=ROOT, capture_output=True, text=True, check=True
    )
    return folder / built.stdout.split()[-1]


def test_the_wheel_holds_code_templates_static_files_and_samples(wheel):
    names = set(zipfile.ZipFile(wheel).namelist())
    for kind, folder in (("templates", "templates"), ("static", "static"), ("sample_data", "sample_data")):
        for path in (ROOT / folder).rglob("*"):
            if path.is_file() and "__pycache__" not in path.parts:
                assert f"app/{kind}/{path.relative_to(ROOT / folder).as_posix()}" in names
    assert "engine/__init__.py" in names
    assert "app/__main__.py" in names
    assert not [name for name in names if name.startswith(("tests/", "templates/"))]


def test_an_unpacked_wheel_finds_its_own_folders_and_an_editable_install_the_clone(wheel, tmp_path):
    zipfile.ZipFile(wheel).extractall(tmp_path)
    script = (
        "from app.resources import resource; print(*map(resource, ['templates', 'static', 'sample_data']), sep='\\n')"
    )
    found = subprocess.run([sys.executable, "-c", script], cwd=tmp_path, capture_output=True, text=True, check=True)
    assert found.stdout.split() == [str(tmp_path / "app" / name) for name in ("templates", "static", "sample_data")]
    assert resource("templates") == ROOT / "templates"


def test_the_wheel_offers_the_console_command(wheel):
    archive = zipfile.ZipFile(wheel)
    (entry,) = [name for name in archive.namelist() if name.endswith("entry_points.txt")]
    assert "steelyard = app.__main__:main" in archive.read(entry).decode()


def test_a_folder_that_is_in_neither_place_is_named():
    with pytest.raises(FileNotFoundError, match="'no such folder'"):
        resource("no such folder")
