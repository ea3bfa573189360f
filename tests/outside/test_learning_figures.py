"""Learning against figures from outside; the source of each stands in learning_figures.json."""

import json
from itertools import combinations
from math import exp, log, prod
from pathlib import Path

import numpy as np
import pytest

from engine.learning.families import candidates
from engine.learning.layers import Layers
from engine.learning.learn import learn_coded
from engine.learning.posterior import posterior
from engine.learning.scores import set_scores
from engine.network.equivalence import unsettled_links
from engine.network.network import Category, Network
from engine.order import Order
from engine.records.counts import ArrayCounts, rank
from tests.learning import plainly

CASES = json.loads((Path(__file__).parent / "learning_figures.json").read_text(encoding="utf-8"))


def figures(case, *, starting=""):
    found = [figure for figure in CASES[case]["figures"] if figure["name"].startswith(starting)]
    assert found, f"{case} has no figure {starting}"
    return found


def figure(case, name):
    (found,) = (each for each in CASES[case]["figures"] if each["name"] == name)
    return found["value"]


def records(case):
    """(names, levels, codes) of an inline table, its rows repeated where it has a count."""
    data = CASES[case]["data"]
    names = [name for name in data["columns"] if name != data.get("count")]
    rows = [row[: len(names)] for row in data["rows"] for _ in range(row[len(names)] if "count" in data else 1)]
    levels = [sorted({row[place] for row in rows}) for place in range(len(names))]
    codes = np.asarray([[levels[place].index(value) for place, value in enumerate(row)] for row in rows])
    return names, [len(each) for each in levels], codes


def family(codes, levels, ess, child, parents):
    found = set_scores(ArrayCounts(codes, levels), len(levels), ess)
    both = sorted((*parents, child))
    return found.by_size[len(both)][0, rank(both)] - found.by_size[len(parents)][0, rank(sorted(parents))]


# Ten cases (Cooper & Herskovits 1992): every cell's prior is 1, so a family's sample size is its number of cells.


def all_ones(child, parents):
    _, levels, codes = records("ten-cases")
    return family(codes, levels, float(prod(levels[column] for column in (*parents, child))), child, parents)


@pytest.mark.parametrize("told", figures("ten-cases", starting="log f"), ids=lambda told: told["name"])
def test_a_family_of_the_ten_cases_scores_as_published(told):
    child, _, parents = told["name"].removeprefix("log f(").removesuffix(")").partition(" | ")
    places = [int(name.removeprefix("x")) - 1 for name in parents.split(", ") if name]
    assert all_ones(int(child.removeprefix("x")) - 1, places) == pytest.approx(told["value"], abs=told["tolerance"])


@pytest.mark.parametrize(
    ("name", "graph"),
    [("P(data | x1 -> x2 -> x3)", [(), (0,), (1,)]), ("P(data | x2 <- x1 -> x3)", [(), (0,), (0,)])],
)
def test_a_network_of_the_ten_cases_is_as_likely_as_published(name, graph):
    (told,) = figures("ten-cases", starting=name)
    log = sum(all_ones(child, parents) for child, parents in enumerate(graph))
    assert exp(log) == pytest.approx(told["value"], abs=told["tolerance"])


def test_the_parents_chosen_for_the_ten_cases_are_the_published_ones():
    chosen = {}
    for child in range(3):
        choices = [parents for count in range(child + 1) for parents in combinations(range(child), count)]
        best = max(choices, key=lambda parents, child=child: all_ones(child, parents))
        chosen[f"x{child + 1}"] = [f"x{parent + 1}" for parent in best]
    assert chosen == figure("ten-cases", "parents chosen under the order x1, x2, x3")


# Score equivalence (Heckerman, Geiger & Chickering 1995).


@pytest.mark.parametrize("ess", [1, 10])
def test_local_scores_are_those_of_the_closed_form(ess):
    _, levels, codes = records("score-equivalence")
    for told in figures("score-equivalence", starting=f"ess {ess}: local score of "):
        child, _, parents = told["name"].partition("local score of ")[2].partition(" given ")
        places = [int(name.strip("'x")) - 1 for name in parents.strip("[]").split(", ") if name]
        found = family(codes, levels, float(ess), int(child[1:]) - 1, places)
        assert found == pytest.approx(told["value"], abs=told["tolerance"])


@pytest.mark.parametrize("ess", [1, 10])
def test_equivalent_networks_score_the_same_and_others_do_not(ess):
    _, levels, codes = records("score-equivalence")

    def score(graph):
        return sum(family(codes, levels, float(ess), child, parents) for child, parents in enumerate(graph))

    chain = figure("score-equivalence", f"ess {ess}: x1 -> x2 -> x3")
    for graph in ([(), (0,), (1,)], [(1,), (), (1,)], [(1,), (2,), ()]):
        assert score(graph) == pytest.approx(chain, abs=1e-9)
    collider = figure("score-equivalence", f"ess {ess}: the collider x1 -> x2 <- x3")
    assert score([(), (0, 2), ()]) == pytest.approx(collider, abs=1e-9)
    every = list(plainly.graphs(Order([("All", ["x1", "x2", "x3"])]), 2))
    assert len(every) == 25
    assert len({score(graph) for graph in every}) == figure(
        "score-equivalence", f"ess {ess}: distinct scores among the 25 networks"
    )


# Every network on four columns (Robinson 1973; Fair 1978).


@pytest.mark.parametrize("columns", [1, 2, 3, 4])
def test_one_stage_allows_every_labelled_network(columns):
    order = Order([("All", [f"c{place}" for place in range(columns)])])
    count = sum(1 for _ in plainly.graphs(order, columns))
    assert count == figure("every-network", f"labelled networks on {columns} columns")


