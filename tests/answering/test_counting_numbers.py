"""What records with numbers hold, counted: values and ranges, means, bands and weights."""

import numpy as np
import pytest

from engine.answering.counting import Records
from engine.answering.pins import Pins
from engine.records.bands import band_codes
from engine.records.table import Coded

CUTS = (10.0, 20.0)
BANDS = ("under 10", "10 to under 20", "20 and over")


def records(ages, weights=None):
    """Records of a place and an age; every second one is in the north."""
    ages = np.asarray(ages, dtype=np.float64)
    place = (np.arange(ages.size) % 2).astype(np.int32)
    return Records(
        Coded(
            names=("place", "age"),
            kinds=("category", "number"),
            levels=(("north", "south"), BANDS),
            cuts=((), CUTS),
            has_blank=(False, False),
            codes=np.asfortranarray(np.column_stack([place, band_codes(ages, CUTS)])),
            weights=np.ones(ages.size) if weights is None else np.asarray(weights),
            numbers=(1,),
            values=ages[:, None],
        )
    )


@pytest.fixture(scope="module")
def ages():
    return np.repeat([5.0, 12.0, 18.0, 30.0], 40)


def test_values_and_ranges_match_the_records_that_have_them(ages):
    held = records(ages)
    assert held.matching(Pins(values={"age": 12.0})).size == 40
    assert held.matching(Pins(values={"age": 12.5})).size == 0
    assert held.matching(Pins(ranges={"age": (12.0, 30.0)})).size == 80  # the lower end is in, the upper one is not
    both = held.matching(Pins({"place": frozenset([0])}, ranges={"age": (-np.inf, 18.0)}))
    assert both.size == 40 and set(ages[both]) == {5.0, 12.0}


def test_a_number_is_counted_by_its_mean_and_its_bands(ages):
    held = records(ages)
    pins = Pins(ranges={"age": (12.0, 40.0)})
    counted = held.counted(["age", "place"], pins, held.matching(pins))
    assert counted["age"].mean == pytest.approx(20.0)
    assert counted["age"].counts == {"under 10": 0, "10 to under 20": 80, "20 and over": 40}
    assert counted["place"].mean is None and counted["place"].shares == {"north": 0.5, "south": 0.5}


def test_shares_and_means_are_weighted_and_rows_are_not(ages):
    weights = np.where(ages < 15.0, 1.0, 3.0)
    held = records(ages, weights)
    counted = held.counted(["age"], Pins(), held.matching(Pins()))["age"]
    assert counted.rows == 160 and counted.counts["under 10"] == 40
    assert counted.shares == pytest.approx({"under 10": 0.125, "10 to under 20": 0.5, "20 and over": 0.375})
    assert counted.mean == pytest.approx((5 + 12 + 3 * 18 + 3 * 30) / 8)


@pytest.mark.parametrize(
    ("low", "high", "told"),
    [(10.0, 12.5, True), (-np.inf, 11.5, False), (12.0, 20.0, False), (11.0, 30.0, True), (12.0, 30.0, False)],
)
def test_a_range_that_would_give_a_small_part_of_a_band_away_is_not_told(ages, low, high, told):
    """11 occurs in four records: whatever takes them apart from the rest of their band would tell of them."""
    few, many = (records(np.concatenate([ages, np.full(count, 11.0)])) for count in (4, 40))
    pins = Pins(ranges={"age": (low, high)})
    assert few.tellable(pins, few.matching(pins)) is told
    assert many.tellable(pins, many.matching(pins)) is True


def test_a_value_of_few_records_is_not_told(ages):
    held = records(np.concatenate([ages, np.full(4, 11.0)]))
    pins = Pins(values={"age": 11.0})
    assert not held.tellable(pins, held.matching(pins))
    assert held.counted(["place"], pins, held.matching(pins)) == {"place": None}
