"""Worlds made by hand: records, an order, and the model fitted to them with an even prior."""

import numpy as np

from engine.model import Model
from engine.network.network import Category, network
from engine.order import Order
from engine.records.table import Coded


def world(rows, links, stages, outcomes=None, changeable=None, prior=0.5):
    """A Model of `rows`, {column: [level, ...]}, with the given links; every column changeable by default."""
    names = list(rows)
    levels = {name: tuple(sorted(set(rows[name]))) for name in names}
    codes = np.array([[levels[name].index(level) for level in rows[name]] for name in names], dtype=np.int32).T
    nodes = []
    for name in names:
        parents = [source for source, target in links if target == name]
        counts = np.full([len(levels[column]) for column in (*parents, name)], prior)
        np.add.at(counts, tuple(codes[:, names.index(column)] for column in (*parents, name)), 1.0)
        table = counts / counts.sum(axis=-1, keepdims=True)
        nodes.append(Category(name, levels[name], parents, table, dirichlet=counts))
    coded = Coded(
        names=tuple(names),
        kinds=("category",) * len(names),
        levels=tuple(levels[name] for name in names),
        cuts=((),) * len(names),
        has_blank=(False,) * len(names),
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
