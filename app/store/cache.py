"""A bounded memory of things that are slow to open, safe for several threads."""

from __future__ import annotations

import threading
from collections import OrderedDict
from collections.abc import Callable, Hashable
from typing import Generic, TypeVar

Thing = TypeVar("Thing")


class Bounded(Generic[Thing]):
    """Keeps the `limit` things used last. Two threads that ask for the same thing wait for one opening of it."""

    def __init__(self, limit: int) -> None:
        self._limit = limit
        self._kept: OrderedDict[Hashable, Thing] = OrderedDict()
        self._opening: dict[Hashable, threading.Lock] = {}
        self._lock = threading.Lock()

    def get(self, key: Hashable, make: Callable[[], Thing]) -> Thing:
        """The thing under `key`, made when it is not kept. What `make` raises is raised here, and nothing is kept."""
        with self._lock:
            if key in self._kept:
                self._kept.move_to_end(key)
                return self._kept[key]
            opening = self._opening.setdefault(key, threading.Lock())
        with opening:
            with self._lock:
                if key in self._kept:
                    return self._kept[key]
            try:
                thing = make()
            finally:
                with self._lock:
                    self._opening.pop(key, None)
            self.put(key, thing)
            return thing

    def put(self, key: Hashable, thing: Thing) -> None:
        with self._lock:
            self._kept[key] = thing
            self._kept.move_to_end(key)
            while len(self._kept) > self._limit:
                self._kept.popitem(last=False)

    def __len__(self) -> int:
        return len(self._kept)
