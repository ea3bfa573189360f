"""Learning as a whole: what is refused, progress and cancelling, the same bytes, what can be read off."""

import threading
import time
from dataclasses import replace

import numpy as np
import pytest

from engine.learning.learn import learn_coded
from engine.learning.learned import Learned, open_learned
from engine.network.parameters import dirichlet_posterior
from engine.order import MORE, Order
from engine.refusal import Refusal
from tests.learning import plainly

NAMES = ("age", "region", "mentor", "hours", "passed")
LEVELS = (3, 4, 2, 3, 2)
ORDER = Order(
    [("Background", NAMES[:2]), ("Programme", NAMES[2:4]), ("Outcome", NAMES[4:])],
    insist=[("mentor", "passed")],
    rule_out=[("region", "passed")],
    changeable=["mentor"],
    outcomes={"passed": "passed 1", "hours": MORE},
)


def school(rows=400, seed=0):
    rng = np.random.default_rng(seed)
    codes = np.stack([rng.integers(0, count, rows) for count in LEVELS], axis=1)
    codes[:, 2] = rng.random(rows) < np.asarray([0.2, 0.5, 0.7])[codes[:, 0]]
    codes[:, 4] = rng.random(rows) < 0.2 + 0.4 * codes[:, 2] + 0.15 * codes[:, 3]
    return plainly.coded_columns(NAMES, LEVELS, codes, grades=["hours"])


def with_codes(codes, names=NAMES, levels=LEVELS):
    return plainly.coded_columns(names, levels, codes, grades=["hours"])


def test_same_records_order_and_seed_save_the_same_bytes(tmp_path):
    for name in ("one", "two"):
        learn_coded(school(), ORDER, digest="abc", seed=3).save(tmp_path / name)
    assert (tmp_path / "one").read_bytes() == (tmp_path / "two").read_bytes()
    learn_coded(school(), ORDER, digest="abc", seed=4).save(tmp_path / "three")
    assert (tmp_path / "one").read_bytes() != (tmp_path / "three").read_bytes()
    assert sorted(path.name for path in tmp_path.iterdir()) == ["one", "three", "two"]


def test_opened_again_it_is_the_same_to_the_last_digit(tmp_path):
    learned = learn_coded(school(), ORDER, digest="abc", seed=3)
    learned.save(tmp_path / "kept")
    again = open_learned(tmp_path / "kept")
    assert again.order == learned.order and again.recommended == learned.recommended
    assert (again.seed, again.digest, again.rows, again.notes) == (3, "abc", 400, ())
    assert again.curve.equals(learned.curve)
    assert again.chosen == learned.chosen
    for one, other in zip(again.network().nodes, learned.network().nodes, strict=True):
        assert (one.name, one.levels, one.parents, one.kind) == (other.name, other.levels, other.parents, other.kind)
        assert np.array_equal(one.table, other.table) and np.array_equal(one.dirichlet, other.dirichlet)
    assert again.settled().equals(learned.settled())


def test_a_subclass_opens_as_itself(tmp_path):
    class More(Learned):
        pass

    learn_coded(school(), ORDER).save(tmp_path / "kept")
    assert type(More.open(tmp_path / "kept")) is More


@pytest.mark.parametrize("content", [b"", b"not a model", b"PK\x05\x06" + bytes(18)])
def test_another_file_is_refused(tmp_path, content):
    (tmp_path / "odd").write_bytes(content)
    with pytest.raises(Refusal, match="does not hold a learned model"):
        open_learned(tmp_path / "odd")
    with pytest.raises(Refusal, match="no such file"):
        open_learned(tmp_path / "nothing")


