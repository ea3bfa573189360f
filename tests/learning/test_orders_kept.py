"""An order stands in a learned file: what it says of unrecorded causes comes back, and older files have none."""

import json

import pandas as pd
import pytest

import engine
from engine.learning.archive import order_described, order_from

ORDER = engine.Order(
    [("First", ["a", "b"]), ("Later", ["c"])],
    insist=[("a", "c")],
    unrecorded=[engine.Unrecorded("a", "b"), engine.Unrecorded("b", "c", direct=False)],
)


def test_unrecorded_causes_come_back_from_json():
    assert order_from(json.loads(json.dumps(order_described(ORDER)))) == ORDER


def test_a_file_from_before_they_could_be_stated_has_none():
    described = json.loads(json.dumps(order_described(ORDER)))
    del described["unrecorded"]
    assert order_from(described).unrecorded == ()


def test_an_order_with_unrecorded_causes_is_not_learned_from():
    frame_of = {"a": ["x", "y"] * 40, "b": ["x", "x", "y", "y"] * 20, "c": ["y", "x"] * 40}
    with pytest.raises(engine.Refusal) as refused:
        engine.learn(engine.Table.from_frame(pd.DataFrame(frame_of)), ORDER)
    assert refused.value.where == "unrecorded" and refused.value.do
