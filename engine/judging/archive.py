"""A judgement as a text, and back."""

from __future__ import annotations

import json
from collections.abc import Callable
from dataclasses import asdict, fields, is_dataclass
from functools import lru_cache
from types import NoneType, UnionType
from typing import Any, Literal, Union, get_args, get_origin, get_type_hints

from engine.judging.judgement import Judgement
from engine.refusal import Refusal

FORMAT = "steelyard judgement"
VERSION = 1


def as_text(judgement: Judgement) -> str:
    """JSON that `from_text` reads back to an equal value."""
    return json.dumps({"format": FORMAT, "version": VERSION, "judgement": asdict(judgement)}, ensure_ascii=False)


def from_text(text: str) -> Judgement:
    """Raises Refusal for anything that `as_text` of this version did not write."""
    try:
        given = json.loads(text)
        if (given["format"], given["version"]) != (FORMAT, VERSION):
            raise ValueError("another format")
        found: Judgement = _read(Judgement, given["judgement"])
        return found
    except (ValueError, KeyError, TypeError, AttributeError, RecursionError) as error:
        raise Refusal("This is no judgement that this version can read.", do="Judge the model again.") from error


_hints: Callable[[Any], dict[str, Any]] = lru_cache(maxsize=None)(get_type_hints)


def _read(wanted: Any, given: Any) -> Any:
    """`given`, as JSON has it, as a value of the type `wanted`."""
    if is_dataclass(wanted):
        hints = _hints(wanted)
        if set(given) != {field.name for field in fields(wanted)}:
            raise ValueError(f"other fields than those of {wanted}")
        return wanted(**{name: _read(hints[name], value) for name, value in given.items()})  # type: ignore[operator]
    origin, inner = get_origin(wanted), get_args(wanted)
    if origin in (UnionType, Union):
        (some,) = (each for each in inner if each is not NoneType)
        return None if given is None else _read(some, given)
    if origin is tuple:
        if not isinstance(given, list):
            raise ValueError("no list")
        if inner[-1] is Ellipsis:
            return tuple(_read(inner[0], each) for each in given)
        return tuple(_read(kind, each) for kind, each in zip(inner, given, strict=True))
    if origin is Literal:
        if given not in inner:
            raise ValueError(f"{given!r} is none of {inner}")
    elif type(given) is not wanted and not (wanted is float and type(given) is int):
        raise ValueError(f"{given!r} is no {wanted}")
    return given