def test_the_network_holds_the_counts_of_its_families():
    coded = school()
    learned = learn_coded(coded, ORDER)
    network = learned.network()
    assert set(network.names) == set(NAMES)
    assert len(network.links) == learned.recommended
    assert ("mentor", "passed") in network.links and ("region", "passed") not in network.links
    for place, node in enumerate(network.nodes):
        assert set(node.parents) <= set(network.names[:place])
        counts = np.zeros(node.table.shape)
        columns = [NAMES.index(name) for name in (*node.parents, node.name)]
        np.add.at(counts, tuple(coded.codes[:, column] for column in columns), 1)
        assert node.dirichlet == pytest.approx(dirichlet_posterior(counts))
        assert node.table == pytest.approx(node.dirichlet / node.dirichlet.sum(axis=-1, keepdims=True))
    assert network.links == tuple((p, c) for c in network.names for p in learned.parents_at()[c])


def test_a_size_not_learned_is_refused():
    learned = learn_coded(school(), ORDER, max_links=4)
    assert learned.curve["links"].tolist() == [1, 2, 3, 4]
    for links in (0, 5):
        with pytest.raises(Refusal, match=f"No model with {links} links") as refused:
            learned.network(links)
        assert refused.value.do == "Choose from 1 to 4 links."


def test_every_link_is_settled_by_the_order_the_data_or_nobody():
    rng = np.random.default_rng(2)
    a, b = rng.integers(0, 2, 20_000), rng.integers(0, 2, 20_000)
    c = (rng.random(20_000) < 0.1 + 0.4 * a + 0.4 * b).astype(np.int64)
    d = np.where(rng.random(20_000) < 0.7, a, rng.integers(0, 2, 20_000))
    e = np.where(rng.random(20_000) < 0.7, c, rng.integers(0, 2, 20_000))
    names = ("a", "b", "c", "d", "e")
    coded = with_codes(np.stack([a, b, c, d, e], axis=1), names, (2,) * 5)
    learned = learn_coded(coded, Order([("Early", names[:4]), ("Late", ["e"])]))
    told = {(row.source, row.target): row.settled for row in learned.settled(4).itertuples()}
    assert told == {("a", "c"): "the data", ("b", "c"): "the data", ("a", "d"): "nobody", ("c", "e"): "your order"}


def test_renaming_and_shuffling_change_no_score():
    coded = school()
    learned = learn_coded(coded, ORDER, folds=False)
    rng = np.random.default_rng(1)
    turned = coded.codes[rng.permutation(400)].copy()
    turned[:, 1] = 3 - turned[:, 1]
    again = learn_coded(with_codes(turned), ORDER, folds=False)
    assert again.curve.equals(learned.curve) and again.chosen == learned.chosen


def test_support_and_drawn_graphs_agree_and_are_kept(tmp_path):
    learned = learn_coded(school(), ORDER, folds=False)
    assert len(learned.graphs) == 200 and sum(weight for _, weight in learned.graphs) == pytest.approx(1.0)
    for source, target, support, settled in learned.support.itertuples(index=False):
        drawn = sum(weight for links, weight in learned.graphs if (source, target) in links)
        assert abs(drawn - support) < 4.5 * np.sqrt(support * (1 - support) / 200) + 1e-9
        assert (settled == "your order") == (not ORDER.may_lead(target, source))
    assert learned.support["support"].is_monotonic_decreasing
    learned.save(tmp_path / "learned")
    again = open_learned(tmp_path / "learned")
    assert again.support.equals(learned.support) and again.graphs == learned.graphs


def test_progress_is_in_plain_words_and_never_runs_back():
    heard = []
    learn_coded(school(), ORDER, progress=lambda fraction, words: heard.append((fraction, words)))
    fractions = [fraction for fraction, _ in heard]
    assert fractions == sorted(fractions) and fractions[0] == 0.0 and fractions[-1] == 1.0
    words = list(dict.fromkeys(words for _, words in heard))
    assert words == [
        "Counting how often levels occur together",
        "Finding the best model of every size",
        "Weighing every model that the order allows",
        *(f"Scoring part {part} of 5 of the records held out" for part in range(1, 6)),
        "Trying one parent more where the limit was reached",
        "Done",
    ]


