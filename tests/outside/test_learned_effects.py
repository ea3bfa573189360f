"""Published effects on a number, learned from the published records; the sources stand beside the records."""

import json
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from scipy.stats import t

import engine

FOLDER = Path(__file__).parent


def study(name):
    """(records as a frame, figures by name)"""
    held = json.loads((FOLDER / f"{name}.json").read_text(encoding="utf-8"))
    figures = {told["name"]: told for told in held["figures"]}
    return pd.DataFrame(held["rows"], columns=held["columns"], dtype=np.float64), figures


def as_names(frame, columns):
    """The frame with codes as names of levels."""
    return frame.assign(**{column: frame[column].astype(int).astype(str) for column in columns})


def effect_by_least_squares(frame, child, lever, others, crossed):
    """Mean of what is fitted with `lever` at 1 less that at 0, over all records; every column of `others` once."""

    def design(at):
        columns = [np.ones(len(frame)), at, *(frame[other].to_numpy() for other in others)]
        return np.column_stack([*columns, *(at * column for column in columns[2:] if crossed)])

    ones = np.ones(len(frame))
    slopes = np.linalg.lstsq(design(frame[lever].to_numpy()), frame[child].to_numpy(), rcond=None)[0]
    return float(((design(ones) - design(0.0 * ones)) @ slopes).mean())


# Weight gain after giving up smoking (Hernan & Robins 2020). Levels by name: sex, race, education, exercise and
# activity; numbers: age, years of smoking, weight and the gain. Cigarettes a day are taken as bands, 36 % say 20.

SMOKERS = ["sex", "race", "age", "education", "smokeintensity", "smokeyrs", "exercise", "active", "wt71"]


def smokers_learned(max_parents, insist=(), folds=True):
    frame, _ = study("weight_gain")
    named = as_names(frame, ["sex", "race", "education", "exercise", "active", "qsmk"])
    order = engine.Order(
        [("Before", SMOKERS), ("Change", ["qsmk"]), ("Ten years on", ["wt82_71"])],
        insist=[("qsmk", "wt82_71"), *insist],
        changeable=["qsmk"],
        outcomes={"wt82_71": engine.LESS},
    )
    numbers = dict.fromkeys(["age", "smokeintensity", "smokeyrs", "wt71", "wt82_71"], "number")
    return engine.learn(engine.Table.from_frame(named, numbers), order, max_parents=max_parents, graphs=50, folds=folds)


def stopping(model, draws=200):
    on, off = ({"qsmk": engine.Fix(level)} for level in ("1", "0"))
    return model.ask(levers=on, watch=["wt82_71"], against=off, draws=draws, exact=True)


@pytest.fixture(scope="module")
def smokers():
    return smokers_learned(max_parents=4)


def test_the_crude_difference_in_weight_gain_is_the_published_one():
    frame, figures = study("weight_gain")
    means = frame.groupby("qsmk")["wt82_71"].mean()
    told = figures["crude difference"]
    assert means[1.0] - means[0.0] == pytest.approx(told["value"], abs=told["tolerance"])


def test_the_effect_of_stopping_on_weight_is_learned_as_published(smokers):
    """Up to four parents: with three, no room is left for years of smoking, which lead to both."""
    _, figures = study("weight_gain")
    told = figures["a learned model with these columns in the first stage"]
    model = smokers.model()
    assert set(model.network.numbers) == {"age", "smokeyrs", "wt71", "wt82_71"}
    assert stopping(model).change("wt82_71")[0] == pytest.approx(told["value"], abs=told["tolerance"])


def test_the_doubt_about_stopping_overlaps_the_published_interval(smokers):
    _, figures = study("weight_gain")
    from_, to = figures["published 95% interval"]["value"]
    answer = stopping(smokers.model()).with_doubt(graphs=30)
    change, low, high = answer.change("wt82_71")
    assert answer.doubted
    assert low <= change <= high
    assert low < to and from_ < high
    assert high - low < 3.0


def test_the_effect_lies_between_those_of_the_added_and_the_crossed_regression(smokers):
    """The prior draws what differs between levels of a category towards what adds up, by as much as records allow."""
    frame, _ = study("weight_gain")
    model = smokers.model()
    parents = model.network.node("wt82_71").parents
    others = [parent for parent in parents if parent != "qsmk"]
    assert set(others) <= set(model.network.numbers)
    added, crossed = (effect_by_least_squares(frame, "wt82_71", "qsmk", others, each) for each in (False, True))
    assert abs(added - crossed) > 0.01
    assert min(added, crossed) - 0.02 < stopping(model).change("wt82_71")[0] < max(added, crossed) + 0.02


def test_the_interval_is_as_wide_as_that_of_the_added_regression(smokers):
    frame, _ = study("weight_gain")
    model = smokers.model()
    design = np.column_stack([np.ones(len(frame)), *(frame[name] for name in model.network.node("wt82_71").parents)])
    away = frame["wt82_71"] - design @ np.linalg.lstsq(design, frame["wt82_71"], rcond=None)[0]
    left = len(frame) - design.shape[1]
    at = 1 + model.network.node("wt82_71").parents.index("qsmk")
    error = np.sqrt((away**2).sum() / left * np.linalg.inv(design.T @ design)[at, at])
    _, low, high = stopping(model, draws=400).change("wt82_71")
    # Those who stopped and the others differ a little in their slopes and their spread, and draws add noise.
    assert high - low == pytest.approx(2.0 * t.ppf(0.95, left) * error, rel=0.15)


