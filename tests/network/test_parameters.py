"""Parameters: the prior's weight by marginal likelihood, shares that are never 0."""

import numpy as np
import pytest
from scipy import stats
from scipy.special import gammaln

from engine.network.parameters import WEIGHTS, dirichlet_posterior, predictive, prior_weight, smoothed_shares


def log_likelihood(counts, weight, shares):
    """Marginal likelihood as the product of one-step predictions, row by row of each configuration."""
    total = 0.0
    for row in counts:
        seen = np.zeros(len(row))
        for level in np.repeat(np.arange(len(row)), row):
            total += np.log((seen[level] + weight * shares[level]) / (seen.sum() + weight))
            seen[level] += 1
    return total


def test_the_weight_has_the_highest_marginal_likelihood_on_the_grid():
    rng = np.random.default_rng(3)
    for spread in (0.5, 5.0, 80.0):
        shares = np.asarray([0.5, 0.3, 0.2])
        counts = np.asarray([rng.multinomial(30, rng.dirichlet(spread * shares)) for _ in range(12)])
        logs = {weight: log_likelihood(counts, weight, shares) for weight in WEIGHTS}
        assert prior_weight(counts, shares) == max(WEIGHTS, key=lambda weight: logs[weight])


def test_no_configuration_gets_more_than_one_record_of_prior():
    rng = np.random.default_rng(8)
    shares = np.asarray([0.6, 0.4])
    for true in (0.2, 16.0, 128.0):
        counts = np.asarray([rng.multinomial(200, rng.dirichlet(true * shares)) for _ in range(40)])
        assert prior_weight(counts, shares) == (0.3 if true == 0.2 else 1.0)


def test_parents_that_say_nothing_never_make_an_interval_narrower_than_pooling():
    counts = np.asarray([[30, 20], [30, 20]])
    posterior = dirichlet_posterior(counts)
    pooled = stats.beta(61, 41).std()
    for row in posterior:
        assert stats.beta(*row).std() >= pooled
    assert (posterior.sum(axis=1) - 50 <= 50 + 1e-9).all()


def test_one_configuration_gets_one_record_of_prior():
    posterior = dirichlet_posterior(np.asarray([12, 0, 8]))
    assert posterior.sum() == pytest.approx(21.0)
    assert (posterior > 0).all()
    assert predictive(posterior) == pytest.approx([0.6, 0.0, 0.4], abs=0.03)


def test_no_share_is_ever_nought():
    counts = np.asarray([[[5, 0], [0, 0]], [[0, 0], [40, 0]]])
    shares = predictive(dirichlet_posterior(counts))
    assert shares.shape == counts.shape
    assert (shares > 0).all()
    assert shares.sum(axis=-1) == pytest.approx(np.ones((2, 2)))


def test_a_configuration_never_seen_reads_as_the_column_as_a_whole():
    counts = np.asarray([[40, 10], [5, 45], [0, 0]])
    assert predictive(dirichlet_posterior(counts))[2] == pytest.approx(smoothed_shares(np.asarray([45, 55])))


def test_smoothed_shares_add_one_record_spread_evenly():
    assert smoothed_shares(np.asarray([3, 0, 1])) == pytest.approx([(3 + 1 / 3) / 5, (1 / 3) / 5, (1 + 1 / 3) / 5])


def test_the_posterior_is_counts_and_prior():
    counts = np.asarray([[9, 1], [2, 8], [5, 5]])
    shares = np.asarray([0.55, 0.45])
    weight = prior_weight(counts, shares)
    assert dirichlet_posterior(counts, shares) == pytest.approx(counts + weight * shares)
    logs = [
        sum(
            gammaln(w) - gammaln(w + row.sum()) + (gammaln(w * shares + row) - gammaln(w * shares)).sum()
            for row in counts
        )
        for w in WEIGHTS
    ]
    assert logs[WEIGHTS.index(weight)] == max(logs)
