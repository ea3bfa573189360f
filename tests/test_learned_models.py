"""From records and an order to answers: what is learned answers questions, and says the same after it was kept."""

import numpy as np
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
