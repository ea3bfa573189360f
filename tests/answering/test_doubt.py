"""Intervals over plausible models are those of every graph weighed by its posterior, each with its own parameters."""

from dataclasses import replace

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st

import engine
from engine.answering.doubt import drawn_in_proportion
from engine.learning.posterior import Posterior
from tests import plainly
from tests.doubting.worlds import only
from tests.learning import plainly as learning_plainly

GRAPHS, ROWS = 2000, 60
COLUMNS = ("area", "offer", "stay", "passed")


def few_records(rows=ROWS, seed=13):
    """Four columns of which nobody can be sure what leads to what."""
    rng = np.random.default_rng(seed)
    area = rng.integers(0, 2, rows)
    offer = np.where(rng.random(rows) < 0.3, area, rng.integers(0, 2, rows))
    stay = np.where(rng.random(rows) < 0.35, offer, rng.integers(0, 2, rows))
    passed = np.where(rng.random(rows) < 0.3, stay, np.where(rng.random(rows) < 0.2, offer, rng.integers(0, 2, rows)))
    names = np.array(["no", "yes"])
    return pd.DataFrame(dict(zip(COLUMNS, (names[each] for each in (area, offer, stay, passed)), strict=True)))


@pytest.fixture(scope="module")
def unsure():
    """Learned from few records in one stage before the outcome."""
    order = engine.Order(
        [("Before", ["area", "offer", "stay"]), ("After", ["passed"])],
        changeable=["offer"],
        outcomes={"passed": "yes"},
    )
    return engine.learn(engine.Table.from_frame(few_records()), order, graphs=GRAPHS)


@pytest.fixture(scope="module")
def every_graph(unsure):
    """[(network, posterior share)] of every graph that the order allows, scored one by one."""
    coded = unsure.coded
    levels = [len(names) for names in coded.levels]
    graphs = list(learning_plainly.graphs(unsure.order, unsure.max_parents))
    scores = np.array(
        [
            sum(
                learning_plainly.family_score(coded.codes, levels, child, parents)
                for child, parents in enumerate(graph)
            )
            for graph in graphs
        ]
    )
    shares = np.exp(scores - np.logaddexp.reduce(scores))
    return [(unsure.network_of(graph), share) for graph, share in zip(graphs, shares, strict=True)]


def of_every_graph(every_graph, pins, lever):
    """(graphs, 2) share of those who pass among these and if set, and the graphs' shares; where it can be asked."""
    found, shares = [], []
    for network, share in every_graph:
        if set(pins) & network.descendants([lever]):
            continue
        worlds = [plainly.cases(network), plainly.cases(network, {lever: ("yes", 1.0)})]
        found.append([plainly.shares(network, world, pins, "passed")[1] for world in worlds])
        shares.append(share)
    return np.array(found), np.array(shares)


def test_pooled_draws_average_to_the_weighted_mean_over_every_graph(unsure, every_graph):
    # without pins a share is linear in each table, so that draws average to the share at the posterior means
    answer = unsure.model().ask(levers={"offer": engine.Fix("yes")}, watch=["passed"]).with_doubt(GRAPHS, 20)
    truth, shares = of_every_graph(every_graph, {}, "offer")
    reading = answer["passed"]
    for world, place in ((reading.among, 0), (reading.set, 1)):
        between = np.sqrt(shares @ (truth[:, place] - shares @ truth[:, place]) ** 2 / GRAPHS)
        within = world.share_draws("yes").std() / np.sqrt(GRAPHS * 20)
        assert world.share_draws("yes").mean() == pytest.approx(
            shares @ truth[:, place], abs=4.0 * np.hypot(between, within)
        )


def test_changes_spread_as_the_graphs_and_their_parameters_do(unsure, every_graph):
    answer = unsure.model().ask(levers={"offer": engine.Fix("yes")}, watch=["passed"]).with_doubt(GRAPHS, 20)
    change = answer["passed"].set.share_draws("yes") - answer["passed"].among.share_draws("yes")
    truth, shares = of_every_graph(every_graph, {}, "offer")
    effects = truth[:, 1] - truth[:, 0]
    between = shares @ (effects - shares @ effects) ** 2
    assert change.var() > between
    low, high = answer.change("passed", "yes")[1:]
    assert (low, high) == pytest.approx(np.quantile(change, [0.05, 0.95]))
    alone = unsure.model().ask(levers={"offer": engine.Fix("yes")}, watch=["passed"]).change("passed", "yes")
    assert answer.change("passed", "yes")[0] == alone[0]


