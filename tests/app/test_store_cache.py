"""The bounded memory behind tables and models."""

import threading
import time

import pytest

from app.store.cache import Bounded


def test_what_was_used_last_is_kept():
    kept: Bounded[int] = Bounded(2)
    made = []

    def make(value):
        made.append(value)
        return value

    for value in (1, 2, 1, 3, 1, 2):
        assert kept.get(value, lambda value=value: make(value)) == value
    assert made == [1, 2, 3, 2]
    assert len(kept) == 2


def test_threads_that_want_the_same_thing_open_it_once():
    kept: Bounded[object] = Bounded(2)
    made, found = [], []

    def make():
        time.sleep(0.05)
        made.append(1)
        return object()

    threads = [threading.Thread(target=lambda: found.append(kept.get("key", make))) for _ in range(6)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert len(made) == 1
    assert len(set(map(id, found))) == 1


def test_a_failed_opening_is_not_remembered():
    kept: Bounded[int] = Bounded(2)
    with pytest.raises(ZeroDivisionError):
        kept.get("key", lambda: 1 // 0)
    assert kept.get("key", lambda: 5) == 5
