"""Published counts learned from and asked: setting a column turns round what is merely seen."""

import numpy as np
import pytest

import engine
from engine.learning.learn import learn_coded
from engine.model import Learned
from engine.records.table import Coded
from tests.outside.test_published_answers import ADMISSIONS, KIDNEY_STONES


def coded(rows, names):
    """Coded columns from (level, ..., times) rows."""
    levels = [tuple(sorted({row[place] for row in rows})) for place in range(len(names))]
    codes = [[levels[place].index(row[place]) for place in range(len(names))] for row in rows for _ in range(row[-1])]
    return Coded(
        names=tuple(names),
        kinds=("category",) * len(names),
        levels=tuple(levels),
        cuts=((),) * len(names),
        has_blank=(False,) * len(names),
        codes=np.asfortranarray(np.array(codes, dtype=np.int32)),
        weights=np.ones(len(codes)),
    )


def learned(rows, names, **rest):
    order = engine.Order([(f"Stage {name}", [name]) for name in names], changeable=[names[1]], **rest)
    found = learn_coded(coded(rows, names), order, "a digest")
    return Learned(**{name: getattr(found, name) for name in found.__dataclass_fields__})


@pytest.fixture(scope="module")
def stones():
    return learned(KIDNEY_STONES, ["size", "treatment", "success"], outcomes={"success": "yes"})


def test_the_treatment_that_looks_worse_is_better_when_set(stones):
    # Charig et al. 1986, BMJ 292: standardised over stone size, A is better than B by .0537.
    model = stones.model(3)
    a, b = (model.ask(levers={"treatment": engine.Fix(level)})["success"] for level in ("A", "B"))
    assert a.had.share("yes") < b.had.share("yes") and a.set.share("yes") > b.set.share("yes")
    low, high = np.quantile(a.set.share_draws("yes") - b.set.share_draws("yes"), [0.05, 0.95])
    assert low < 0.0536712173856 < high
    # Tolerance .01: learned with a prior, the tables are smoothed a little.
    assert a.set.share("yes") - b.set.share("yes") == pytest.approx(0.0536712173856, abs=0.01)


def test_admissions_learned_from_the_records():
    # Bickel, Hammel & O'Connell 1975, Science 187: standardised to all applicants; .01 covers the prior's smoothing.
    rows = [
        (department, gender, decision, count)
        for department, (a, b, c, d) in ADMISSIONS.items()
        for gender, decision, count in (
            ("male", "yes", a),
            ("male", "no", b),
            ("female", "yes", c),
            ("female", "no", d),
        )
    ]
    found = learned(rows, ["department", "gender", "admitted"], insist=[("gender", "admitted")])
    model = found.model(3)
    for gender, expected in (("male", 0.387318582689), ("female", 0.429955380461)):
        answer = model.ask(levers={"gender": engine.Fix(gender)}, watch=["admitted"])
        assert answer["admitted"].set.share("yes") == pytest.approx(expected, abs=0.01)
