"""Categories and numbers together: the best of all graphs, support by enumeration, held-out scores, what is kept."""

import subprocess
import sys
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from engine.learning import held_out
from engine.learning.folds import FOLDS, folds
from engine.learning.learn import learn_coded
from engine.learning.learned import open_learned
from engine.network.nodes import Category, Number
from engine.order import MORE, Order
from tests.learning import mixed_plainly as plainly

NAMES = ("a", "b", "c", "d")
ORDERS = (
    Order([("All", NAMES)]),
    Order([("Early", NAMES[:2]), ("Late", NAMES[2:])]),
    Order([("First", NAMES[:1]), ("Middle", NAMES[1:])], insist=[("a", "c")], rule_out=[("b", "d")]),
)


def records(rows=80, seed=0, numbers=(1, 3)):
    """Four columns; each leans on the one before it."""
    rng = np.random.default_rng(seed)
    codes = np.zeros((rows, 4), dtype=np.int32)
    values = np.zeros((rows, len(numbers)))
    before = np.zeros(rows)
    for place in range(4):
        if place in numbers:
            at = numbers.index(place)
            values[:, at] = (rng.normal(size=rows) + before) * 10.0**place + place
            before = (values[:, at] - values[:, at].mean()) / values[:, at].std()
        else:
            codes[:, place] = np.clip(np.rint(before + rng.normal(size=rows)), -1, 1) + 1
            codes[:3, place] = (0, 1, 2)
            before = codes[:, place] - 1.0
    return plainly.coded_mixed("abcd", codes, values, numbers)


@settings(max_examples=12, deadline=None)
@given(st.integers(0, 2**32 - 1), st.sampled_from(ORDERS), st.integers(1, 3), st.sets(st.integers(0, 3), min_size=1))
def test_best_score_at_every_number_of_links_is_that_of_all_graphs(seed, order, max_parents, numbers):
    coded = records(seed=seed, numbers=tuple(sorted(numbers)), rows=40)
    truth = plainly.every_graph(coded, order, max_parents)
    best = {links: truth[graph] for links, graph in plainly.best_graphs(truth).items()}
    learned = learn_coded(coded, order, max_parents=max_parents, folds=False)
    assert learned.curve["links"].tolist() == sorted(best)
    assert learned.curve["score"].to_numpy() == pytest.approx([best[k] for k in sorted(best)], abs=1e-8, rel=1e-11)
    for links, graph in learned.chosen.items():
        assert truth[tuple(tuple(sorted(parents)) for parents in graph)] == pytest.approx(best[links], abs=1e-8)


@pytest.mark.parametrize("order", ORDERS)
@pytest.mark.parametrize("numbers", [(1, 3), (0, 1, 2, 3), (2,)])
def test_support_is_that_of_every_graph_weighed_one_by_one(order, numbers):
    coded = records(seed=5, numbers=numbers, rows=40)
    graphs = plainly.every_graph(coded, order, 3)
    logs = np.asarray(list(graphs.values()))
    shares = np.exp(logs - np.logaddexp.reduce(logs))
    told = np.zeros((4, 4))
    for graph, share in zip(graphs, shares, strict=True):
        for child, parents in enumerate(graph):
            told[list(parents), child] += share
    learned = learn_coded(coded, order, folds=False)
    assert learned.posterior.support == pytest.approx(told, abs=1e-8)
    drawn = learned.posterior.graphs.mean(axis=0)
    assert np.abs(drawn - told).max() < 4.5 * np.sqrt(0.25 / 200)