@pytest.mark.parametrize("columns", range(1, 9))
def test_layers_count_every_labelled_network_once(columns):
    sets = np.arange(1 << columns)
    own = sets[None, :] >> np.arange(columns)[:, None] & 1  # a column is no parent of its own
    found = Layers(np.where(own == 1, -np.inf, 0.0)).log_sum
    assert found == pytest.approx(log(figure("every-network", f"labelled networks on {columns} columns")), abs=1e-10)


@pytest.mark.parametrize(
    "told", figures("every-network", starting="networks allowed by stages of sizes"), ids=lambda told: told["name"]
)
def test_stages_allow_as_many_networks_as_counted(told):
    sizes = json.loads(told["name"].rpartition("sizes ")[2])
    stages = [(f"stage {s}", [f"c{s} {place}" for place in range(size)]) for s, size in enumerate(sizes)]
    assert sum(1 for _ in plainly.graphs(Order(stages), sum(sizes))) == told["value"]


@pytest.mark.parametrize(("staging", "ess"), [("one stage", 1), ("one stage", 10), ("three stages", 1)])
def test_best_networks_of_the_survey_are_those_of_enumeration(staging, ess):
    names, levels, codes = records("every-network")
    order = Order([("All", names)] if staging == "one stage" else CASES["every-network"]["stages"])
    sorted_codes = codes[:, [names.index(name) for name in order.columns]]
    coded = plainly.coded_columns(order.columns, levels, sorted_codes)
    learned = learn_coded(coded, order, max_parents=3, ess=float(ess), folds=False)
    assert sum(1 for _ in plainly.graphs(order, 3)) == figure(
        "every-network", f"{staging}, ess {ess}: networks allowed"
    )
    at_most = learned.curve["score"].cummax()
    for links in range(7):
        told = figure("every-network", f"{staging}, ess {ess}: best score with at most {links} links")
        assert at_most[links] == pytest.approx(told, abs=1e-6)
    best = [tuple(link) for link in figure("every-network", f"{staging}, ess {ess}: links of a best network")]
    ours = learned.network().links
    assert {frozenset(link) for link in ours} == {frozenset(link) for link in best}
    settled = set(best) - unsettled_links(best, order.may_lead)
    assert settled == set(ours) - unsettled_links(ours, order.may_lead)


@pytest.mark.parametrize(("staging", "ess"), [("one stage", 1), ("one stage", 10), ("three stages", 1)])
def test_support_in_the_survey_is_that_of_every_network_weighed(staging, ess):
    names, levels, codes = records("every-network")
    order = Order([("All", names)] if staging == "one stage" else CASES["every-network"]["stages"])
    places = [names.index(name) for name in order.columns]
    counts = ArrayCounts(codes[:, places], [levels[place] for place in places])
    scores = set_scores(counts, 4, float(ess))
    found = posterior(candidates(order, 3), scores, 3, 0, np.random.default_rng(0))
    told = list(figures("every-network", starting=f"{staging}, ess {ess}: support of "))
    assert len(told) == (12 if staging == "one stage" else 7)
    for each in told:
        source, target = (order.columns.index(name) for name in each["name"].rpartition("of ")[2].split(" -> "))
        assert found.support[source, target] == pytest.approx(each["value"], abs=1e-6)


# Credible intervals for shares (conjugate results), through the draws of a network's tables.


@pytest.mark.parametrize(("hits", "rows", "prior"), [(13, 43, 1), (13, 43, 0.5), (0, 12, 1), (7, 9, 1)])
def test_draws_of_a_share_are_those_of_the_beta_distribution(hits, rows, prior):
    name = f"{hits} of {rows}, prior Beta({prior}, {prior}): "
    wanted = {each["name"].removeprefix(name): each for each in figures("beta-intervals", starting=name)}
    counts = np.asarray([rows - hits + prior, hits + prior])
    node = Category("passed", ("no", "yes"), table=counts / counts.sum(), dirichlet=counts)
    (drawn,) = Network((node,)).draws(20_000, seed=1)
    assert drawn[1, 0] == pytest.approx(wanted["mean"]["value"], abs=wanted["mean"]["tolerance"])
    for point in ("5%", "95%"):
        told = wanted[f"{point} point"]
        level = float(point.removesuffix("%")) / 100
        assert np.quantile(drawn[1, 1:], level) == pytest.approx(told["value"], abs=told["tolerance"])


def test_draws_of_a_dirichlet_have_its_mean_and_spread():
    counts = np.asarray([4.0, 6.0, 3.0])
    (drawn,) = Network((Category("c", ("a", "b", "c"), table=counts / 13, dirichlet=counts),)).draws(20_000, seed=2)
    name = "Dirichlet(4, 6, 3): {} of the second share"
    assert drawn[1, 0] == pytest.approx(figure("beta-intervals", name.format("mean")), abs=1e-12)
    assert drawn[1, 1:].std() == pytest.approx(figure("beta-intervals", name.format("sd")), abs=0.003)


def test_two_shares_are_drawn_independently():
    """Small stones: treatment A 81 of 87, treatment B 234 of 270 (Charig and others 1986), uniform priors."""
    counts = np.asarray([[7.0, 82.0], [37.0, 235.0]])
    table = counts / counts.sum(axis=1, keepdims=True)
    treatment = Category("treatment", ("A", "B"), table=[0.5, 0.5])
    network = Network((treatment, Category("success", ("no", "yes"), ("treatment",), table, counts)))
    drawn = network.draws(20_000, seed=3)[1]
    told = figure("beta-intervals", "small stones: chance that A succeeds more often than B, uniform priors")
    assert (drawn[0, 1, 1:] > drawn[1, 1, 1:]).mean() == pytest.approx(told, abs=0.02)