# Spending on food, by one number alone (Koenker & Bassett 1982): least squares, for the prior of a slope is flat.


def test_spending_on_food_is_learned_with_the_coefficients_and_errors_of_least_squares():
    held = json.loads((FOLDER / "number_figures.json").read_text(encoding="utf-8"))
    data = held["likelihood"]["data"]["engel"]
    (told,) = (
        each for each in held["regression"]["figures"] if each["name"] == "engel: mean of foodexp at income 1000"
    )
    frame = pd.DataFrame(data["rows"], columns=data["columns"], dtype=np.float64)
    order = engine.Order([("Means", ["income"]), ("Spending", ["foodexp"])], outcomes={"foodexp": engine.MORE})
    model = engine.learn(engine.Table.from_frame(frame), order, folds=False).model(1)
    among = model.ask({"income": 1_000.0}, watch=["foodexp"], draws=2_000)["foodexp"].among
    assert among.mean == pytest.approx(told["value"], abs=1e-6)

    design = np.column_stack([np.ones(len(frame)), frame["income"] - 1_000.0])
    away = frame["foodexp"] - design @ np.linalg.lstsq(design, frame["foodexp"], rcond=None)[0]
    variance = float((away**2).sum()) / (len(frame) - 2)
    error = float(np.sqrt(variance * np.linalg.inv(design.T @ design)[0, 0]))  # of the mean at 1,000
    assert among.sd**2 == pytest.approx(variance, rel=1e-6)
    half = float(t.ppf(0.95, len(frame) - 2)) * error
    # Ends of an interval from 2,000 draws are off by .05 of its standard error each.
    assert among.interval(None) == pytest.approx((among.mean - half, among.mean + half), abs=0.2 * error)


# Earnings after a job training trial (LaLonde 1986; Dehejia & Wahba 1999). Earnings are taken as bands, for 31 % had
# none; what a band is worth is the mean of its records. The link to them is insisted on: 445 records leave it open.

ROUND = [1.0, 2_500.0, 5_000.0, 7_500.0, 10_000.0, 15_000.0, 20_000.0]


def training(bands=None):
    frame, figures = study("job_training")
    groups = ["black", "hisp", "marr", "nodegree", "treat"]
    table = engine.Table.from_frame(
        as_names(frame, groups),
        dict.fromkeys(["age", "educ", "re74", "re75", "re78"], "number"),
        bands={} if bands is None else {"re78": bands},
    )
    before = ["age", "educ", "black", "hisp", "marr", "nodegree", "re74", "re75"]
    order = engine.Order(
        [("Before", before), ("Programme", ["treat"]), ("Earnings", ["re78"])],
        insist=[("treat", "re78")],
        changeable=["treat"],
        outcomes={"re78": engine.MORE},
    )
    model = engine.learn(table, order, graphs=50, folds=False).model()
    answer = model.ask(levers={"treat": engine.Fix("1")}, watch=["re78"], against={"treat": engine.Fix("0")})
    codes = table.coded(["re78"]).codes[:, 0]
    worth = np.array([frame["re78"][codes == code].mean() for code in np.unique(codes)])
    return worth, answer["re78"], figures


def test_the_crude_difference_in_earnings_is_the_published_one():
    frame, figures = study("job_training")
    assert len(frame) == figures["rows"]["value"]
    by = [frame["re78"][frame["treat"] == arm] for arm in (0.0, 1.0)]
    told = figures["difference in 1978 earnings"]
    assert by[1].mean() - by[0].mean() == pytest.approx(told["value"], abs=told["tolerance"])
    told = figures["standard error, unequal variances"]
    assert np.sqrt(sum(each.var() / len(each) for each in by)) == pytest.approx(told["value"], abs=told["tolerance"])


def test_the_programme_moves_earnings_by_what_the_trial_found():
    worth, reading, figures = training(ROUND)
    told = figures["learned, setting the programme on against off"]
    assert worth @ (reading.set.point - reading.against.point) == pytest.approx(told["value"], abs=told["tolerance"])
    error = (worth @ (reading.set.draws - reading.against.draws)).std()
    assert error == pytest.approx(figures["standard error, unequal variances"]["value"], rel=0.2)


def test_four_bands_lose_some_of_the_effect_and_their_interval_holds_the_published_one():
    """Within a band as wide as a quarter of all records those trained earned more, too."""
    worth, reading, figures = training()
    told = figures["difference in 1978 earnings"]["value"]
    effect = worth @ (reading.set.point - reading.against.point)
    low, high = np.quantile(worth @ (reading.set.draws - reading.against.draws), [0.05, 0.95])
    assert 0.0 < low < effect < told < high


def test_seen_and_set_agree_where_assignment_was_random():
    _, reading, _ = training(ROUND)
    # The shares may differ by what chance made of the assignment: a standard error of a share of 445 records is .02.
    assert reading.had.point == pytest.approx(reading.set.point, abs=0.02)
