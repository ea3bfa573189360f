"""Where each number is cut into the bands through which it acts on categories."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

import numpy as np

from engine.records.bands import band_codes, band_levels
from engine.records.table import Coded

Cuts = Mapping[int, tuple[float, ...]]  # position of a number -> its inner cuts, ascending


def number_cuts(coded: Coded) -> Cuts:
    """The cuts of every number: those of its column, which the user gave or which make bands of equal counts."""
    return {place: coded.cuts[place] for place in coded.numbers}


def banded(coded: Coded, cuts: Cuts) -> Coded:
    """The same records with their numbers cut there."""
    changed = [place for place in coded.numbers if cuts[place] != coded.cuts[place]]
    if not changed:
        return coded
    codes = np.array(coded.codes, order="F")
    for place in changed:
        codes[:, place] = band_codes(coded.values[:, coded.numbers.index(place)], cuts[place])
    everywhere = {**dict(enumerate(coded.cuts)), **{place: tuple(cuts[place]) for place in changed}}
    levels = {**dict(enumerate(coded.levels)), **{place: band_levels(cuts[place]) for place in changed}}
    return replace(coded, codes=codes, cuts=tuple(everywhere.values()), levels=tuple(levels.values()))
