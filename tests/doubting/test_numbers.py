"""Cautions where numbers are set, shifted, watched or among a lever's causes, and about levers of every kind."""

import numpy as np
import pandas as pd
import pytest

import engine
from tests.doubting.worlds import codes_of, only

ROWS = 2000


@pytest.fixture(scope="module")
def model():
    """Hours of help go with distance and to those in need; marks follow hours. Nobody near has over 30 hours."""
    rng = np.random.default_rng(5)
    need = rng.random(ROWS) < 0.4
    distance = rng.gamma(4.0, 3.0, ROWS)
    hours = 10.0 + 8.0 * need + 0.4 * distance + rng.normal(0.0, 6.0, ROWS)
    mark = 40.0 + 0.9 * hours - 9.0 * need + rng.normal(0.0, 6.0, ROWS)
    passed = np.where(mark + rng.normal(0.0, 3.0, ROWS) > 50.0, "yes", "no")
    frame = pd.DataFrame(
        {"need": np.where(need, "yes", "no"), "distance": distance, "hours": hours, "mark": mark, "passed": passed}
    )
    table = engine.Table.from_frame(frame, bands={"hours": [12.0, 18.0, 24.0]})
    order = engine.Order(
        [("Before", ["need", "distance"]), ("Help", ["hours"]), ("Mark", ["mark"]), ("End", ["passed"])],
        insist=[("hours", "mark")],
        changeable=["hours", "need"],
        outcomes={"passed": "yes", "mark": engine.MORE},
    )
    return engine.learn(table, order, graphs=0, folds=False).model()


def test_a_number_set_inside_its_range_brings_no_caution(model):
    answer = model.ask(levers={"hours": engine.Fix(15.0)}, watch=["mark"])
    assert not {"overlap", "outside"} & {code for _, code in codes_of(answer)}


def test_a_number_set_beyond_the_records_weakens(model):
    found = only(model.ask(levers={"hours": engine.Fix(200.0)}, watch=["mark"]), "outside")
    assert found.rank == "weakens" and found.figure == "100%"
    assert found.figures["high"] < 60.0


def test_a_shift_beyond_the_records_weakens_by_the_share_it_takes_there(model):
    values = model.coded.values[:, [model.coded.names[place] for place in model.coded.numbers].index("hours")]
    found = only(model.ask(levers={"hours": engine.Shift(12.0)}, watch=["mark"]), "outside")
    beyond = float((values + 12.0 > np.quantile(values, 0.99)).mean())
    assert found.figures["share beyond"] == pytest.approx(beyond)


def test_a_small_shift_is_not_told(model):
    answer = model.ask(levers={"hours": engine.Shift(0.5)}, watch=["mark"])
    assert "outside" not in {code for _, code in codes_of(answer)}


def test_overlap_of_a_number_looks_at_the_band_of_its_value(model):
    pins = {"need": "yes"}
    answer = model.ask(pins=pins, levers={"hours": engine.Fix(8.0)}, watch=["mark"])
    found = only(answer, "overlap")
    coded = model.coded
    parents = model.network.node("hours").parents
    columns = [coded.codes[:, coded.names.index(name)] for name in parents]
    stratum = pd.Series(list(zip(*columns, strict=True)))
    at_value = coded.codes[:, coded.names.index("hours")] == 0
    alike = stratum.map(stratum[at_value].value_counts()).fillna(0).to_numpy()
    asked = coded.codes[:, coded.names.index("need")] == coded.levels[coded.names.index("need")].index("yes")
    assert found.figures["share thin"] == pytest.approx(float((alike[asked] < 10).mean()))
    assert found.figures["share without"] == pytest.approx(float((alike[asked] == 0).mean()))
    assert "hours = 8" in found.text


def test_overlap_of_a_rule_looks_at_those_it_would_change(model):
    """Nearly nobody in need has the lowest band of hours; the rule changes those in need alone."""
    rule = engine.Rule("need", {"yes": 8.0})
    found = only(model.ask(levers={"hours": rule}, watch=["mark"]), "overlap")
    alone = only(model.ask(pins={"need": "yes"}, levers={"hours": engine.Fix(8.0)}, watch=["mark"]), "overlap")
    assert found.figures["rows"] == alone.figures["rows"]
    assert found.figures["share thin"] == pytest.approx(alone.figures["share thin"])


def test_overlap_of_a_mix_weighs_its_values(model):
    low = only(model.ask(pins={"need": "yes"}, levers={"hours": engine.Fix(8.0)}, watch=["mark"]), "overlap")
    mixed = only(
        model.ask(pins={"need": "yes"}, levers={"hours": engine.Mix({8.0: 0.5, 20.0: 0.5})}, watch=["mark"]), "overlap"
    )
    assert 0.0 < mixed.figures["share thin"] < low.figures["share thin"]


def test_the_levers_held_against_are_looked_at_too(model):
    answer = model.ask(levers={"hours": engine.Fix(15.0)}, against={"hours": engine.Fix(200.0)}, watch=["mark"])
    assert only(answer, "outside").figure == "100%"


def test_a_counted_mean_that_the_model_contradicts_is_told(model):
    """The mean of marks for one odd value of hours is what the straight line says; of a group it misses it is not."""
    rng = np.random.default_rng(6)
    group = rng.integers(0, 4, ROWS)
    slow = rng.integers(0, 2, ROWS)
    value = 5.0 * ((group == 3) & (slow == 1)) + rng.normal(0.0, 1.0, ROWS)
    frame = pd.DataFrame(
        {"group": [f"g{each}" for each in group], "slow": [f"s{each}" for each in slow], "value": value}
    )
    order = engine.Order([("First", ["group", "slow"]), ("Then", ["value"])], insist=[("group", "value")])
    learned = engine.learn(engine.Table.from_frame(frame), order, graphs=0, folds=False)
    pins = {"group": "g3", "slow": "s1"}
    one = learned.model(1).ask(pins=pins, watch=["value"])
    assert only(one, "counted").rank == "weakens"
    assert "counted" not in {code for _, code in codes_of(learned.model(2).ask(pins=pins, watch=["value"]))}
