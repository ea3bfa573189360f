"""Which numbers are learned from as bands, which are refused, and to what step a number was recorded."""

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st

from engine.records import spikes
from engine.records.spikes import own_reason, refuse_collinear, taken_as_bands
from engine.records.steps import recording_step
from engine.records.table import Table
from engine.refusal import Refusal


def columns(**cells):
    kinds = {name: "number" for name, held in cells.items() if np.asarray(held).dtype.kind == "f"}
    return list(Table.from_frame(pd.DataFrame(cells), kinds=kinds).columns.values())


@pytest.fixture
def rng():
    return np.random.default_rng(0)


def test_a_tenth_of_the_records_in_one_value_makes_bands(rng):
    smooth = rng.normal(size=200)
    nearly, spiked = smooth.copy(), smooth.copy()
    nearly[:19], spiked[:20] = 0.0, 0.0
    found = taken_as_bands(columns(nearly=nearly, spiked=spiked), 3)
    assert found == {"spiked": "“spiked” is taken as bands: 10% of its records hold 0."}


@pytest.mark.parametrize(
    ("rows", "alike", "why"),
    [
        (60, 9, "a single value makes up 10% of its records or more."),
        (200, 190, "95% of its records hold 0."),
        (200, 191, "nearly all of its records hold 0."),
        (200, 25, "13% of its records hold 0."),
        (200, 19, None),
    ],
)
def test_a_reason_gives_no_small_count_away(rng, rows, alike, why):
    values = rng.normal(size=rows)
    values[:alike] = 0.0
    assert own_reason(columns(x=values, y=np.resize(["a", "b"], rows))[0]) == why


@pytest.mark.parametrize(("records", "bands"), [(9, False), (10, True)])
def test_one_value_throughout_a_configuration_of_ten_makes_bands(rng, records, bands):
    shift = np.repeat(["days", "nights"], [400 - records, records])
    pay = np.concatenate([rng.normal(20.0, 3.0, 400 - records), np.full(records, 18.5)])
    found = taken_as_bands(columns(shift=shift, pay=pay), 1)
    told = "“pay” is taken as bands: it is 18.5 in all 10 records where “shift” is “nights”."
    assert found == ({"pay": told} if bands else {})


@pytest.mark.parametrize("probed", [5, 20_000])
def test_a_constant_is_found_where_only_two_categories_together_show_it(monkeypatch, rng, probed):
    monkeypatch.setattr(spikes, "PROBED", probed)
    a, b = rng.integers(0, 2, 300), rng.integers(0, 2, 300)
    a[-12:], b[-12:], a[:-12], b[:50] = 1, 1, rng.integers(0, 2, 288), 0
    b[:-12][a[:-12] == 1] = 0
    pay = rng.normal(size=300)
    pay[-12:] = 2.0
    cells = {"a": np.where(a, "yes", "no"), "b": np.where(b, "yes", "no"), "pay": pay}
    assert taken_as_bands(columns(**cells), 1) == {}
    assert list(taken_as_bands(columns(**cells), 2)) == ["pay"]


def test_a_number_fixed_by_one_that_became_bands_becomes_bands_as_well(rng):
    first, second = rng.normal(50.0, 10.0, 500), rng.normal(5.0, 1.0, 500)
    first[:300], first[300:340] = 0.0, 90.0
    second[300:340] = 3.0
    group = np.where(np.arange(500) < 340, "x", "y")
    assert set(taken_as_bands(columns(second=second, group=group), 2)) == set()
    found = taken_as_bands(columns(first=first, second=second, group=group), 2)
    assert list(found) == ["first", "second"]
    assert found["second"].startswith("“second” is taken as bands: it is 3 in all 40 records where “first” is ")


def test_a_blank_that_is_a_level_makes_bands(rng):
    pay = rng.normal(size=100)
    pay[3] = np.nan
    (why,) = taken_as_bands(columns(pay=pay, age=rng.normal(size=100)), 3).values()
    assert why == "“pay” is taken as bands: a blank is a level of its own here, which only bands can have."


def test_smooth_numbers_stay_numbers(rng):
    cells = {"a": rng.normal(size=300), "b": rng.exponential(size=300).round(2), "c": rng.integers(0, 90, 300) * 1.0}
    assert taken_as_bands(columns(**cells, group=rng.choice(["x", "y", "z"], 300)), 3) == {}
    refuse_collinear(columns(**cells), 4)


@pytest.mark.parametrize("decimals", [None, 1])
def test_a_sum_of_others_is_refused_by_name(rng, decimals):
    parts = rng.normal(size=(200, 4)) * [1.0, 5.0, 9.0, 2.0] + 30.0
    total = parts[:, 1] + 2.0 * parts[:, 2] - 7.0
    cells = {"alpha": parts[:, 0], "beta": parts[:, 1], "gamma": parts[:, 2], "delta": parts[:, 3], "total": total}
    if decimals is not None:
        cells = {name: held.round(decimals) for name, held in cells.items()}
    with pytest.raises(Refusal) as refused:
        refuse_collinear(columns(**cells), 4)
    assert refused.value.message.startswith("“total” follows exactly from “beta” and “gamma” in every record")
    assert refused.value.where == "total"


def test_a_copy_in_other_units_is_refused(rng):
    metres = rng.normal(1.7, 0.1, 100).round(2)
    with pytest.raises(Refusal, match="“inches” follows exactly from “metres”"):
        refuse_collinear(columns(metres=metres, inches=(metres / 0.0254).round(1)), 4)


def test_a_close_relation_is_not_refused(rng):
    first = rng.normal(size=300)
    refuse_collinear(columns(first=first, second=first + 0.001 * rng.normal(size=300)), 4)


def test_a_sum_of_more_columns_than_are_ever_scored_together_is_let_be(rng):
    parts = rng.normal(size=(200, 5))
    cells = {f"part {name}": parts[:, place] for place, name in enumerate("abcde")}
    held = columns(**cells, total=parts.sum(axis=1))
    refuse_collinear(held, 5)
    with pytest.raises(Refusal):
        refuse_collinear(held, 6)


@given(
    st.lists(st.integers(-500, 500), min_size=12, max_size=60, unique=True),
    st.floats(1e-3, 1e3),
    st.floats(-1e3, 1e3),
)
def test_the_step_is_the_greatest_common_one_in_any_unit(places, unit, origin):
    """Of a dozen different values or more: fewer may lie too many steps apart for floats to tell."""
    values = np.asarray(places, dtype=np.float64)
    told = float(np.gcd.reduce(np.asarray(places) - min(places)))
    assert recording_step((values + origin) * unit) == pytest.approx(told * unit, rel=1e-6)


def test_finely_recorded_numbers_have_no_step(rng):
    assert recording_step(rng.normal(size=10_000)) == 0.0
    assert recording_step(rng.normal(size=30)) == 0.0
    assert recording_step(np.full(5, 3.0)) == 0.0
    assert recording_step(rng.normal(20.0, 4.0, 1_000).round(2)) == pytest.approx(0.01, rel=1e-9)
