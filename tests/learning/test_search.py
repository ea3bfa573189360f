"""The best model of every size is the best of all graphs."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from engine.learning.learn import learn_coded
from engine.order import Order
from engine.refusal import Refusal
from tests.learning import plainly


@st.composite
def problems(draw):
    """Up to four columns in random stages, with links insisted on and ruled out, and records with some dependence."""
    columns = draw(st.integers(1, 4))
    names = draw(st.permutations(["a", "b", "c", "d"][:columns]))
    stages: list[list[str]] = [[]]
    for name in names:
        if stages[-1] and draw(st.booleans()):
            stages.append([])
        stages[-1].append(name)
    flat = list(names)
    pairs = [(flat[i], flat[j]) for i in range(columns) for j in range(columns) if i != j]
    forward = [(s, t) for s, t in pairs if flat.index(s) < flat.index(t)]
    insist = draw(st.lists(st.sampled_from(forward), max_size=2, unique=True)) if forward else []
    rule_out = draw(st.lists(st.sampled_from(pairs), max_size=3, unique=True)) if pairs else []
    order = Order(
        [(f"stage {place}", stage) for place, stage in enumerate(stages)],
        insist=insist,
        rule_out=[pair for pair in rule_out if pair not in insist],
    )
    levels = [draw(st.integers(2, 4)) for _ in range(columns)]
    rng = np.random.default_rng(draw(st.integers(0, 2**32 - 1)))
    rows = draw(st.integers(30, 120))
    codes = np.empty((rows, columns), dtype=np.int64)
    for place in range(columns):
        codes[:, place] = rng.integers(0, levels[place], rows)
        if place and draw(st.booleans()):
            copied = rng.random(rows) < 0.6
            codes[copied, place] = codes[copied, rng.integers(0, place)] % levels[place]
    codes[:2] = np.asarray([[0] * columns, [1] * columns])
    return order, levels, codes, draw(st.integers(1, 4))


@settings(max_examples=60, deadline=None)
@given(problems())
def test_best_score_at_every_number_of_links_is_that_of_enumeration(problem):
    order, levels, codes, max_parents = problem
    truth = plainly.best_by_links(codes, levels, order, max_parents)
    coded = plainly.coded_columns(order.columns, levels, codes)
    if not truth:
        with pytest.raises(Refusal):
            learn_coded(coded, order, max_parents=max_parents, folds=False)
        return
    learned = learn_coded(coded, order, max_parents=max_parents, folds=False)
    assert learned.curve["links"].tolist() == sorted(truth)
    assert learned.curve["score"].to_numpy() == pytest.approx([truth[k] for k in sorted(truth)], abs=1e-9, rel=0)
    for links, score in truth.items():
        graph = learned.chosen[links]
        assert graph in set(plainly.graphs(order, max_parents)) or tuple(map(tuple, map(sorted, graph))) in set(
            plainly.graphs(order, max_parents)
        )
        assert plainly.links_of(graph) == links
        told = sum(plainly.family_score(codes, levels, child, parents) for child, parents in enumerate(graph))
        assert told == pytest.approx(score, abs=1e-9, rel=0)
