"""From records and an order to answers: what is learned answers questions, and says the same after it was kept."""

import subprocess
import sys

import numpy as np
import pandas as pd
import pytest

import engine
from tests.outside.test_learned_published import learned
from tests.outside.test_published_answers import KIDNEY_STONES


@pytest.fixture(scope="module")
def stones():
    return learned(KIDNEY_STONES, ["size", "treatment", "success"], outcomes={"success": "yes"})


def test_a_model_is_made_once_for_each_number_of_links(stones):
    assert stones.model() is stones.model(stones.recommended)
    assert stones.model(0) is not stones.model(1) and stones.model(1) is stones.model(1)
    assert len(stones.model(2).links) == 2 and stones.model(0).links == ()
    with pytest.raises(engine.Refusal, match="No model with 9 links"):
        stones.model(9)


def test_what_was_kept_answers_as_before_to_the_last_digit(stones, tmp_path):
    stones.save(tmp_path / "stones")
    again = engine.open_learned(tmp_path / "stones")
    assert isinstance(again, engine.Learned)
    asked = {"pins": {"size": "small"}, "levers": {"treatment": engine.Fix("A", 0.5)}}
    first, second = stones.model(3).ask(**asked), again.model(3).ask(**asked)
    np.testing.assert_array_equal(first["success"].set.draws, second["success"].set.draws)
    assert first.cautions == second.cautions and first.matching == second.matching == 357


def test_only_what_the_order_marks_may_be_changed(stones):
    assert stones.model().changeable == ("treatment",)
    with pytest.raises(engine.Refusal, match="“size” is not marked as changeable"):
        stones.model().ask(levers={"size": engine.Fix("small")})


def ferry_rides(rows=400):
    """Numbers and categories: the sea makes rides long, long rides make people ill."""
    rng = np.random.default_rng(0)
    sea = rng.choice(["calm", "rough"], rows)
    minutes = rng.normal(40.0, 5.0, rows) + 9.0 * (sea == "rough")
    ill = rng.random(rows) < 1.0 / (1.0 + np.exp(-(minutes - 48.0) / 3.0))
    waiting = 0.5 * minutes + rng.normal(0.0, 3.0, rows)
    return pd.DataFrame({"sea": sea, "minutes": minutes, "ill": np.where(ill, "yes", "no"), "waiting": waiting})


def test_a_model_with_numbers_opened_in_another_process_answers_to_the_same_digit(tmp_path):
    order = engine.Order([("Sea", ["sea"]), ("Ride", ["minutes"]), ("After", ["ill", "waiting"])], changeable=["sea"])
    rides = engine.learn(engine.Table.from_frame(ferry_rides()), order)
    rides.save(tmp_path / "rides")
    code = (
        "import sys, engine\n"
        "answer = engine.open_learned(sys.argv[1]).model().ask(levers={'sea': engine.Fix('calm')})\n"
        "for column in ('ill', 'waiting'):\n"
        "    print(answer[column].set.point.tobytes().hex(), answer[column].set.draws.tobytes().hex())\n"
        "print(answer['waiting'].set.mean.hex())\n"
    )
    done = subprocess.run([sys.executable, "-c", code, tmp_path / "rides"], capture_output=True, text=True, check=True)
    answer = rides.model().ask(levers={"sea": engine.Fix("calm")})
    told = [
        f"{answer[column].set.point.tobytes().hex()} {answer[column].set.draws.tobytes().hex()}"
        for column in ("ill", "waiting")
    ]
    assert done.stdout.splitlines() == [*told, answer["waiting"].set.mean.hex()]
    assert answer["waiting"].set.mean == pytest.approx(20.0, abs=1.0) and rides.network().numbers
