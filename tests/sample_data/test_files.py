"""The committed files are what the script makes, and say the same thing as each other."""

import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest

from engine.order import Order

SAMPLES = Path(__file__).parents[2] / "sample_data"
FOLDER = SAMPLES / "lantern_street"
FILES = ("codebook.md", "records.csv", "study.json", "truth.json")


def level_of(node, cell):
    """The level of the generating network that a cell is in."""
    return node.levels[np.searchsorted(node.cuts, float(cell), side="right")] if node.cuts else cell


def test_the_script_makes_the_committed_files_byte_for_byte(tmp_path):
    subprocess.run([sys.executable, SAMPLES / "make.py", tmp_path], check=True, timeout=60)
    assert sorted(path.name for path in tmp_path.iterdir()) == sorted(FILES)
    for name in FILES:
        assert (tmp_path / name).read_bytes() == (FOLDER / name).read_bytes()


def test_the_records_are_of_the_stated_size_and_hold_only_stated_levels(script, records):
    assert records.shape == (4000, 14)
    assert list(records.columns) == [node.name for node in script.NETWORK]
    for node in script.NETWORK:
        cells = records[node.name][records[node.name] != ""]
        assert {level_of(node, cell) for cell in cells} == set(node.levels)
        if node.cuts:
            assert cells.str.fullmatch(r"\d{1,3}").all()


def test_two_columns_are_numbers_that_take_many_values(script, records):
    numbers = [node.name for node in script.NETWORK if node.cuts]
    assert numbers == ["travel time", "attendance"]
    for name in numbers:
        assert records[name].nunique() > 80
    assert records["attendance"].replace("", "0").astype(int).max() <= 100


def test_only_two_columns_have_blanks_and_about_as_many_as_the_network_says(script, records):
    for node in script.NETWORK:
        blanks, expected = (records[node.name] == "").sum(), len(records) * node.blank
        assert abs(blanks - expected) <= 3.5 * np.sqrt(expected)  # none where the network has none
    assert {node.name for node in script.NETWORK if node.blank} == {"prior schooling", "attendance"}


def test_the_records_follow_the_network_in_every_combination_of_parents(script, records):
    distances = []
    for node in script.NETWORK:
        parents = [script.NETWORK[script.AT[name]] for name in node.pulls]
        columns = [node, *parents]
        known = records[[each.name for each in columns]].loc[lambda cells: (cells != "").all(axis=1)]
        levels = known.apply(lambda cells: [level_of(script.NETWORK[script.AT[cells.name]], cell) for cell in cells])
        groups = levels.groupby([each.name for each in parents]) if parents else [((), levels)]
        for seen, rows in groups:
            place = tuple(each.levels.index(level) for each, level in zip(parents, seen, strict=True))
            for share, level in zip(script.table(node)[place], node.levels, strict=True):
                if len(rows) * share * (1 - share) >= 9:
                    found = (rows[node.name] == level).mean()
                    distances.append((found - share) / np.sqrt(share * (1 - share) / len(rows)))
    assert len(distances) > 150
    assert np.abs(distances).max() < 4.0  # standard errors; the largest of 200 draws exceeds 4 once in 80
    assert 0.85 < np.std(distances) < 1.15


def test_the_study_states_an_order_that_the_generating_network_obeys(script, study):
    plan = study["plan"]
    order = Order(plan["stages"], plan["insist"], plan["rule_out"], (), plan["changeable"], plan["outcomes"])
    assert len(order.stages) == 4
    assert order.columns == tuple(node.name for node in script.NETWORK)
    for node in script.NETWORK:
        for parent in node.pulls:
            assert order.may_lead(parent, node.name), order.why(parent, node.name)
    assert order.changeable == ("mentor", "study group", "fee waived")
    assert set(order.outcomes) == {"passed", "in work after a year"}
    assert order.insist == (("passed", "in work after a year"),)


def test_the_study_gives_the_bands_and_the_order_of_grades(script, study):
    assert study["choices"]["bands"] == {"travel time": [20, 45], "attendance": [60, 80]}
    assert study["choices"]["grades"] == {node.name: list(node.levels) for node in script.NETWORK if node.grade}


def test_the_questions_to_try_name_columns_and_levels_that_exist(script, study):
    levels = {node.name: node.levels for node in script.NETWORK}
    assert study["try"]
    for question in study["try"]:
        assert set(question["levers"]) <= set(study["plan"]["changeable"])
        assert all(level in levels[column] for column, level in question["levers"].items())
        assert all(set(pinned) <= set(levels[column]) for column, pinned in question["pins"].items())


@pytest.fixture(scope="module")
def rows_of_the_codebook(codebook):
    cells = [[cell.strip() for cell in line.strip("|").split("|")] for line in codebook.splitlines() if "|" in line]
    return {row[0]: dict(zip(cells[0], row, strict=True)) for row in cells[2:]}


def test_the_codebook_names_every_column_with_its_levels_stage_and_blanks(script, records, study, rows_of_the_codebook):
    assert list(rows_of_the_codebook) == list(records.columns)
    stages = {column: stage for stage, columns in study["plan"]["stages"] for column in columns}
    for node in script.NETWORK:
        row = rows_of_the_codebook[node.name]
        assert row["stage"] == stages[node.name]
        assert row["meaning"]
        assert all(level in row["levels"] for level in node.levels)
        assert row["kind"] == ("number" if node.cuts else "grade" if node.grade else "category")
        assert row["blanks"] == (str((records[node.name] == "").sum()) if node.blank else "none")
