"""What the Model page says of links: support, strength, and what wide stages do to support."""

from __future__ import annotations

import pytest

from app.wording.links import doubted, strength, support, wide_stages


def test_strength_is_in_points() -> None:
    assert [strength(x) for x in (0.0, 0.002, 0.01, 0.36)] == ["0 points", "under 1 point", "1 point", "36 points"]


@pytest.mark.parametrize(
    ("likely", "words"),
    [(0.0, "under 1%"), (0.004, "under 1%"), (0.745, "75%"), (0.99, "99%"), (0.995, "over 99%"), (1.0, "over 99%")],
)
def test_what_records_say_is_never_quite_sure(likely: float, words: str) -> None:
    assert support(likely) == words


def test_a_wide_stage_says_how_its_support_was_found_and_what_the_drawn_models_are_worth() -> None:
    assert wide_stages(["Everything"], 10, 200, 37.9) == (
        "In the stage Everything, of more than ten columns, support is summed over orders of the columns. That favours "
        "models that fit many orders, and may move a support by up to 20 points. The 200 models drawn are corrected "
        "for it and are worth 37."
    )
    assert wide_stages(["Early", "Late"], 10, 0, 0.0).startswith("In the stages Early and Late, of more than ten")
    assert "drawn" not in wide_stages(["Early"], 10, 0, 0.0)


def test_links_that_most_models_do_without_are_told():
    assert doubted(1) == (
        "1 of these links has support under 50%: it helps to predict, but most plausible models do without it."
    )
    assert doubted(3).startswith("3 of these links have support under 50%: they help to predict")