def test_each_record_is_scored_by_the_model_learned_without_its_fold():
    coded = records(rows=150, seed=2)
    learned = learn_coded(coded, ORDERS[1], max_parents=2, seed=4)
    fold = folds(150, 4)
    sizes = learned.curve["links"].tolist()
    scores = np.zeros((len(sizes), 150))
    for held in range(FOLDS):
        rest, out = np.flatnonzero(fold != held), np.flatnonzero(fold == held)
        part = replace(coded, codes=coded.codes[rest], values=coded.values[rest])
        again = plainly.best_graphs(plainly.every_graph(part, ORDERS[1], 2, coded))
        for place, links in enumerate(sizes):
            scores[place, out] = plainly.log_scores(coded, rest, out, again[links])
    best = int(scores.mean(axis=1).argmax())
    gaps = scores - scores[best]
    assert learned.curve["held_out"].to_numpy() == pytest.approx(scores.mean(axis=1), abs=1e-8)
    told = gaps.std(axis=1, ddof=1) / np.sqrt(150)
    assert learned.curve["held_out_se"].to_numpy() == pytest.approx(told, abs=1e-8)
    assert learned.recommended == sizes[np.flatnonzero(gaps.mean(axis=1) + told >= 0)[0]]


def test_scoring_numbers_in_blocks_changes_nothing(monkeypatch):
    coded = records(rows=300, seed=3)
    whole = learn_coded(coded, ORDERS[0])
    monkeypatch.setattr(held_out, "_ROWS", 17)
    blocks = learn_coded(coded, ORDERS[0])
    assert blocks.recommended == whole.recommended
    for name in ("held_out", "held_out_se"):
        assert blocks.curve[name].to_numpy() == pytest.approx(whole.curve[name].to_numpy(), abs=1e-9)


def test_other_names_levels_units_and_row_order_change_no_structure():
    coded = records(rows=200, seed=6)
    learned = learn_coded(coded, ORDERS[0], folds=False)
    rng = np.random.default_rng(1)
    rows = rng.permutation(200)
    codes = coded.codes[rows].copy()
    codes[:, 0] = 2 - codes[:, 0]
    turned = plainly.coded_mixed("wxyz", codes, coded.values[rows] * 4.0 - 1.0, coded.numbers)
    again = learn_coded(turned, Order([("All", tuple("wxyz"))]), folds=False)
    assert again.chosen == learned.chosen
    shifted = 200 * len(coded.numbers) * np.log(4.0)
    assert again.curve["score"].to_numpy() + shifted == pytest.approx(learned.curve["score"].to_numpy(), abs=1e-7)
    assert again.posterior.support == pytest.approx(learned.posterior.support, abs=1e-9)


def test_columns_in_another_place_of_their_stage_score_the_same():
    coded = records(rows=200, seed=7)
    learned = learn_coded(coded, ORDERS[0], folds=False)
    places = (3, 2, 1, 0)
    turned = plainly.coded_mixed("dcba", coded.codes[:, places], coded.values[:, ::-1], (0, 2))
    again = learn_coded(turned, Order([("All", NAMES[::-1])]), folds=False)
    assert again.curve["score"].to_numpy() == pytest.approx(learned.curve["score"].to_numpy(), abs=1e-8)
    assert again.posterior.support == pytest.approx(learned.posterior.support[np.ix_(places, places)], abs=1e-9)


def test_a_number_has_a_regression_and_a_category_reads_its_band():
    coded = records(rows=400, seed=8)
    learned = learn_coded(coded, Order([("All", NAMES)], outcomes={"d": MORE}), folds=False)
    network = learned.network_of(((), (0,), (1,), (0, 1, 2)))
    a, b, c, d = (network.node(name) for name in "abcd")
    assert isinstance(a, Category) and isinstance(b, Number) and isinstance(c, Category) and isinstance(d, Number)
    assert b.intercept.shape == (3,) and b.slopes.shape == (3, 0)
    assert c.table.shape == (len(b.bands) + 1, 3)
    assert d.parents == ("a", "b", "c") and d.intercept.shape == (3, 3) and d.slopes.shape == (3, 3, 1)
    for level in range(3):
        of = coded.values[coded.codes[:, 0] == level, 0]
        assert b.intercept[level] == pytest.approx(of.mean(), abs=0.5 * of.std())
    assert learned.family(1, (0,)) is learned.family(1, (0,))
    assert plainly.same_network(learned.network(), learned.network_of(learned.chosen[learned.recommended]))


