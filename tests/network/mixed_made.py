"""Networks of categories and numbers: made up by hypothesis, and learned from made-up records."""

import numpy as np
import pandas as pd
from hypothesis import assume
from hypothesis import strategies as st

import engine
from engine.network.network import network
from engine.network.parameters import dirichlet_posterior, predictive
from engine.network.regression import family_regression
from engine.records.bands import band_codes
from engine.records.moments import ArrayMoments, Numbers
from engine.refusal import Refusal
from tests.answering.mixed_generated import mixed_nodes


@st.composite
def mixed_networks(draw, most=6, exact_numbers=True):
    """2 to `most` columns of both kinds, parameters known exactly, in any order."""
    nodes = draw(st.permutations(draw(mixed_nodes(most, exact_numbers=exact_numbers))))
    try:
        return network(nodes)
    except Refusal:  # a number without bands that leads to a category
        return assume(False)


def school(rows=600, seed=0):
    """(frame, network): site -> hours, (site, hours) -> score, (hours, score) -> passed, with posteriors."""
    rng = np.random.default_rng(seed)
    site = rng.choice(3, rows, p=[0.5, 0.3, 0.2])
    hours = 10.0 + 4.0 * site + rng.normal(0.0, 3.0, rows)
    score = 40.0 + 5.0 * site + (1.0 + 0.5 * site) * hours + rng.normal(0.0, 6.0, rows)
    passed = (rng.random(rows) < 1 / (1 + np.exp(-(score - 60) / 8))).astype(int)
    frame = pd.DataFrame(
        {
            "site": np.array(["north", "south", "west"], dtype=object)[site],
            "hours": hours,
            "score": score,
            "passed": np.array(["no", "yes"], dtype=object)[passed],
        }
    )
    return frame, network(_learned(frame))


def _learned(frame):
    bands = {"hours": (10.0, 16.0), "score": (55.0, 65.0, 75.0)}
    levels = {"site": ("north", "south", "west"), "passed": ("no", "yes")}
    codes = np.column_stack(
        [
            np.array([levels["site"].index(text) for text in frame["site"]]),
            *(band_codes(frame[name].to_numpy(), cuts) for name, cuts in bands.items()),
            np.array([levels["passed"].index(text) for text in frame["passed"]]),
        ]
    )
    sizes = [3, 3, 4, 2]
    made = ArrayMoments(codes, sizes, Numbers.standardised([1, 2], frame[["hours", "score"]].to_numpy()))

    def table(child, *parents):
        counts = np.zeros([sizes[place] for place in (*parents, child)])
        np.add.at(counts, tuple(codes[:, place] for place in (*parents, child)), 1.0)
        posterior = dirichlet_posterior(counts)
        return predictive(posterior), posterior

    yield engine.Category("site", levels["site"], [], *table(0))
    for place, categories, numbers in ((1, [0], []), (2, [0], [1])):
        name, found = list(frame.columns)[place], family_regression(made.family(categories, numbers, place))
        mean, parents = found.means, [frame.columns[at] for at in (*categories, *numbers)]
        yield engine.Number(name, parents, mean.intercept, mean.slopes, mean.variance, bands[name], found)
    yield engine.Category("passed", levels["passed"], ["hours", "score"], *table(3, 1, 2))
