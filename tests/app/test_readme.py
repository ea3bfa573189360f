"""The README's two commands, and that the continuous check runs the very same one."""

import re
import tomllib
from pathlib import Path

ROOT = Path(__file__).parents[2]
README = (ROOT / "README.md").read_text(encoding="utf-8")
START = "python3 -m venv .venv && .venv/bin/pip install -e . && .venv/bin/steelyard --sample"
TEST = "python3 -m venv .venv && .venv/bin/pip install -e '.[tests]' && .venv/bin/python -m pytest"


def test_the_readme_gives_exactly_two_commands():
    blocks = re.findall(r"^```\w*\n(.*?)^```$", README, flags=re.MULTILINE | re.DOTALL)
    assert [block.strip() for block in blocks] == [START, TEST]


def test_the_check_takes_its_test_command_from_the_readme():
    script = (ROOT / ".ci" / "run").read_text(encoding="utf-8")
    pattern = re.search(r"grep -E '(.+?)' README\.md", script)
    assert pattern is not None
    assert [line for line in README.splitlines() if re.search(pattern[1], line)] == [TEST]
    assert script.rstrip().endswith('bash -c "$tests"')


def test_the_readme_begins_with_the_job():
    paragraphs = README.split("\n\n")
    assert paragraphs[0] == "# Steelyard"
    assert "what would move if a column were *set*" in " ".join(paragraphs[1].split())


def test_the_pictures_of_the_readme_are_there():
    pictures = re.findall(r"!\[[^\]]+\]\(([^)]+)\)", README)
    assert pictures
    assert all((ROOT / picture).is_file() for picture in pictures)


def test_the_licence_is_the_same_everywhere():
    project = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["project"]
    assert project["license"] == "MIT"
    assert "Permission is hereby granted, free of charge" in README


def test_the_top_level_holds_only_what_the_layout_names():
    import subprocess

    listed = subprocess.run(["git", "ls-files"], cwd=ROOT, capture_output=True, text=True, check=True).stdout
    top = {line.split("/")[0] for line in listed.splitlines()}
    named = {
        "README.md",
        "DEVELOPERS.md",
        "pyproject.toml",
        "app",
        "engine",
        "templates",
        "static",
        "tests",
        "sample_data",
    }
    assert {name for name in top if not name.startswith(".")} <= named
