"""Numbers act on categories through bands: their column's own, or others."""

import numpy as np

from engine.learning.cuts import banded, number_cuts
from engine.learning.learn import learn_coded
from engine.records.bands import band_codes
from tests.learning.test_mixed import ORDERS, records


def test_the_cuts_of_every_number_are_those_of_its_column():
    coded = records()
    assert number_cuts(coded) == {1: coded.cuts[1], 3: coded.cuts[3]}
    assert banded(coded, number_cuts(coded)) is coded


def test_other_cuts_change_the_bands_of_that_number_alone():
    coded = records()
    middle = float(np.median(coded.values[:, 0]))
    again = banded(coded, {**number_cuts(coded), 1: (middle,)})
    assert again.cuts == (coded.cuts[0], (middle,), *coded.cuts[2:])
    assert np.array_equal(again.codes[:, 1], band_codes(coded.values[:, 0], (middle,))) and len(again.levels[1]) == 2
    assert np.array_equal(again.codes[:, [0, 2, 3]], coded.codes[:, [0, 2, 3]])
    assert len(learn_coded(again, ORDERS[0], folds=False).family(1, ()).levels) == 2
