"""Levers as places in a network: positions of levels, values, shares, and who rules whom."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np


class Unruled:
    """What levers have in common that go by no other column. reach: the probability that the lever takes."""

    reach: float

    @property
    def ruler(self) -> str | None:
        """The column that rules, for a rule."""
        return None

    @property
    def forgets(self) -> bool:
        """Whether what is shown does not hang on the natural value."""
        return self.reach == 1.0


@dataclass(frozen=True)
class Setting(Unruled):
    """A category fixed: the level's position, the probability that the lever takes, and the level's name."""

    position: int
    reach: float
    level: str

    def copy(self, levels: int) -> np.ndarray:
        """(levels, levels) probability of what is shown, the last axis, given the natural level; (levels,) if it
        `forgets` that."""
        return _taking(np.eye(levels)[self.position], self.reach)


@dataclass(frozen=True)
class MixSetting(Unruled):
    """A category mixed: the share of every level, and the probability that the lever takes."""

    shares: tuple[float, ...]
    reach: float

    def copy(self, levels: int) -> np.ndarray:
        """As `Setting.copy`."""
        return _taking(np.array(self.shares), self.reach)


@dataclass(frozen=True)
class RuleSetting:
    """A category ruled: for every level of the column that rules, the position to set or None."""

    ruler: str
    positions: tuple[int | None, ...]
    reach: float

    @property
    def forgets(self) -> bool:
        return self.reach == 1.0 and None not in self.positions

    def copy(self, levels: int) -> np.ndarray:
        """(levels of the ruler, levels, levels) as `Setting.copy`, by the level of the column that rules; (levels of
        the ruler, levels) if it `forgets` the natural level."""
        every = np.eye(levels)
        if self.forgets:
            return np.stack([every[to] for to in self.positions])
        return np.stack(
            [every if to is None else self.reach * every[to] + (1.0 - self.reach) * every for to in self.positions]
        )


@dataclass(frozen=True)
class ValueSetting(Unruled):
    """A number fixed at one value, or at one of several with a share each; and the probability that the lever takes."""

    values: tuple[float, ...]
    shares: tuple[float, ...]
    reach: float


@dataclass(frozen=True)
class ShiftSetting(Unruled):
    """A number shifted by an amount, and the probability that the lever takes."""

    amount: float
    reach: float

    @property
    def forgets(self) -> bool:
        return False


@dataclass(frozen=True)
class ValueRuleSetting:
    """A number ruled: for every level of the column that rules, the value to set or None."""

    ruler: str
    values: tuple[float | None, ...]
    reach: float

    @property
    def forgets(self) -> bool:
        return self.reach == 1.0 and None not in self.values


OfCategory = Setting | MixSetting | RuleSetting
OfNumber = ValueSetting | ShiftSetting | ValueRuleSetting
AnySetting = OfCategory | OfNumber


def _taking(shown: np.ndarray, reach: float) -> np.ndarray:
    """(levels, levels) what is shown when the lever takes with probability `reach`, else the natural level.

    shown: (levels,) when it takes.  When it always does, the natural level does not matter: (levels,).
    """
    return shown if reach == 1.0 else reach * shown + (1.0 - reach) * np.eye(len(shown))
