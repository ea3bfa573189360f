"""A model as a program: it runs on its own, and what it draws is what the model says."""

import ast
import csv
import io
import subprocess
import sys

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import engine
from engine.network.network import Category, network
from engine.network.program import program
from tests.answering.generated import networks
from tests.plainly import cases, shares

HOSTILE = [
    'it\'s "quoted"',
    '"""',
    "two\nlines\r\nand a tab\t",
    "<script>alert(1)</script>",
    "back\\slash \\n",
    "Zoë 数 \u202egnihtemos \u2028",
    "{braces} %s # coding: ascii",
    "",
]
NAMES = st.text(st.characters(exclude_categories=["Cs"]), max_size=12) | st.sampled_from(HOSTILE)


def drawn(text, rows, seed=0):
    """What the text's own sample function gives."""
    space = {"__name__": "a_program"}
    exec(compile(text, "program.py", "exec"), space)
    return space["sample"](rows, seed)


def run(tmp_path, text, *asked):
    path = tmp_path / "program.py"
    path.write_text(text, encoding="utf-8")
    return subprocess.run([sys.executable, "-I", path, *asked], capture_output=True, cwd=tmp_path, timeout=60)


@settings(max_examples=25, deadline=None)
@given(networks(most=5), st.integers(0, 99))
def test_what_it_draws_has_the_shares_of_the_model(net, seed):
    rows = 20_000
    found = drawn(program(net), rows, seed)
    every = cases(net)
    for node in net.nodes:
        for level, share in zip(node.levels, shares(net, every, {}, node.name), strict=True):
            # Five and a half standard errors: about one in 20 million draws is further off; shares are rounded to 1e-4.
            allowed = 5.5 * np.sqrt(share * (1 - share) / rows) + 5e-4
            assert abs((found[node.name] == level).mean() - share) <= allowed


@settings(max_examples=25, deadline=None)
@given(networks(most=3, holes=True))
def test_columns_go_together_as_in_the_model_and_what_cannot_be_is_never_drawn(net):
    rows = 20_000
    found = drawn(program(net), rows)
    seen = list(zip(*(found[node.name] for node in net.nodes), strict=True))
    expected = {tuple(shown[name] for name in net.names): p for _, shown, p in cases(net)}
    assert set(seen) <= set(expected)
    for case, share in expected.items():
        assert abs(seen.count(case) / rows - share) <= 5.5 * np.sqrt(share * (1 - share) / rows) + 5e-4


@settings(max_examples=60, deadline=None)
@given(st.lists(NAMES, min_size=2, max_size=4, unique=True), st.lists(NAMES, min_size=2, max_size=4, unique=True))
def test_hostile_names_and_levels_come_out_as_they_went_in(names, levels):
    even = np.full(len(levels), 1 / len(levels))
    nodes = [Category(names[0], levels, [], even)]
    nodes += [Category(name, levels, [names[0]], np.tile(even, (len(levels), 1))) for name in names[1:]]
    order = engine.Order([(name, [name]) for name in names])
    text = program(network(nodes), order)
    ast.parse(text.encode("utf-8"))  # as a file is read, so that no name can state another encoding
    found = drawn(text, 200)
    assert list(found) == names
    assert all(set(column) <= set(levels) for column in found.values())
    assert len(set(found[names[0]])) == len(levels)


def test_it_runs_by_itself_and_prints_rows_that_read_back_whole(tmp_path):
    even = np.full(len(HOSTILE), 1 / len(HOSTILE))
    text = program(network([Category("a,\n\"b'", HOSTILE, [], even), Category("c", ["no", "yes"], [], [0.5, 0.5])]))
    done = run(tmp_path, text, "300", "5")
    assert done.returncode == 0 and done.stderr == b""
    rows = list(csv.reader(io.StringIO(done.stdout.decode("utf-8"), newline="")))
    assert rows[0] == ["a,\n\"b'", "c"] and len(rows) == 301
    assert {row[0] for row in rows[1:]} == set(HOSTILE)
    again = drawn(text, 300, 5)
    assert [row[0] for row in rows[1:]] == list(again["a,\n\"b'"])


def test_the_same_seed_draws_the_same_rows_and_another_seed_others():
    text = program(network([Category("a", ["x", "y"], [], [0.5, 0.5])]))
    assert list(drawn(text, 50, 3)["a"]) == list(drawn(text, 50, 3)["a"]) != list(drawn(text, 50, 4)["a"])


@pytest.mark.parametrize("asked", [[], ["many"], ["-5"], ["5", "x"], ["5", "6", "7"]])
def test_asked_wrongly_it_says_how_to_run_it(tmp_path, asked):
    done = run(tmp_path, program(network([Category("a", ["x", "y"], [], [0.5, 0.5])])), *asked)
    assert done.returncode == 1 and done.stdout == b""
    assert b"How to run it: python program.py ROWS [SEED]" in done.stderr


def test_columns_stand_in_the_order_of_their_stages_with_their_parents_levels_and_kind():
    nodes = [
        Category("late", ["no", "yes"], [], [0.5, 0.5]),
        Category("band", ["under 20", "20 and over"], [], [0.4, 0.6], kind="number", cuts=(20.0,)),
        Category("early", ["low", "high"], ["band"], [[0.9, 0.1], [0.0, 1.0]], kind="grade"),
    ]
    order = engine.Order([("First", ["early", "band"]), ("Then", ["late"])])
    text = program(network(nodes), order)
    expected = """
# Stage 1: First

# band. A number in bands; has no parents.
category(
    'band',
    levels=['under 20', '20 and over'],
    parents=[],
    shares=[
        [0.4000, 0.6000],
    ],
)

# early. A grade, low to high; comes from band.
category(
    'early',
    levels=['low', 'high'],
    parents=['band'],
    shares=[
        # each row: band
        [0.9000, 0.1000],  # under 20
        [0, 1.0000],  # 20 and over
    ],
)


# Stage 2: Then

# late. A category; has no parents.
category(
"""
    assert expected in text
    imports = {name.name for node in ast.walk(ast.parse(text)) if isinstance(node, ast.Import) for name in node.names}
    assert imports == {"csv", "sys", "numpy"}
    assert list(drawn(text, 5)) == ["band", "early", "late"]


def test_a_share_of_almost_nothing_is_not_written_as_none():
    text = program(network([Category("a", ["x", "y"], [], [1e-7, 1 - 1e-7])]))
    assert "[1.0e-07, 1.0000]" in text


def test_long_lists_are_written_one_item_a_line():
    levels = [f"level number {place} of this column" for place in range(9)]
    text = program(network([Category("a", levels, [], np.full(9, 1 / 9))]))
    assert "    levels=[\n        'level number 0 of this column',\n" in text