def test_graphs_without_a_link_from_the_lever_say_that_nothing_moves(unsure, every_graph):
    answer = unsure.model().ask(levers={"offer": engine.Fix("yes")}, watch=["passed"]).with_doubt(GRAPHS, 20)
    change = answer["passed"].set.share_draws("yes") - answer["passed"].among.share_draws("yes")
    apart = sum(share for network, share in every_graph if "passed" not in network.descendants(["offer"]))
    assert 0.02 < apart < 0.98
    assert np.mean(change == 0.0) == pytest.approx(apart, abs=4.0 * np.sqrt(apart * (1.0 - apart) / GRAPHS))


def test_how_many_plausible_graphs_part_with_the_model_over_a_link_is_told(unsure, every_graph):
    linked, bare = unsure.model(max(unsure.curve["links"])), unsure.model(0)
    apart = sum(share for network, share in every_graph if "passed" not in network.descendants(["offer"]))
    for model, expected, words in ((linked, apart, "no link"), (bare, 1.0 - apart, "the one you accepted has none")):
        answer = model.ask(levers={"offer": engine.Fix("yes")}, watch=["passed"]).with_doubt(GRAPHS, 20)
        (caution,) = [each for each in answer.cautions if each.code == "models" and "apart" in each.figures]
        told = int(caution.figure.removesuffix(f" of {GRAPHS}"))
        assert told / GRAPHS == pytest.approx(expected, abs=4.0 * np.sqrt(apart * (1.0 - apart) / GRAPHS))
        assert words in caution.text


def test_graphs_in_which_a_pin_follows_from_the_lever_are_left_out_and_counted(unsure, every_graph):
    model = next(
        model
        for model in map(unsure.model, unsure.curve["links"])
        if "stay" not in model.network.descendants(["offer"])
    )
    answer = model.ask({"stay": "yes"}, {"offer": engine.Fix("yes")}, ["passed"]).with_doubt(GRAPHS, 20)
    follows = sum(share for network, share in every_graph if "stay" in network.descendants(["offer"]))
    assert 0.02 < follows < 0.98
    error = 4.0 * np.sqrt(follows * (1.0 - follows) / GRAPHS)
    assert answer.doubt.left_out / GRAPHS == pytest.approx(follows, abs=error)
    assert answer.doubted
    assert answer["passed"].set.draws.shape == (2, 20 * (GRAPHS - answer.doubt.left_out))
    caution = next(each for each in answer.cautions if each.code == "models" and "left out" in each.figures)
    assert caution.rank == ("weakens" if follows > 0.5 else "know")
    assert caution.figure == f"{answer.doubt.left_out} of {GRAPHS}"
    assert "“stay” follows “offer”" in caution.text
    truth, shares = of_every_graph(every_graph, {"stay": {"yes"}}, "offer")
    # among those pinned a share is a ratio, so that draws average near the share at the posterior means, not to it
    assert answer["passed"].set.share_draws("yes").mean() == pytest.approx(
        shares @ truth[:, 1] / shares.sum(), abs=0.02
    )


def test_the_same_question_has_the_same_interval_to_the_last_digit(unsure, tmp_path):
    def asked(learned, seed):
        answer = learned.model().ask({"area": "yes"}, {"offer": engine.Fix("yes", 0.8)}, ["passed"], seed=seed)
        return answer.with_doubt()["passed"]

    unsure.save(tmp_path / "kept")
    first, again = asked(unsure, 0), asked(engine.open_learned(tmp_path / "kept"), 0)
    for world in ("recorded", "among", "set", "had"):
        assert np.array_equal(getattr(first, world).draws, getattr(again, world).draws)
    assert np.array_equal(asked(unsure, 0).set.draws, first.set.draws)
    assert not np.array_equal(asked(unsure, 1).set.draws, first.set.draws)


def test_an_answer_asked_with_doubt_twice_forgets_the_first_time(unsure):
    once = unsure.model().ask(watch=["passed"])
    few = once.with_doubt(10, 20)
    assert few.with_doubt(50, 20).doubt.graphs == 50
    assert np.array_equal(few.with_doubt(50, 20)["passed"].recorded.draws, once.with_doubt()["passed"].recorded.draws)


def test_what_was_pinned_may_be_changed_afterwards(unsure):
    pins, levers = {"area": {"yes"}}, {"offer": engine.Fix("yes")}
    answer = unsure.model().ask(pins, levers, iter(["passed"]))
    expected = answer.with_doubt()["passed"].set.draws
    pins["area"].add("no")
    levers.clear()
    assert np.array_equal(answer.with_doubt()["passed"].set.draws, expected)