def test_a_link_inside_a_stage_between_a_category_and_a_number_is_settled_by_nobody():
    rng = np.random.default_rng(0)
    a = rng.integers(0, 3, 3_000)
    b = np.exp(rng.normal(size=3_000)) + a  # skewed noise picks a direction with large margins
    c, d = rng.integers(0, 3, 3_000), np.zeros(3_000)
    codes = np.stack([a, d, c, np.where(rng.random(3_000) < 0.7, a, rng.integers(0, 3, 3_000))], axis=1)
    coded = plainly.coded_mixed("abcd", codes, b[:, None], (1,))
    for order, told in ((ORDERS[0], "nobody"), (Order([("Early", NAMES[:1]), ("Late", NAMES[1:])]), "your order")):
        settled = learn_coded(coded, order, folds=False).settled()
        between = settled[settled["source"].isin(["a", "b"]) & settled["target"].isin(["a", "b"])]
        assert between["settled"].tolist() == [told]


@pytest.mark.parametrize(("number", "told"), [(False, "the data"), (True, "nobody")])
def test_a_direction_that_rests_on_the_shape_of_a_number_is_settled_by_nobody(number, told):
    """Two causes that do not go together settle their directions, unless one of them is a number."""
    rng = np.random.default_rng(2)
    a, values = rng.integers(0, 2, 20_000), rng.normal(size=(20_000, 1))
    high = values[:, 0] > 0.0
    c = (rng.random(20_000) < 0.1 + 0.4 * a + 0.4 * high).astype(int)
    codes = np.column_stack([a, high, c])
    coded = plainly.coded_mixed("abc", codes, values if number else values[:, :0], (1,) if number else (), bands=2)
    learned = learn_coded(coded, Order([("All", ["a", "b", "c"])]), folds=False)
    settled = {(row.source, row.target): row.settled for row in learned.settled(2).itertuples()}
    assert settled == {("a", "c"): told, ("b", "c"): told}


def test_what_was_kept_is_the_same_to_the_last_digit_in_another_process(tmp_path):
    coded = records(rows=300, seed=9)
    learned = learn_coded(coded, ORDERS[0], seed=3, notes=("“e” is taken as bands.",))
    for name in ("one", "two"):
        learn_coded(coded, ORDERS[0], seed=3, notes=("“e” is taken as bands.",)).save(tmp_path / name)
    assert (tmp_path / "one").read_bytes() == (tmp_path / "two").read_bytes()
    again = open_learned(tmp_path / "one")
    assert again.notes == learned.notes and again.curve.equals(learned.curve)
    assert np.array_equal(again.coded.values, coded.values) and again.coded.numbers == coded.numbers
    assert plainly.same_network(again.network(), learned.network())
    code = (
        "import sys; from engine.learning.learned import open_learned\n"
        "for node in open_learned(sys.argv[1]).network().nodes:\n"
        "    for what in ('table', 'intercept', 'slopes', 'variance'):\n"
        "        if hasattr(node, what): print(node.name, what, getattr(node, what).tobytes().hex())\n"
    )
    done = subprocess.run([sys.executable, "-c", code, tmp_path / "one"], capture_output=True, text=True, check=True)
    told = [
        f"{node.name} {what} {getattr(node, what).tobytes().hex()}"
        for node in learned.network().nodes
        for what in ("table", "intercept", "slopes", "variance")
        if hasattr(node, what)
    ]
    assert done.stdout.splitlines() == told


def test_rows_that_belong_together_are_kept_with_the_model(tmp_path):
    coded = replace(records(), group=np.repeat(np.arange(20, dtype=np.int32), 4))
    learn_coded(coded, ORDERS[0], folds=False).save(tmp_path / "kept")
    assert np.array_equal(open_learned(tmp_path / "kept").coded.group, coded.group)


def test_progress_tells_of_numbers_in_plain_words_and_never_runs_back():
    heard = []
    learn_coded(records(), ORDERS[0], progress=lambda fraction, words: heard.append((fraction, words)))
    fractions = [fraction for fraction, _ in heard]
    assert fractions == sorted(fractions) and fractions[0] == 0.0 and fractions[-1] == 1.0
    assert list(dict.fromkeys(words for _, words in heard))[:4] == [
        "Looking at how each number varies",
        "Counting how often levels occur together",
        "Adding up how numbers vary together",
        "Finding the best model of every size",
    ]
