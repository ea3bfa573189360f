"""What was worked out lately, kept for the next question."""

from __future__ import annotations

import threading
from collections import OrderedDict
from collections.abc import Callable, Hashable
from typing import Generic, TypeVar

Key = TypeVar("Key", bound=Hashable)
Value = TypeVar("Value")


class Kept(Generic[Key, Value]):
    """The last few values made, by key. Safe for many threads: two that ask at once may both make a value."""

    def __init__(self, limit: int) -> None:
        self._limit = limit
        self._values: OrderedDict[Key, Value] = OrderedDict()
        self._lock = threading.Lock()

    def get(self, key: Key, make: Callable[[], Value]) -> Value:
        with self._lock:
            if key in self._values:
                self._values.move_to_end(key)
                return self._values[key]
        value = make()
        with self._lock:
            value = self._values.setdefault(key, value)
            while len(self._values) > self._limit:
                self._values.popitem(last=False)
        return value
