"""Where records are thin and where cells are blank."""

import numpy as np
import pandas as pd

import engine
from engine.judging.blank import blanks
from engine.judging.thin import Thin, thin


def test_rare_levels_and_rare_company_of_a_changeable_column_are_told_fewest_first():
    frame = pd.DataFrame(
        {
            "home": ["quay"] * 4 + ["hill"] * 100 + ["town"] * 100,
            "mentor": ["yes"] * 104 + ["yes"] * 12 + ["no"] * 88,
        }
    )
    order = engine.Order([("a", ["home"]), ("b", ["mentor"])], changeable=["mentor"])
    found = thin(engine.Table.from_frame(frame).coded(order.columns), order)
    assert found == (
        Thin((("mentor", "no"), ("home", "hill")), 0),
        Thin((("home", "quay"),), 4),
        Thin((("mentor", "yes"), ("home", "town")), 12),
    )


def blank_table(depends, seed=0):
    rng = np.random.default_rng(seed)
    night = rng.random(1_000) < 0.4
    missing = rng.random(1_000) < (np.where(night, 0.25, 0.02) if depends else 0.10)
    frame = pd.DataFrame({"shift": np.where(night, "night", "day"), "other": rng.choice(["p", "q"], 1_000)})
    frame["came"] = np.where(missing, None, rng.choice(["often", "seldom"], 1_000))
    return engine.Table.from_frame(frame)


def test_blanks_that_follow_another_column_say_where_they_are_common():
    table = blank_table(depends=True)
    (found,) = blanks(table, ["shift", "other", "came"])
    night, blank = table.frame["shift"] == "night", table.frame["came"].isna()
    assert (found.column, found.taken, found.by) == ("came", "level", ("shift", "night"))
    assert (found.there, found.elsewhere) == (blank[night].mean(), blank[~night].mean())
    assert found.blanks == blank.sum() and found.share == blank.mean()


def test_blanks_that_follow_nothing_say_nothing():
    (found,) = blanks(blank_table(depends=False), ["shift", "other", "came"])
    assert found.by is None


def test_columns_without_a_blank_are_not_told():
    assert blanks(blank_table(depends=True), ["shift", "other"]) == ()
