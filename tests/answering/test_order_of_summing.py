"""Whatever the order of summing and the size of chunks, the tree gives one answer."""

import threading

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

import engine
from engine.answering import summing
from engine.answering.orders import elimination_order
from engine.answering.tree import plan
from engine.model import Model
from tests.answering.generated import networks


@settings(max_examples=60, deadline=None)
@given(st.integers(0, 2**32 - 1))
def test_the_tree_gives_the_marginals_of_the_full_product(seed):
    rng = np.random.default_rng(seed)
    sizes = {label: int(rng.integers(2, 4)) for label in range(6)}
    scopes = [tuple(rng.permutation(6)[: rng.integers(1, 4)].tolist()) for _ in range(6)]
    tables = [rng.random([*(sizes[label] for label in scope), 3]) for scope in scopes]
    labels = sorted({label for scope in scopes for label in scope})
    product = np.ones([*(sizes[label] for label in labels), 3])
    for scope, table in zip(scopes, tables, strict=True):
        ordered = np.transpose(table, [*np.argsort(scope), len(scope)])
        product = product * ordered.reshape([*(sizes[label] if label in scope else 1 for label in labels), 3])
    tree = plan(scopes, sizes, labels)
    for scaled in (False, True):
        read = tree.programme.run(tables, scaled)
        whole = tuple(range(len(labels)))
        np.testing.assert_allclose(read.log_evidence, np.log(product.sum(axis=whole)), rtol=1e-12)
        for axis, label in enumerate(labels):
            rest = tuple(other for other in whole if other != axis)
            np.testing.assert_allclose(
                read.marginals[label], product.sum(axis=rest) / product.sum(axis=whole), rtol=0, atol=1e-12
            )


@settings(max_examples=40, deadline=None)
@given(networks(certain=True))
def test_an_order_names_every_label_once_and_is_the_same_each_time(net):
    scopes = [tuple(net.index[name] for name in (*node.parents, node.name)) for node in net.nodes]
    sizes = {place: len(node.levels) for place, node in enumerate(net.nodes)}
    order = elimination_order(scopes, sizes)
    assert sorted(order) == sorted(sizes)
    assert order == elimination_order(scopes, sizes)
    assert sorted(elimination_order(scopes, sizes, keep=[0])) == sorted(set(sizes) - {0})


@settings(max_examples=20, deadline=None)
@given(networks(certain=False))
def test_chunks_of_draws_join_to_the_same_answer(net):
    whole = Model(net).ask(watch=net.names, pins={net.names[0]: net.nodes[0].levels[0]}, draws=23)
    kept = summing.CHUNK
    try:
        summing.CHUNK = 1.0
        chunked = Model(net).ask(watch=net.names, pins={net.names[0]: net.nodes[0].levels[0]}, draws=23)
    finally:
        summing.CHUNK = kept
    for name in net.names:
        np.testing.assert_allclose(chunked[name].among.draws, whole[name].among.draws, rtol=0, atol=1e-12)
        np.testing.assert_allclose(chunked[name].recorded.point, whole[name].recorded.point, rtol=0, atol=1e-12)


def test_columns_are_summed_one_by_one_where_all_at_once_is_too_wide(chain_of_forty, monkeypatch):
    asked = {"watch": ["c20", "c30"], "draws": 20}
    together = Model(chain_of_forty).ask(**asked)
    monkeypatch.setattr(summing, "LIMIT", together.cost - 1.0)
    apart = Model(chain_of_forty).ask(**asked)
    assert apart.cost != together.cost
    for name in ("c20", "c30"):
        np.testing.assert_allclose(apart[name].recorded.draws, together[name].recorded.draws, rtol=0, atol=1e-12)


@settings(max_examples=20, deadline=None)
@given(networks())
def test_what_was_asked_before_changes_no_digit(net):
    fresh, used = Model(net), Model(net)
    last = net.names[-1]
    used.ask({last: net.node(last).levels[:1]}, watch=[net.names[0]], draws=20, seed=3) if _can(net, last) else None
    used.ask(watch=[last], draws=20, seed=2)
    first, second = fresh.ask(watch=net.names, draws=20, seed=2), used.ask(watch=net.names, draws=20, seed=2)
    for name in net.names:
        np.testing.assert_array_equal(first[name].recorded.draws, second[name].recorded.draws)


def _can(net, column):
    return Model(net).ask(watch=[column])[column].recorded.point[0] > 0.0


def test_many_threads_may_ask_one_model(chain_of_forty):
    model = Model(chain_of_forty)
    expected = [Model(chain_of_forty).ask({"c3": level}, watch=["c39"], draws=20) for level in ("a", "b")]
    found, wrong = [], []

    def ask(turn):
        try:
            answer = model.ask({"c3": "ab"[turn % 2]}, {"c9": engine.Fix("a")}, watch=["c39"], draws=20)
            found.append(np.array_equal(answer["c39"].among.draws, expected[turn % 2]["c39"].among.draws))
        except BaseException as error:  # a thread's failure must fail the test
            wrong.append(error)

    threads = [threading.Thread(target=ask, args=(turn,)) for turn in range(16)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert not wrong and found == [True] * 16