@pytest.mark.parametrize("at", ["Counting", "Finding", "Weighing", "Scoring part 3"])
def test_raising_in_progress_cancels(at):
    class CancelledError(Exception):
        pass

    def progress(fraction, words):
        if words.startswith(at) and fraction > 0:
            raise CancelledError

    before = threading.active_count()
    with pytest.raises(CancelledError):
        learn_coded(school(), ORDER, progress=progress)
    assert threading.active_count() == before


@pytest.mark.parametrize(
    ("rows", "columns", "stages", "parents"),
    [(2_000, 13, 1, 3), (2_000, 20, 2, 2), (60_000, 12, 4, 3), (300, 15, 1, 2)],
)
def test_a_chance_to_cancel_comes_often(rows, columns, stages, parents):
    rng = np.random.default_rng(0)
    names = tuple(f"c{place}" for place in range(columns))
    coded = with_codes(rng.integers(0, 3, (rows, columns)), names, (3,) * columns)
    order = Order([(f"stage {stage}", names[stage::stages]) for stage in range(stages)])
    coded = replace(coded, names=order.columns)
    times = [time.process_time()]
    learn_coded(coded, order, max_parents=parents, progress=lambda fraction, words: times.append(time.process_time()))
    assert np.diff(times).max() < 0.2


def test_a_wide_stage_is_refused_by_name():
    names = tuple(f"c{place}" for place in range(19))
    coded = with_codes(np.random.default_rng(0).integers(0, 2, (40, 19)), names, (2,) * 19)
    with pytest.raises(Refusal, match="“Everything” holds 19 columns") as refused:
        learn_coded(coded, Order([("Everything", names)]))
    assert refused.value.where == "Everything"


@pytest.mark.parametrize(
    ("change", "says"),
    [
        (lambda codes: (codes[:29], LEVELS), "29 records"),
        (lambda codes: (codes * [1, 0, 1, 1, 1], LEVELS), "same value in “region”"),
        (lambda codes: (codes, (51, 4, 2, 3, 2)), "51 levels"),
    ],
)
def test_records_that_cannot_be_learned_from_are_refused(change, says):
    codes, levels = change(np.asarray(school().codes))
    with pytest.raises(Refusal, match=says) as refused:
        learn_coded(with_codes(codes, levels=levels), ORDER)
    assert refused.value.where and refused.value.do


@pytest.mark.parametrize("limits", [{"max_parents": 0}, {"max_parents": 6}, {"max_links": -1}, {"max_links": 0}])
def test_limits_that_fit_no_model_are_refused(limits):
    with pytest.raises(Refusal):
        learn_coded(school(), ORDER, **limits)


def test_more_links_insisted_on_than_parents_allowed_is_refused():
    order = Order([("All", NAMES)], insist=[("age", "passed"), ("mentor", "passed")])
    with pytest.raises(Refusal, match="insist on 2 links to “passed”"):
        learn_coded(school(), order, max_parents=1)


def test_an_outcome_level_that_no_record_can_have_is_refused():
    order = Order([("All", NAMES)], outcomes={"passed": "maybe"})
    with pytest.raises(Refusal, match="no level “maybe”") as refused:
        learn_coded(school(), order)
    assert "passed 1" in refused.value.do


def test_families_too_large_are_left_out_and_said():
    rng = np.random.default_rng(0)
    names, levels = ("a", "b", "c", "d"), (50, 50, 50, 50)
    codes = np.stack([rng.integers(0, 50, 300) for _ in names], axis=1)
    learned = learn_coded(with_codes(codes, names, levels), Order([("One", names[:3]), ("Two", names[3:])]))
    assert learned.notes == (
        "1 set of parents was left out: with their column they have more than 1,000,000 combinations of levels.",
    )
    assert max(len(parents) for model in learned.chosen.values() for parents in model) == 2
