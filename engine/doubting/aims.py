"""What the levers would make of every record: which level, or which band of a number, it would have."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.answering.counting import Records
from engine.answering.settings import (
    AnySetting,
    MixSetting,
    RuleSetting,
    Setting,
    ShiftSetting,
    ValueRuleSetting,
    ValueSetting,
)
from engine.network.network import Network
from engine.network.nodes import Node, Number
from engine.records.bands import band_codes
from engine.records.wording import figure, listing


@dataclass(frozen=True, eq=False)
class Way:
    """One thing a lever makes of the records. share: for how many of them.  codes: (rows,) the level or band each
    would have.  values: (rows,) the value of a number."""

    share: float
    codes: NDArray[np.int64]
    values: NDArray[np.float64] | None = None


@dataclass(frozen=True, eq=False)
class Aim:
    """A lever record by record.

    value: what it sets, in words: mentor = yes.  said: after "set to another": level or value.
    ways: one, or one for each value of a mix.  concerned: (rows,) whose value is set at all; for a mix or a rule
    those whose value it would change.
    """

    column: str
    value: str
    said: str
    ways: tuple[Way, ...]
    concerned: NDArray[np.bool_]


def aim(network: Network, records: Records, column: str, setting: AnySetting) -> Aim:
    """What `setting` would make of every record."""
    node = network.node(column)
    natural = np.asarray(records.codes(column), dtype=np.int64)
    everyone = np.ones(records.rows, dtype=np.bool_)
    if isinstance(setting, Setting):
        codes = np.full(records.rows, setting.position, dtype=np.int64)
        return Aim(column, f"{column} = {setting.level}", "level", (Way(1.0, codes),), everyone)
    if isinstance(setting, MixSetting):
        ways = [
            Way(share, np.full(records.rows, place, dtype=np.int64))
            for place, share in enumerate(setting.shares)
            if share > 0.0
        ]
        levels = listing([node.levels[int(way.codes[0])] for way in ways], None, "or")
        return Aim(column, f"{column} = {levels}", "level", tuple(ways), everyone)
    if isinstance(setting, RuleSetting):
        to = np.asarray([-1 if place is None else place for place in setting.positions])[records.codes(setting.ruler)]
        codes = np.where(to < 0, natural, to)
        return Aim(column, f"{column} as the rule sets it", "level", (Way(1.0, codes),), codes != natural)
    assert isinstance(node, Number)
    own = records.values(column)
    if isinstance(setting, ShiftSetting):
        words = f"{column} {'raised' if setting.amount >= 0 else 'lowered'} by {figure(abs(setting.amount))}"
        return Aim(column, words, "amount", (_way(node, 1.0, own + setting.amount),), everyone)
    if isinstance(setting, ValueRuleSetting):
        ruled = np.asarray([np.nan if value is None else value for value in setting.values])
        values = ruled[records.codes(setting.ruler)]
        changed = np.isfinite(values) & (values != own)
        values = np.where(np.isfinite(values), values, own)
        return Aim(column, f"{column} as the rule sets it", "value", (_way(node, 1.0, values),), changed)
    assert isinstance(setting, ValueSetting)
    some = [
        _way(node, share, np.full(records.rows, value))
        for value, share in zip(setting.values, setting.shares, strict=True)
    ]
    value = listing([figure(each) for each in setting.values], None, "or")
    return Aim(column, f"{column} = {value}", "value", tuple(some), everyone)


def _way(node: Node, share: float, values: NDArray[np.float64]) -> Way:
    return Way(share, band_codes(values, node.cuts).astype(np.int64), values)
