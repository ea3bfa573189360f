"""Settings: one table, said the same everywhere."""

from dataclasses import fields
from pathlib import Path

import pytest

from app.settings import TABLE, Settings, default_data_folder, read_settings
from engine.refusal import Refusal

DEVELOPERS = Path(__file__).parents[2] / "DEVELOPERS.md"


def test_the_table_in_the_developers_guide_is_the_table_in_the_code():
    written = [
        line for line in DEVELOPERS.read_text(encoding="utf-8").splitlines() if "`STEELYARD_" in line and "|" in line
    ]
    coded = [f"| `{row.option}` | `{row.variable}` | {row.default} | {row.meaning} |" for row in TABLE]
    assert written == coded


def test_every_setting_is_in_the_table_once():
    assert [row.field for row in TABLE] == list(dict.fromkeys(row.field for row in TABLE))
    assert {row.field for row in TABLE} == {field.name for field in fields(Settings)}


def test_the_defaults_in_the_table_are_those_of_the_code():
    settings = read_settings([], {})
    for row in TABLE:
        if row.field == "data":
            assert settings.data == default_data_folder()
            continue
        found = getattr(settings, row.field)
        assert row.default == ({True: "yes", False: "no"}[found] if row.switch else str(found))


@pytest.mark.parametrize("row", TABLE, ids=lambda row: row.field)
def test_each_setting_can_be_given_both_ways_and_the_option_wins(row, tmp_path):
    if row.switch:
        pressed = row.default == "no"
        word = {True: "yes", False: "no"}
        assert getattr(read_settings([row.option], {}), row.field) is pressed
        assert getattr(read_settings([], {row.variable: word[pressed]}), row.field) is pressed
        assert getattr(read_settings([row.option], {row.variable: word[not pressed]}), row.field) is pressed
        return
    first, second = {"host": ("localhost", "::1"), "data": (str(tmp_path), "elsewhere")}.get(row.field, ("101", "102"))
    assert str(getattr(read_settings([row.option, first], {}), row.field)) == first
    assert str(getattr(read_settings([], {row.variable: second}), row.field)) == second
    assert str(getattr(read_settings([row.option, first], {row.variable: second}), row.field)) == first


@pytest.mark.parametrize(
    ("arguments", "environment", "said"),
    [
        (["--port", "eighty"], {}, "--port"),
        (["--port", "0"], {}, "from 1 to 65535"),
        (["--port", "65536"], {}, "from 1 to 65535"),
        (["--port", "１２"], {}, "whole number"),
        ([], {"STEELYARD_PORT": "-1"}, "STEELYARD_PORT"),
        ([], {"STEELYARD_SAMPLE": "perhaps"}, "neither yes nor no"),
        (["--host", "0.0.0.0"], {}, "not an address of this machine alone"),
        (["--host", "example.org"], {}, "not an address of this machine alone"),
        (["--upload-limit", "1.5"], {}, "of at least 1"),
    ],
)
def test_a_value_that_cannot_be_used_is_refused_with_its_place(arguments, environment, said):
    with pytest.raises(Refusal) as refused:
        read_settings(arguments, environment)
    assert said in refused.value.message
    assert refused.value.do


def test_an_empty_variable_counts_as_not_given():
    assert read_settings([], {"STEELYARD_PORT": " "}).port == 8377
