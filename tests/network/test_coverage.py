"""Intervals hold the truth about as often as they say, on tables whose network is known."""

import numpy as np
import pytest

import engine
from engine.network.parameters import dirichlet_posterior, predictive

COLUMNS = {"area": 3, "need": 3, "lever": 2, "step": 2, "outcome": 2}
PARENTS = {
    "area": (),
    "need": ("area",),
    "lever": ("area", "need"),
    "step": ("lever", "area"),
    "outcome": ("step", "need", "lever"),
}


def generating_tables(rng, additive):
    """Shares of every column: drawn freely, or a common slope per parent on the log odds."""
    tables = {}
    for name, parents in PARENTS.items():
        shape = [COLUMNS[parent] for parent in parents]
        if not additive or COLUMNS[name] != 2:
            tables[name] = rng.dirichlet(np.full(COLUMNS[name], 1.5), size=shape)
            continue
        odds = np.full(shape, rng.normal(scale=0.5))
        for axis, size in enumerate(shape):
            odds += rng.normal(scale=0.8, size=size).reshape([-1 if a == axis else 1 for a in range(len(shape))])
        yes = 1 / (1 + np.exp(-odds))
        tables[name] = np.stack([1 - yes, yes], axis=-1)
    return tables


def records(rng, tables, rows):
    drawn = {}
    for name, parents in PARENTS.items():
        shares = np.broadcast_to(tables[name][tuple(drawn[parent] for parent in parents)], (rows, COLUMNS[name]))
        drawn[name] = (rng.random(rows)[:, None] > np.cumsum(shares, axis=1)).sum(axis=1).clip(max=COLUMNS[name] - 1)
    return drawn


def as_model(tables, posteriors=None):
    return engine.Model.from_network(
        engine.Category(
            name,
            [str(level) for level in range(COLUMNS[name])],
            parents,
            tables[name],
            None if posteriors is None else posteriors[name],
        )
        for name, parents in PARENTS.items()
    )


def counted(drawn):
    """Column -> records in every cell of its table."""
    found = {}
    for name, parents in PARENTS.items():
        found[name] = np.zeros([*(COLUMNS[parent] for parent in parents), COLUMNS[name]])
        np.add.at(found[name], tuple(drawn[column] for column in (*parents, name)), 1)
    return found


def learned(drawn):
    posteriors = {name: dirichlet_posterior(counts) for name, counts in counted(drawn).items()}
    return as_model({name: predictive(posterior) for name, posterior in posteriors.items()}, posteriors)


@pytest.mark.parametrize(
    ("rows", "additive", "least"), [(300, False, 0.80), (1500, False, 0.84), (300, True, 0.80), (1500, True, 0.84)]
)
def test_ninety_per_cent_intervals_of_a_change_hold_the_truth(rows, additive, least):
    rng = np.random.default_rng([rows, additive])
    held, tables_tried = 0, 150
    for seed in range(tables_tried):
        tables = generating_tables(rng, additive)
        question = {"pins": {"need": "1"}, "levers": {"lever": engine.Fix("1")}, "watch": ["outcome"]}
        true = as_model(tables).ask(**question)["outcome"]
        answer = learned(records(rng, tables, rows)).ask(**question, seed=seed)
        _, low, high = answer.change("outcome", "1")
        held += low <= true.set.share("1") - true.among.share("1") <= high
    # Three binomial standard errors under 90 of 100 are 83 of 100. With 300 rows over 18 configurations intervals run
    # a little short (83 to 85 of 100 measured); heavier priors than one record a configuration made that worse.
    assert held / tables_tried >= least
