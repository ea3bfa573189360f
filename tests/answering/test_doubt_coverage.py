"""Intervals hold the truth about as often as they say; the long run is tests.benchmarks.measured_coverage."""

import math

from engine.network import parameters
from tests.benchmarks.measured_coverage import EFFECTS, held_of_prior, held_of_school

TABLES_OF_PRIOR, TABLES, ROWS = 250, 16, 4000


def test_intervals_hold_changes_of_tables_drawn_from_the_prior():
    # the long run of 1,000 tables has to lie between .875 and .925; three binomial standard errors around .90 here
    error = math.sqrt(0.9 * 0.1 / TABLES_OF_PRIOR)
    assert abs(held_of_prior(TABLES_OF_PRIOR) - 0.90) <= 3.0 * error


def test_intervals_with_doubt_hold_changes_where_the_structure_is_learned():
    held = held_of_school(TABLES, ROWS, {"chosen": parameters.WEIGHTS})["chosen"]["with doubt"]
    # the long run has to hold .85 of them. The effects of one table are not independent: the margin takes them to be
    # worth two tables of one effect each.
    error = math.sqrt(0.85 * 0.15 / (2 * TABLES))
    assert sum(held) / len(EFFECTS) >= 0.85 - 3.0 * error
