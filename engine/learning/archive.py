"""One file of named arrays and a description in JSON, without pickles: the same content makes the same bytes."""

from __future__ import annotations

import io
import json
import os
import zipfile
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import numpy as np

from engine.order import Direction, Order, Unrecorded
from engine.records.table import Coded
from engine.refusal import Refusal

Described = dict[str, Any]  # what JSON holds

_DATE = (1980, 1, 1, 0, 0, 0)
_DESCRIPTION = "description.json"


def write(path: str | os.PathLike[str], described: Described, arrays: Mapping[str, np.ndarray]) -> None:
    """Write a file whole or not at all."""
    parts = {_DESCRIPTION: json.dumps(described, ensure_ascii=False, sort_keys=True).encode()}
    for name, array in arrays.items():
        held = io.BytesIO()
        np.lib.format.write_array(held, np.asanyarray(array), allow_pickle=False)
        parts[f"{name}.npy"] = held.getvalue()
    target = Path(path)
    partial = target.with_name(f"{target.name}.{os.getpid()}.partial")
    try:
        with zipfile.ZipFile(partial, "w") as file:
            for name, content in parts.items():
                entry = zipfile.ZipInfo(name, _DATE)
                entry.compress_type = zipfile.ZIP_DEFLATED
                file.writestr(entry, content)
        os.replace(partial, target)
    finally:
        partial.unlink(missing_ok=True)


def read(path: str | os.PathLike[str], kind: str, version: int) -> tuple[Described, dict[str, np.ndarray]]:
    """The description and the arrays of a file whose description has this `format` and `version`.

    Raises Refusal for any other file.
    """
    try:
        with zipfile.ZipFile(path) as file:
            described = json.loads(file.read(_DESCRIPTION))
            if (described["format"], described["version"]) != (kind, version):
                raise ValueError(described["format"])
            arrays = {
                name.removesuffix(".npy"): np.asarray(
                    np.lib.format.read_array(io.BytesIO(file.read(name)), allow_pickle=False)
                )
                for name in file.namelist()
                if name.endswith(".npy")
            }
    except FileNotFoundError:
        raise Refusal("There is no such file.", where=str(path), do="Learn the model again.") from None
    except (zipfile.BadZipFile, KeyError, ValueError, TypeError, EOFError) as fault:
        raise Refusal(
            "This file does not hold a learned model that this version can open.",
            where=str(path),
            do="Learn the model again.",
        ) from fault
    return described, arrays


def order_described(order: Order) -> Described:
    return {
        "stages": [[stage.name, list(stage.columns)] for stage in order.stages],
        "insist": order.insist,
        "rule_out": order.rule_out,
        "unrecorded": [[pair.first, pair.second, pair.direct] for pair in order.unrecorded],
        "changeable": order.changeable,
        "outcomes": {
            column: better.value if isinstance(better, Direction) else list(better)
            for column, better in order.outcomes.items()
        },
    }


def order_from(described: Described) -> Order:
    return Order(
        [(name, columns) for name, columns in described["stages"]],
        insist=[(source, target) for source, target in described["insist"]],
        rule_out=[(source, target) for source, target in described["rule_out"]],
        unrecorded=[Unrecorded(*pair) for pair in described.get("unrecorded", ())],
        changeable=described["changeable"],
        outcomes={
            column: Direction(better) if isinstance(better, str) else better
            for column, better in described["outcomes"].items()
        },
    )


def coded_described(coded: Coded) -> Described:
    return {
        "names": coded.names,
        "kinds": coded.kinds,
        "levels": coded.levels,
        "cuts": coded.cuts,
        "has_blank": coded.has_blank,
        "numbers": coded.numbers,
        "units": coded.units,
    }


def coded_arrays(coded: Coded) -> dict[str, np.ndarray]:
    """codes as bytes: a column that can be learned has at most 50 levels."""
    arrays = {"codes": coded.codes.astype(np.uint8), "weights": coded.weights}
    if coded.numbers:
        arrays["values"] = np.asfortranarray(coded.values)
    if coded.group is not None:
        arrays["group"] = coded.group
    return arrays


def coded_from(described: Described, arrays: Mapping[str, np.ndarray]) -> Coded:
    return Coded(
        names=tuple(described["names"]),
        kinds=tuple(described["kinds"]),
        levels=tuple(tuple(levels) for levels in described["levels"]),
        cuts=tuple(tuple(cuts) for cuts in described["cuts"]),
        has_blank=tuple(described["has_blank"]),
        codes=np.asfortranarray(arrays["codes"], dtype=np.int32),
        weights=arrays["weights"],
        numbers=tuple(described["numbers"]),
        values=arrays.get("values", np.empty((len(arrays["codes"]), 0))),
        group=arrays.get("group"),
        units=tuple(described.get("units", ())),
    )