def test_a_posterior_of_one_graph_gives_about_the_interval_within_that_model(unsure):
    parents = unsure.parents_at()
    graph = np.array([[source in parents[target] for target in unsure.coded.names] for source in unsure.coded.names])
    certain = replace(unsure, posterior=Posterior(graph * 1.0, graph[None], np.ones(1)))
    question = {"pins": {"area": "yes"}, "levers": {"offer": engine.Fix("yes")}, "watch": ["passed"]}
    within = certain.model().ask(**question, draws=20_000).change("passed", "yes")
    over = certain.model().ask(**question).with_doubt(1000, 20)
    assert over.doubt.different == 1
    assert over.change("passed", "yes") == pytest.approx(within, abs=0.01)


def test_weights_count_graphs_as_often_as_they_weigh(unsure):
    bare = np.zeros((4, 4), dtype=bool)
    linked = bare.copy()
    linked[1, 3] = True  # offer leads to passed
    weighed = replace(unsure, posterior=Posterior(linked * 0.3, np.stack([linked, bare]), np.array([0.3, 0.7])))
    answer = weighed.model().ask(levers={"offer": engine.Fix("yes")}, watch=["passed"]).with_doubt(50, 20)
    change = answer["passed"].set.share_draws("yes") - answer["passed"].among.share_draws("yes")
    assert np.sum(change == 0.0) == 35 * 20
    assert answer.doubt.effective == pytest.approx(1.0 / (0.3**2 + 0.7**2))


def test_a_figure_that_other_plausible_models_do_not_share_is_told(unsure):
    rng = np.random.default_rng(0)
    offer = rng.integers(0, 2, 2000)
    passed = np.where(rng.random(2000) < 0.3, offer, rng.integers(0, 2, 2000))
    names = np.array(["no", "yes"])
    order = engine.Order(
        [("Before", ["offer"]), ("After", ["passed"])], changeable=["offer"], outcomes={"passed": "yes"}
    )
    learned = engine.learn(
        engine.Table.from_frame(pd.DataFrame({"offer": names[offer], "passed": names[passed]})), order
    )
    bare = learned.model(0).ask(levers={"offer": engine.Fix("yes")})
    assert all(each.code != "models" for each in bare.cautions)
    doubted = bare.with_doubt()
    caution = only(doubted, "models")
    assert (caution.rank, caution.columns) == ("know", ("passed", "offer"))
    assert caution.figures["model"] == 0.0 < caution.figures["low"]
    assert doubted.checks_made == bare.checks_made + 1
    assert all(
        each.code != "models" for each in learned.model(1).ask({}, {"offer": engine.Fix("yes")}).with_doubt().cautions
    )


def test_a_question_that_no_plausible_graph_can_be_asked_keeps_the_narrower_interval(unsure):
    linked = np.zeros((4, 4), dtype=bool)
    linked[1, 2] = True  # offer leads to stay
    certain = replace(unsure, posterior=Posterior(linked * 1.0, linked[None], np.ones(1)))
    answer = certain.model(0).ask({"stay": "yes"}, {"offer": engine.Fix("yes")}, ["passed"])
    doubted = answer.with_doubt()
    assert not doubted.doubted
    assert np.array_equal(doubted["passed"].set.draws, answer["passed"].set.draws)
    caution = only(doubted, "models")
    assert (caution.rank, caution.figure) == ("weakens", "none of 50")


def test_a_network_given_as_it_is_has_no_doubt_to_add():
    model = engine.Model.from_network([engine.Category("wet", ["no", "yes"], table=[0.7, 0.3])])
    answer = model.ask()
    assert answer.with_doubt() is answer
    assert not answer.doubted


@pytest.mark.parametrize(
    ("graphs", "draws"), [(0, 20), (-1, 20), (2.5, 20), ("many", 20), (50, 19), (50, 0), (50, None)]
)
def test_numbers_from_which_no_interval_can_be_told_are_refused(unsure, graphs, draws):
    with pytest.raises(engine.Refusal):
        unsure.model().ask(watch=["passed"]).with_doubt(graphs, draws)


def test_models_learned_without_graphs_say_so():
    order = engine.Order([("Before", ["area"]), ("After", ["passed"])], outcomes={"passed": "yes"})
    table = engine.Table.from_frame(few_records()[["area", "passed"]])
    with pytest.raises(engine.Refusal, match="No graphs were drawn"):
        engine.learn(table, order, graphs=0).model().ask().with_doubt()


@given(st.lists(st.floats(1e-6, 1.0), min_size=1, max_size=30), st.integers(1, 400))
def test_graphs_are_taken_in_proportion_to_their_weights(weights, count):
    weights = np.array(weights) / np.sum(weights)
    taken = drawn_in_proportion(weights, count)
    assert taken.sum() == count
    assert np.all(np.abs(taken - count * weights) < 1.0 + 1e-9)
