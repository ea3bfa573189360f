"""From a table with numbers: which are learned as numbers, what is told of the others, what is refused; cancelling."""

import time

import numpy as np
import pandas as pd
import pytest

from engine.learning.learn import learn, learn_coded
from engine.network.nodes import Category, Number
from engine.order import LESS, MORE, Order
from engine.records.table import Table
from engine.refusal import Refusal
from tests.learning import mixed_plainly as plainly


def night_bus(rows=400, seed=0):
    """Smooth: minutes, fare. Mostly nothing: late. Blank in places: waited. The same on each line: stops."""
    rng = np.random.default_rng(seed)
    line = rng.choice(["north", "south", "ring"], rows, p=[0.5, 0.44, 0.06])
    minutes = rng.normal(30.0, 6.0, rows) + 8.0 * (line == "ring")
    return pd.DataFrame(
        {
            "line": line,
            "minutes": minutes,
            "fare": 2.0 + 0.1 * minutes + rng.normal(0.0, 0.5, rows),
            "late": np.where(rng.random(rows) < 0.4, 0.0, rng.exponential(5.0, rows)),
            "waited": np.where(rng.random(rows) < 0.1, np.nan, rng.exponential(4.0, rows)),
            "stops": np.where(line == "ring", 21.0, rng.normal(12.0, 3.0, rows)),
            "came back": np.where(rng.random(rows) < 0.5 + 0.2 * np.tanh(minutes / 10.0 - 3.0), "yes", "no"),
        }
    )


COLUMNS = ("minutes", "fare", "late", "waited", "stops", "came back")
ORDER = Order([("Line", ["line"]), ("Ride", COLUMNS)], outcomes={"came back": "yes", "minutes": LESS})


def test_numbers_that_vary_are_numbers_and_the_others_bands_with_a_sentence_each():
    learned = learn(Table.from_frame(night_bus()), ORDER)
    kinds = {node.name: type(node) for node in learned.network().nodes}
    assert {name for name, kind in kinds.items() if kind is Number} == {"minutes", "fare"}
    assert kinds["late"] is kinds["waited"] is kinds["stops"] is Category
    told = {note.split("”")[0].lstrip("“"): note for note in learned.notes if "taken as bands" in note}
    assert set(told) == {"late", "waited", "stops"}
    assert "blank" in told["waited"] and "“line” is “ring”" in told["stops"]
    assert learned.coded.values == pytest.approx(night_bus()[["minutes", "fare"]].to_numpy())


def test_a_number_whose_blanks_leave_rows_out_is_a_number():
    table = Table.from_frame(night_bus(), blanks={"waited": "drop row"})
    learned = learn(table, ORDER, folds=False)
    assert isinstance(learned.network().node("waited"), Number) and learned.rows == table.rows < 400


def test_the_users_cuts_are_the_bands_through_which_a_number_acts():
    learned = learn(Table.from_frame(night_bus(), bands={"minutes": [25.0, 40.0]}), ORDER, folds=False)
    minutes = learned.network().node("minutes")
    assert isinstance(minutes, Number) and minutes.bands == (25.0, 40.0)
    read = learned.family(learned.coded.names.index("came back"), (learned.coded.names.index("minutes"),))
    assert read.table.shape == (3, 2)


@pytest.mark.parametrize(
    ("change", "says", "where"),
    [
        ({"minutes": np.r_[np.inf, np.arange(399.0)]}, "infinite in 1", "minutes"),
        ({"minutes": np.full(400, 3.5)}, "same value in “minutes”", "minutes"),
        ({"minutes": night_bus()["minutes"] * 1e120}, "“minutes” are too large", "minutes"),
        ({"minutes": night_bus()["minutes"] * 1e-120}, "“minutes” are too close together", "minutes"),
        ({"minutes": night_bus()["minutes"] + 1e15}, "“minutes” are too close together for their size", "minutes"),
        ({"fare": night_bus()["minutes"] * 2.0 + 1.0}, "follows exactly from “minutes”", "fare"),
    ],
)
def test_numbers_that_cannot_be_learned_from_are_refused_by_name(change, says, where):
    frame = night_bus().assign(**change)
    with pytest.raises(Refusal, match=says) as refused:  # what is infinite already when the table is made
        table = Table.from_frame(frame, kinds={"minutes": "number"})
        learn(table, ORDER)
    assert refused.value.where == where and refused.value.do


def test_too_few_records_of_numbers_are_refused():
    with pytest.raises(Refusal, match="29 records") as refused:
        learn(Table.from_frame(night_bus(29), kinds={"minutes": "number"}), ORDER)
    assert "blanks" not in refused.value.do
    dropping = Table.from_frame(night_bus(30), kinds={"minutes": "number"}, blanks={"waited": "drop row"})
    assert dropping.rows < 30
    with pytest.raises(Refusal) as refused:
        learn(dropping, ORDER)
    assert "keep those that blanks have dropped" in refused.value.do


