"""Worlds made by hand: records, an order, and the model fitted to them with an even prior."""

import numpy as np

from engine.model import Model
from engine.network.network import Category, network
from engine.order import Order
from engine.records.table import Coded


def world(rows, links, stages, outcomes=None, changeable=None, prior=0.5, blanks=(), kinds=None):
    """A Model of `rows`, {column: [level, ...]}, with the given links; every column changeable by default.

    blanks: columns whose last level stands for a blank.  kinds: column -> kind, else a category.
    """
    names = list(rows)
    levels = {name: tuple(sorted(set(rows[name]))) for name in names}
    codes = np.array([[levels[name].index(level) for level in rows[name]] for name in names], dtype=np.int32).T
    kind_of = {name: (kinds or {}).get(name, "category") for name in names}
    nodes = []
    for name in names:
        parents = [source for source, target in links if target == name]
        counts = np.full([len(levels[column]) for column in (*parents, name)], prior)
        np.add.at(counts, tuple(codes[:, names.index(column)] for column in (*parents, name)), 1.0)
        table = counts / counts.sum(axis=-1, keepdims=True)
        nodes.append(Category(name, levels[name], parents, table, counts, kind_of[name], has_blank=name in blanks))
    coded = Coded(
        names=tuple(names),
        kinds=tuple(kind_of.values()),
        levels=tuple(levels[name] for name in names),
        cuts=((),) * len(names),
        has_blank=tuple(name in blanks for name in names),
        codes=np.asfortranarray(codes),
        weights=np.ones(len(codes)),
    )
    order = Order(stages, changeable=names if changeable is None else changeable, outcomes=outcomes or {})
    return Model(network(nodes), order, coded)


def repeated(*groups):
    """{column: [level, ...]} from (times, {column: level}) groups."""
    return {column: [group[column] for times, group in groups for _ in range(times)] for column in groups[0][1]}


def codes_of(answer):
    return [(caution.rank, caution.code) for caution in answer.cautions]


def only(answer, code):
    (found,) = [caution for caution in answer.cautions if caution.code == code]
    return found
