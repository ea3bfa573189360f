"""Published graphs with unrecorded causes: which answers follow from what is recorded, and their values to 1e-9.

identified_graphs.json holds small graphs, each with the joint of its recorded columns, the last column fastest. Their
criterion: Pearl 1995, Causal diagrams for empirical research, Biometrika 82; Tian & Pearl 2002, A general
identification condition for causal effects; Shpitser & Pearl 2006, Identification of joint interventional
distributions in recursive semi-Markovian causal models. The verdicts were checked by enumeration, the values computed
from the joint and from the model with its unrecorded columns.
"""

import json
from pathlib import Path

import numpy as np
import pytest

import engine
from engine.doubting.bounds import no_assumption_bounds
from engine.doubting.graph import graph
from engine.doubting.identification import Functional, Hedge, identify
from engine.doubting.identified import Joint, identified_shares
from engine.network.network import network

GRAPHS = json.loads((Path(__file__).parent / "identified_graphs.json").read_text(encoding="utf-8"))
ASKED = [(each, asked) for each in GRAPHS for asked in each["asked"]]


def joint_of(columns, cells, levels):
    """The network, each column given all before it, that has these shares of cells (levels of each column...)."""
    nodes = []
    for count, column in enumerate(columns):
        upto = cells.sum(axis=tuple(range(count + 1, len(columns))))
        nodes.append(engine.Category(column, levels, columns[:count], upto / upto.sum(axis=-1, keepdims=True)))
    fitted = network(nodes)
    return Joint(fitted, dict(zip(fitted.names, fitted.draws(0, 0), strict=True)))


def declared(each):
    return graph(each["columns"], map(tuple, each["links"]), each["unrecorded"])


@pytest.mark.parametrize("each", GRAPHS, ids=lambda each: each["name"])
def test_which_answers_follow_from_what_is_recorded(each):
    found = identify(declared(each), [each["outcome"]], each["levers"])
    assert isinstance(found, Functional) == each["identified"]
    if isinstance(found, Hedge):
        assert set(map(frozenset, found.pairs)) <= set(map(frozenset, each["unrecorded"])) and found.pairs


def test_nineteen_graphs_and_the_napkin_are_asked_about():
    assert len(GRAPHS) == 20 and sum(each["identified"] for each in GRAPHS) == 12 and len(ASKED) == 26


@pytest.mark.parametrize(("each", "asked"), ASKED, ids=lambda given: str(given.get("name", given.get("levers"))))
def test_what_follows_has_the_value_of_the_model_with_its_unrecorded_columns(each, asked):
    columns = each["columns"]
    joint = joint_of(columns, np.reshape(each["joint"], (2,) * len(columns)), ("0", "1"))
    found = identify(declared(each), [asked["outcome"]], asked["levers"])
    shares = identified_shares(found, joint, {lever: int(level) for lever, level in asked["levers"].items()})
    assert shares[int(asked["level"]), 0] == pytest.approx(asked["share"], abs=1e-9)
    whole = engine.Model.from_network([engine.Category(**node) for node in each["whole"]])
    truth = whole.ask(levers={lever: engine.Fix(level) for lever, level in asked["levers"].items()})
    assert truth[asked["outcome"]].set.shares[asked["level"]] == pytest.approx(asked["share"], abs=1e-9)


# Pearl 2000, Causality, section 3.3: the invented numbers of its table of smoking, tar and cancer, per 4,000.
SMOKING = {
    ("no", "no"): (1710, 190),
    ("yes", "no"): (10, 90),
    ("no", "yes"): (95, 5),
    ("yes", "yes"): (285, 1615),
}
ORDER = {
    "stages": [("Habit", ["smoker"]), ("Lungs", ["tar"]), ("Illness", ["cancer"])],
    "insist": [("smoker", "tar"), ("tar", "cancer")],
}


def smoking():
    levels = ("no", "yes")
    cells = np.array([[SMOKING[smoker, tar] for tar in levels] for smoker in levels], dtype=float) / 4000
    return joint_of(["smoker", "tar", "cancer"], cells, levels)


def of(order):
    """The graph of an order in which every link that it allows is there."""
    allows = order.allows()
    links = [(row.source, row.target) for row in allows[allows.allowed].itertuples()]
    return graph(order.columns, links, [(pair.first, pair.second) for pair in order.unrecorded])


def test_smoking_turns_round_through_the_front_door():
    order = engine.Order(**ORDER, unrecorded=[engine.Unrecorded("smoker", "cancer", direct=False)])
    found, joint = identify(of(order), ["cancer"], ["smoker"]), smoking()
    values = [identified_shares(found, joint, {"smoker": level})[1, 0] for level in (0, 1)]
    assert values == pytest.approx([0.4975, 0.4525], abs=1e-9)
    among = identify(of(order), ["cancer"], [], ["smoker"])
    seen = [identified_shares(among, joint, {}, {"smoker": frozenset((level,))})[1, 0] for level in (0, 1)]
    assert seen == pytest.approx([0.0975, 0.8525], abs=1e-9)


def test_smoking_asked_of_a_model():
    order = engine.Order(
        **ORDER,
        unrecorded=[engine.Unrecorded("smoker", "cancer", direct=False)],
        changeable=["smoker"],
        outcomes={"cancer": "yes"},
    )
    model = engine.Model.from_network(smoking().network.nodes, order=order)
    on, off = engine.Fix("yes"), engine.Fix("no")
    answer = model.ask(levers={"smoker": on}, against={"smoker": off})
    assert answer.change("cancer", "yes")[0] == pytest.approx(-0.045, abs=1e-9) and not answer.blocked
    order = engine.Order(**ORDER, unrecorded=[engine.Unrecorded("smoker", "cancer")], changeable=["smoker"])
    model = engine.Model.from_network(smoking().network.nodes, order=order)
    assert model.ask(levers={"smoker": on}, watch=["cancer"]).blocked


def test_a_direct_link_beside_the_unrecorded_cause_closes_the_front_door():
    order = engine.Order(**ORDER, unrecorded=[engine.Unrecorded("smoker", "cancer")])
    found = identify(of(order), ["cancer"], ["smoker"])
    assert isinstance(found, Hedge) and found.columns == ("smoker", "cancer")


# Manski 1990, Nonparametric bounds on treatment effects, AER 80; the patients of Charig, Webb, Payne & Wickham 1986,
# BMJ 292: of 350 with either treatment, 273 and 289 succeeded.
def test_bounds_that_assume_nothing():
    patients = np.array([[77.0, 273.0], [61.0, 289.0]])[..., None] / 700
    low, high = (bound[:, 1, 0] for bound in no_assumption_bounds(patients))
    assert low == pytest.approx([0.39, 0.412857142857], abs=1e-12)
    assert high == pytest.approx([0.89, 0.912857142857], abs=1e-12)
    difference = (low[0] - high[1], high[0] - low[1])
    assert difference == pytest.approx((-0.522857142857, 0.477142857143), abs=1e-12)
    assert difference[0] < 0.832546217386 - 0.778875 < difference[1]
