"""What was worked out lately, kept for the next question."""

from __future__ import annotations

import threading
from collections import OrderedDict
from collections.abc import Callable, Hashable
from typing import Generic, TypeVar

Key = TypeVar("Key", bound=Hashable)
Value = TypeVar("Value")


class Kept(Generic[Key, Value]):
    """The last values made, by key, as many as weigh no more than `limit` together; each weighs 1 if not told.

    Safe for many threads: two that ask at once may both make a value.
    """

    def __init__(self, limit: float, weigh: Callable[[Value], float] = lambda value: 1) -> None:
        self._limit = limit
        self._weigh = weigh
        self._weight = 0.0
        self._values: OrderedDict[Key, Value] = OrderedDict()
        self._lock = threading.Lock()

    @property
    def weight(self) -> float:
        """What all that is kept weighs."""
        return self._weight

    def get(self, key: Key, make: Callable[[], Value]) -> Value:
        with self._lock:
            if key in self._values:
                self._values.move_to_end(key)
                return self._values[key]
        value = make()
        weight = self._weigh(value)
        with self._lock:
            if key in self._values or weight > self._limit:
                return self._values.get(key, value)
            self._values[key] = value
            self._weight += weight
            while self._weight > self._limit:
                _, oldest = self._values.popitem(last=False)
                self._weight -= self._weigh(oldest)
        return value