def test_a_number_that_varies_enough_for_its_size_is_learned():
    frame = night_bus().assign(minutes=night_bus()["minutes"] + 1e9)
    assert learn(Table.from_frame(frame, kinds={"minutes": "number"}), ORDER, folds=False).rows == 400


def test_weights_that_leave_too_little_are_refused_by_their_column():
    frame = night_bus().assign(counts=np.r_[np.full(12, 1e6), np.ones(388)])
    with pytest.raises(Refusal, match="the 400 records are worth 12 of equal weight") as refused:
        learn(Table.from_frame(frame, kinds={"counts": "weight"}), ORDER)
    assert refused.value.where == "counts" and refused.value.do


def test_an_outcome_may_be_more_of_a_number_or_its_bands():
    table = Table.from_frame(night_bus(), bands={"minutes": [30.0]})
    for better in (MORE, LESS, "under 30"):
        order = Order([("Line", ["line"]), ("Ride", COLUMNS)], outcomes={"minutes": better})
        assert learn(table, order, folds=False).order.outcomes["minutes"] in (better, (better,))
    with pytest.raises(Refusal, match="no level “short”"):
        learn(table, Order([("Line", ["line"]), ("Ride", COLUMNS)], outcomes={"minutes": "short"}))


@pytest.mark.parametrize("kind", ["weight", "group"])
def test_a_column_that_says_how_records_count_is_not_learned_from(kind):
    frame = night_bus().assign(counts=np.repeat(np.arange(1.0, 41.0), 10))
    table = Table.from_frame(frame, kinds={"counts": kind})
    with pytest.raises(Refusal, match=f"taken as the {kind} of the records") as refused:
        learn(table, Order([("All", ("counts", *COLUMNS))]))
    assert refused.value.where == "counts" and refused.value.do
    learned = learn(table, ORDER)
    used = table.coded(ORDER.columns, (), lambda one, other: ORDER.may_lead(one, other) or ORDER.may_lead(other, one))
    assert np.array_equal(learned.coded.weights, used.weights)
    assert (learned.coded.group is None) == (kind == "weight")


def test_fractions_of_a_table_with_numbers_never_run_back():
    heard = []
    learn(Table.from_frame(night_bus()), ORDER, progress=lambda fraction, words: heard.append((fraction, words)))
    fractions = [fraction for fraction, _ in heard]
    assert fractions == sorted(fractions) and fractions[0] == 0.0 and fractions[-1] == 1.0
    assert heard[0][1] == "Looking at how each number varies"


@pytest.mark.parametrize("at", ["Looking", "Adding", "Finding", "Scoring part 2", "Trying"])
def test_raising_in_progress_cancels_a_table_with_numbers(at):
    class CancelledError(Exception):
        pass

    def progress(fraction, words):
        if words.startswith(at):
            raise CancelledError

    with pytest.raises(CancelledError):
        learn(Table.from_frame(night_bus()), ORDER, progress=progress)


@pytest.mark.parametrize(("rows", "categories", "numbers"), [(3_000, 8, 9), (60_000, 4, 6)])
def test_a_chance_to_cancel_comes_often_with_numbers(rows, categories, numbers):
    rng = np.random.default_rng(0)
    columns = categories + numbers
    codes = rng.integers(0, 3, (rows, columns))
    values = rng.normal(size=(rows, numbers)) + codes[:, :1]
    frame = pd.DataFrame(
        {
            f"c{place}": values[:, place - categories] if place >= categories else codes[:, place].astype(str)
            for place in range(columns)
        }
    )
    table = Table.from_frame(frame, kinds={f"c{place}": "category" for place in range(categories)})
    order = Order([(f"stage {stage}", list(frame.columns[stage::3])) for stage in range(3)])
    times = [time.process_time()]
    learn(table, order, progress=lambda fraction, words: times.append(time.process_time()))
    assert np.diff(times).max() < 0.2


def test_support_of_many_records_neither_underflows_nor_loses_a_graph():
    """Scores differ by hundreds of thousands of nats; every graph of the stage keeps its share."""
    rng = np.random.default_rng(0)
    rows = 400_000
    codes = np.zeros((rows, 4), dtype=np.int32)
    codes[:, 0] = rng.integers(0, 2, rows)
    values = np.column_stack([rng.normal(size=rows) + 5.0 * codes[:, 0], np.empty(rows)])
    codes[:, 2] = (values[:, 0] > 2.5) ^ (rng.random(rows) < 0.01)
    values[:, 1] = 3.0 * values[:, 0] + 0.01 * rng.normal(size=rows)
    coded = plainly.coded_mixed("abcd", codes, values, (1, 3))
    learned = learn_coded(coded, Order([("All", list("abcd"))]), folds=False)
    support = learned.posterior.support
    assert np.isfinite(support).all() and np.ptp(learned.curve["score"]) > 1e6
    assert support[1, 3] + support[3, 1] == pytest.approx(1.0, abs=1e-9)
    assert (support + support.T).max() <= 1.0 + 1e-9
    assert np.isfinite(learned.posterior.weights).all() and len(learned.posterior.graphs) == 200
