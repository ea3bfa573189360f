"""Means of numbers are told over plausible models as shares are."""

import numpy as np
import pandas as pd
import pytest

import engine
from tests.doubting.worlds import only

ROWS = 400


@pytest.fixture(scope="module")
def learned():
    """A course that may lead to hours, and hours to a score."""
    rng = np.random.default_rng(7)
    area = rng.integers(0, 2, ROWS)
    course = np.where(rng.random(ROWS) < 0.4, area, rng.integers(0, 2, ROWS))
    hours = 20.0 + 0.8 * course + rng.normal(scale=4.0, size=ROWS)
    score = 50.0 + 0.6 * hours + 3.0 * area + rng.normal(scale=8.0, size=ROWS)
    names = np.array(["no", "yes"])
    frame = pd.DataFrame({"area": names[area], "course": names[course], "hours": hours, "score": score})
    order = engine.Order(
        [("Before", ["area"]), ("Offer", ["course"]), ("During", ["hours"]), ("After", ["score"])],
        changeable=["course", "hours"],
        outcomes={"score": engine.MORE},
    )
    return engine.learn(engine.Table.from_frame(frame), order)


def test_the_interval_of_a_mean_is_over_plausible_models(learned):
    model = learned.model()
    assert set(model.network.numbers) == {"hours", "score"}
    answer = model.ask(levers={"course": engine.Fix("yes")}, watch=["score", "hours"])
    doubted = answer.with_doubt(50, 20)
    for column in ("score", "hours"):
        reading = doubted[column]
        assert reading.set.mean_draws.shape == (1000,)
        assert reading.set.draws.shape[-1] == 1000
        assert reading.set.mean == answer[column].set.mean
        change, low, high = doubted.change(column)
        expected = np.quantile(reading.set.mean_draws - reading.among.mean_draws, [0.05, 0.95])
        assert (low, high) == pytest.approx(expected)
        assert change == answer.change(column)[0]
        assert reading.recorded.interval(None) == pytest.approx(np.quantile(reading.recorded.mean_draws, [0.05, 0.95]))


def test_pooled_means_are_those_of_each_graph_in_turn(learned):
    drawn = [dict.fromkeys(learned.coded.names, ()) for _ in learned.graphs]
    for parents, (links, _) in zip(drawn, learned.graphs, strict=True):
        for source, target in links:
            parents[target] = (*parents[target], source)
    assert len({tuple(parents.items()) for parents in drawn}) > 1
    places = learned.coded.names.index
    expected, weights = [], []
    for parents, (_, weight) in zip(drawn, learned.graphs, strict=True):
        chosen = tuple(tuple(places(source) for source in parents[name]) for name in learned.coded.names)
        answer = engine.Model(learned.network_of(chosen)).ask(levers={"course": engine.Fix("yes")}, watch=["score"])
        expected.append(answer["score"].set.mean)
        weights.append(weight)
    found = learned.model().ask(levers={"course": engine.Fix("yes")}, watch=["score"]).with_doubt(200, 20)["score"]
    spread = found.set.mean_draws.std()
    assert found.set.mean_draws.mean() == pytest.approx(np.average(expected, weights=weights), abs=0.1 * spread)


def test_a_mean_that_other_plausible_models_do_not_share_is_told(learned):
    doubted = learned.model(0).ask({"hours": 30.0}, watch=["score"]).with_doubt()
    caution = only(doubted, "models")
    assert "the mean of score" in caution.text
    assert caution.figures["model"] < caution.figures["low"]


def test_people_picked_after_a_lever_are_told_of_over_plausible_models_too(learned):
    model = learned.model(max(learned.curve["links"]))
    answer = model.ask(levers={"course": engine.Fix("yes")}, watch=["score"], pins_after={"hours": (None, 22.0)})
    doubted = answer.with_doubt(20, 20)
    left_out = doubted.doubt.left_out
    assert doubted["score"].set.mean_draws.shape == (400 - 20 * left_out,)


def test_sampled_answers_have_about_the_interval_that_exact_ones_have(learned):
    question = {"pins": {"area": "yes"}, "levers": {"course": engine.Fix("yes")}, "watch": ["score"]}
    exact = learned.model().ask(**question).with_doubt().change("score")
    sampled = learned.model().ask(**question, exact=False)
    found = sampled.with_doubt()
    width = exact[2] - exact[1]
    assert found.change("score")[1:] == pytest.approx(exact[1:], abs=0.15 * width)
    assert (found.mc_error, found.method) == (sampled.mc_error, "sampled, by likelihood weighting")
