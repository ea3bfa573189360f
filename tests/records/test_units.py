"""Units of numbers: what may be stated, and that nothing learned depends on it."""

import io

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st

import engine
from engine.network.nodes import Category, Number
from engine.records import Table, read_table
from engine.records.units import LONGEST, checked_unit
from engine.refusal import Refusal

UNSEEN = ["a\nb", "a\rb", "a\u2028b", "a\x00b", "\u202eetunim"]


def frame(rows=120, seed=0):
    rng = np.random.default_rng(seed)
    minutes = rng.normal(30.0, 8.0, rows).round(3)
    mentor = np.where(rng.random(rows) < 0.5, "yes", "no")
    return pd.DataFrame({"travel": minutes, "visits": rng.integers(0, 6, rows), "mentor": mentor})


def table(units=None):
    return Table.from_frame(frame(), kinds={"visits": "number"}, units=units)


def learned(units=None):
    order = engine.Order([("Before", ["travel", "visits"]), ("After", ["mentor"])])
    return engine.learn(table(units), order, folds=False, graphs=5)


def test_a_number_has_the_unit_that_was_stated_and_other_columns_have_none():
    columns = table({"travel": " minutes ", "visits": ""}).columns
    assert [column.unit for column in columns.values()] == ["minutes", "", ""]


def test_a_file_read_with_units_has_them():
    read = read_table(io.StringIO(frame().to_csv(index=False)), "t.csv", units={"travel": "minutes"})
    assert read.columns["travel"].unit == "minutes"


@given(st.text(st.characters(exclude_categories=["C", "Zl", "Zp", "Zs"]), min_size=1, max_size=LONGEST))
def test_any_short_text_that_can_be_seen_is_kept_as_it_is(unit):
    assert checked_unit("travel", unit) == unit


@pytest.mark.parametrize("unit", [*UNSEEN, "m" * (LONGEST + 1), 5])
def test_what_is_no_short_line_of_text_is_refused(unit):
    with pytest.raises(Refusal, match="unit of “travel”"):
        table({"travel": unit})
    with pytest.raises(Refusal, match="unit of “travel”"):
        Number("travel", unit=unit)
    with pytest.raises(Refusal, match="unit of “travel”"):
        Category("travel", ("a", "b"), table=[0.5, 0.5], unit=unit)


def test_a_unit_of_a_column_that_is_no_number_or_not_there_is_refused():
    with pytest.raises(Refusal, match="only a number has one"):
        table({"mentor": "minutes"})
    with pytest.raises(Refusal, match="named among the units"):
        table({"distance": "km"})


def test_a_number_that_is_left_out_may_keep_its_unit_in_the_choices():
    kept = Table.from_frame(frame(), kinds={"travel": "left out", "visits": "number"}, units={"travel": "minutes"})
    assert kept.columns["travel"].unit == ""


def test_a_unit_does_not_change_the_digest():
    assert table({"travel": "minutes"}).digest == table({"travel": "hours"}).digest == table().digest


def test_a_saved_model_knows_its_units_as_numbers_and_as_bands(tmp_path):
    before = learned({"travel": "minutes", "visits": "a week"})
    before.save(tmp_path / "kept")
    again = engine.open_learned(tmp_path / "kept")
    nodes = {node.name: node for node in again.model().network.nodes}
    assert {name: node.unit for name, node in nodes.items()} == {"travel": "minutes", "visits": "a week", "mentor": ""}
    assert isinstance(nodes["travel"], Number) and isinstance(nodes["visits"], Category)


def test_a_model_saved_without_units_has_none(tmp_path, monkeypatch):
    from engine.learning import archive

    told = archive.coded_described
    monkeypatch.setattr(
        archive, "coded_described", lambda coded: {name: held for name, held in told(coded).items() if name != "units"}
    )
    learned({"travel": "minutes"}).save(tmp_path / "kept")
    assert engine.open_learned(tmp_path / "kept").coded.units == ("", "", "")


def test_other_units_leave_every_figure_as_it_is():
    before = learned({"travel": "minutes"})
    after = before.in_units({"travel": "min", "mentor": "of no number"})
    assert after.coded.units == ("min", "", "") and before.coded.units == ("minutes", "", "")
    assert before.in_units({"travel": "minutes"}) is before
    one, other = before.model().ask(watch=["travel"])["travel"], after.model().ask(watch=["travel"])["travel"]
    assert one.recorded.mean == other.recorded.mean


def test_the_program_tells_the_units():
    text = learned({"travel": "minutes", "visits": "a week"}).model().program()
    assert "# travel. A number, in minutes;" in text
    assert "# visits. A number in bands, in a week;" in text
    assert "A number, in" not in learned().model().program()
