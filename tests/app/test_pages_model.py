"""The Model page of a learned model: its links and their support, its columns in words, and the program to keep."""

from __future__ import annotations

import html
import re
from dataclasses import replace

import numpy as np
import pandas as pd
import pytest
from fastapi import FastAPI
from fastapi.testclient import TestClient

import engine
from app.pages import model_accounts, model_view
from app.store import Plan, Study
from tests.app.evening import PLAN, evening, keep_a_model

HOSTILE = '<script>alert("x")</script> & \'"'


@pytest.fixture
def study(client: TestClient, app: FastAPI) -> Study:
    """The evening school with a model."""
    return keep_a_model(app.state.store, app.state.store.bring("Evening", evening(), "evening.csv", plan=PLAN))


def words(page: str) -> str:
    """A page as it is read: no tags, no line breaks."""
    return html.unescape(re.sub(r"\s+", " ", re.sub(r"<[^>]+>", "", page)))


def test_the_links_are_sorted_by_support_as_it_is_shown_and_inside_equal_by_strength(
    app: FastAPI, study: Study
) -> None:
    learned = app.state.store.learned(study.key)
    view = model_view.view(study, learned, int(learned.curve["links"].max()))

    def figure(text: str) -> float:
        return float(re.sub(r"[^0-9.]", "", text)) + (0.5 if text.startswith("over") else 0.0)

    shown = [min(figure(row.support), 99.5) for row in view.rows]
    assert shown == sorted(shown, reverse=True) and len(set(shown)) > 2
    for before, after in zip(view.rows, view.rows[1:], strict=False):
        if before.support == after.support:
            assert figure(before.strength) >= figure(after.strength)


def test_a_link_shows_its_support_and_one_insisted_on_is_certain(app: FastAPI, study: Study) -> None:
    learned = app.state.store.learned(study.key)
    rows = {(row.source, row.target): row for row in model_view.view(study, learned).rows}
    assert rows["mentor", "turned up"].support == "100%"
    assert rows["mentor", "turned up"].settled == "your order"
    free = [row for link, row in rows.items() if link not in PLAN.insist]
    assert all(row.support != "100%" for row in free)


def test_who_settled_a_direction_is_said_with_its_condition(app: FastAPI, study: Study) -> None:
    columns = ("age", "shift work", "tutor", "mentor", "turned up", "passed")
    app.state.store.save_plan(study.key, Plan(stages=(("All", columns),)))
    study = keep_a_model(app.state.store, app.state.store.study(study.key))
    learned = app.state.store.learned(study.key)
    by = set(learned.settled()["settled"])
    view = model_view.view(study, learned)
    expected = {"the data": "the data, if nothing unrecorded", "nobody": "nobody", "your order": "your order"}
    assert {row.settled for row in view.rows} == {expected[each] for each in by}
    assert all((row.verb == "goes with") == (row.settled == "nobody") for row in view.rows)


def test_a_link_that_nobody_settled_has_the_support_of_both_directions(study: Study) -> None:
    rng = np.random.default_rng(4)
    first = rng.choice(["no", "yes"], 400)
    second = np.where(rng.random(400) < 0.85, first, rng.choice(["no", "yes"], 400))
    table = engine.Table.from_frame(pd.DataFrame({"first": first, "second": second}))
    learned = engine.learn(table, engine.Order([("All", ["first", "second"])]))
    view = model_view.view(study, learned, 1)
    (row,) = view.rows
    one, other = learned.support_of("first", "second"), learned.support_of("second", "first")
    assert row.verb == "goes with" and 0.3 < one < 0.7 and one + other > 0.99
    assert row.support == "over 99%" and view.doubted is None


def test_columns_with_links_are_told_before_those_without() -> None:
    nodes = [engine.Category(f"c{place}", ["no", "yes"], [], [0.5, 0.5]) for place in range(9)]
    late = engine.Category("late", ["no", "yes"], ["c8"], [[0.9, 0.1], [0.2, 0.8]])
    told = [each.name for each in model_accounts.accounts(engine.Model.from_network([*nodes, late]), None)]
    assert told[:2] == ["c8", "late"]


def test_each_column_is_told_in_words_with_its_table_on_demand(client: TestClient, app: FastAPI, study: Study) -> None:
    model = app.state.store.model(study.key)
    page = client.get(f"/study/{study.key}/model").text
    told = words(page)
    for name in model.network.names:
        assert f"Shares and intervals of {name}" in told
        for clause in model.account(name).rules.clauses:
            assert "".join(part.text for part in clause) in told
        assert "".join(part.text for part in model.account(name).touches) in told
    assert "It leads to turned up" in told
    assert page.count("<details><summary>Shares and intervals") == len(model.network.names)
    assert " style=" not in page


def test_the_table_of_a_column_holds_the_shares_and_intervals_of_the_model(app: FastAPI, study: Study) -> None:
    model = app.state.store.model(study.key)
    (account,) = (each for each in model_accounts.accounts(model, None) if each.name == "turned up")
    node = model.network.node("turned up")
    assert account.parents == node.parents and account.levels == node.levels and account.note == ""
    for line, row in zip(account.lines, np.asarray(node.table).reshape(-1, len(node.levels)), strict=True):
        assert [figure for figure, _ in line.shares] == [f"{100 * share:.0f}%" for share in row]
        for (_, interval), share in zip(line.shares, row, strict=True):
            low, high = (float(re.sub(r"[^0-9]", "", end)) for end in interval.split(" to "))
            assert low < 100 * share < high


def test_a_long_table_shows_its_commonest_rows_and_levels_and_says_what_it_leaves_out() -> None:
    sites = [f"site {place}" for place in range(30)]
    parent = engine.Category("site", sites, [], np.arange(1, 31) / np.arange(1, 31).sum())
    child = engine.Category("kind", list("abcdefghi"), ["site"], np.full((30, 9), 1 / 9))
    site, kind = model_accounts.accounts(engine.Model.from_network([parent, child]), None)
    assert site.levels == tuple(sites[-7:]) and site.note == "Not shown: 23 rarer levels; the program holds them."
    assert [line.given for line in kind.lines] == [(name,) for name in sites[6:]]
    assert kind.note == "Not shown: six rarer combinations and two rarer levels; the program holds them."


def test_an_interval_whose_ends_read_alike_is_told_once(app: FastAPI) -> None:
    frame = pd.DataFrame({"town": ["rare", *["usual"] * 2_999], "passed": ["yes", "no"] * 1_500})
    study = app.state.store.bring("Rare", frame, "rare.csv", plan=Plan(stages=(("All", ("town", "passed")),)))
    keep_a_model(app.state.store, study)
    told = {each.name: each for each in model_accounts.accounts(app.state.store.model(study.key), None)}
    assert [line.shares[0] for line in told["town"].lines] == [("under 1%", "under 1%")]


def test_the_picked_column_is_told_first_then_outcomes_then_what_may_be_changed(app: FastAPI, study: Study) -> None:
    model = app.state.store.model(study.key)
    assert [account.name for account in model_accounts.accounts(model, None)][:2] == ["passed", "mentor"]
    told = model_accounts.accounts(model, "age")
    assert [account.name for account in told][:3] == ["age", "passed", "mentor"]
    assert [account.name for account in told if account.picked] == ["age"]


def test_the_columns_of_a_large_model_are_folded_but_all_told(client: TestClient, app: FastAPI) -> None:
    rng = np.random.default_rng(6)
    frame = pd.DataFrame({f"c{place}": rng.choice(["no", "yes"], 60) for place in range(17)})
    stages = tuple((f"Stage {place}", (f"c{place}",)) for place in range(17))
    study = app.state.store.bring("Many", frame, "many.csv", plan=Plan(stages=stages))
    keep_a_model(app.state.store, study)
    page = client.get(f"/study/{study.key}/model").text
    before, after = page.split("<summary>11 more columns</summary>")
    assert before.count("Shares and intervals") == model_view.SHOWN_COLUMNS == 6
    assert after.count("Shares and intervals") == 11


def test_a_wide_stage_is_said_beside_the_links(client: TestClient, app: FastAPI) -> None:
    rng = np.random.default_rng(5)
    frame = pd.DataFrame({f"c{place}": rng.choice(["no", "yes"], 60) for place in range(11)})
    study = app.state.store.bring("Wide", frame, "wide.csv")
    keep_a_model(app.state.store, study)
    told = words(client.get(f"/study/{study.key}/model").text)
    assert "In the stage Everything, of more than ten columns, support is summed over orders" in told


def test_stages_of_ten_columns_need_no_such_sentence(client: TestClient, study: Study) -> None:
    assert "summed over orders" not in client.get(f"/study/{study.key}/model").text


# The program


def test_the_program_is_offered_at_the_size_shown_and_downloads_under_a_safe_name(
    client: TestClient, app: FastAPI, study: Study
) -> None:
    page = client.get(f"/study/{study.key}/model?links=4").text
    assert f'href="/study/{study.key}/model.py?links=4" download>Download the program' in page
    answer = client.get(f"/study/{study.key}/model.py?links=4")
    assert answer.status_code == 200
    assert answer.headers["content-type"] == "text/x-python; charset=utf-8"
    assert answer.headers["content-disposition"] == 'attachment; filename="evening-4-links.py"'
    assert answer.headers["x-content-type-options"] == "nosniff"
    assert answer.text == app.state.store.learned(study.key).model(4).program()


def test_without_a_size_the_program_is_that_of_the_model_in_use(client: TestClient, app: FastAPI, study: Study) -> None:
    address = f"/study/{study.key}/model.py"
    assert client.get(address).text == app.state.store.learned(study.key).model().program()
    app.state.store.accept(study.key, 5)
    assert client.get(address).text == app.state.store.learned(study.key).model(5).program()


@pytest.mark.parametrize("links", ["999", "-1", "many", "9" * 5000, "%00", "1.5"])
def test_a_program_of_a_size_that_is_none_is_refused_in_a_sentence(
    client: TestClient, study: Study, links: str
) -> None:
    answer = client.get(f"/study/{study.key}/model.py?links={links}")
    assert answer.status_code == 422
    assert "links" in answer.text and "content-disposition" not in answer.headers


def test_without_a_model_there_is_no_program(client: TestClient, app: FastAPI) -> None:
    bare = app.state.store.bring("Bare", evening(60), "bare.csv")
    for query in ("", "?links=4"):
        answer = client.get(f"/study/{bare.key}/model.py{query}")
        assert answer.status_code == 409
        assert "has no model yet" in answer.text
    assert client.get("/study/nowhere/model.py").status_code == 404


def test_hostile_names_are_text_on_the_page_and_literals_in_the_program(client: TestClient, app: FastAPI) -> None:
    rng = np.random.default_rng(2)
    cause = rng.choice(["<b>\n", "no"], 200)
    frame = pd.DataFrame({HOSTILE: cause, "b": np.where(rng.random(200) < 0.8, cause, "x'\"\\")})
    plan = Plan(stages=((HOSTILE, (HOSTILE,)), ("Then", ("b",))), insist=((HOSTILE, "b"),))
    study = app.state.store.bring(HOSTILE, frame, "hostile.csv", plan=plan)
    study = keep_a_model(app.state.store, study)
    page = client.get(f"/study/{study.key}/model").text
    assert "<script>alert" not in page and "<b>\n" not in page
    assert f"Shares and intervals of {HOSTILE}" in words(page)
    answer = client.get(f"/study/{study.key}/model.py")
    assert re.fullmatch(r'attachment; filename="[a-z0-9-]+\.py"', answer.headers["content-disposition"])
    space: dict[str, object] = {"__name__": "a_program"}
    exec(compile(answer.text, "program.py", "exec"), space)
    drawn = space["sample"](400, 1)  # type: ignore[operator]
    model = app.state.store.model(study.key)
    assert {name: set(column) for name, column in drawn.items()} == {
        node.name: set(node.levels) for node in model.network.nodes
    }


def test_a_study_whose_size_in_use_is_shown_needs_no_query(app: FastAPI, study: Study) -> None:
    learned = app.state.store.learned(study.key)
    view = model_view.view(replace(study, links=5), learned)
    assert view.program == f"/study/{study.key}/model.py?links=5"


def test_the_table_of_a_number_holds_means_intervals_spreads_and_slopes() -> None:
    site = engine.Category("site", ["north", "south"], [], [0.75, 0.25])
    hours = engine.Number("hours", ["site"], [10.0, 14.0], [], [4.0, 9.0], [12.0])
    pay = engine.Number("pay", ["hours", "site"], [1000.0, 2000.0], [[100.0], [-50.0]], [1e4, 0.0])
    model = engine.Model.from_network([site, hours, pay])
    found = {each.name: each for each in model_accounts.accounts(model, None)}
    assert found["pay"].parents == ("site",) and found["pay"].number and not found["site"].number
    assert "".join(part.text for part in found["pay"].held) == "hours at 11 (its mean)" and found["hours"].held == ()
    assert found["pay"].levels == ("on average", "9 in 10 expected within", "for each 1 more of hours")
    assert [line.given for line in found["pay"].lines] == [("north",), ("south",)]
    assert [line.shares[1:] for line in found["pay"].lines] == [
        (("160 of that", ""), ("+100", "")),
        (("0 of that", ""), ("−50", "")),
    ]
    assert [line.shares[0] for line in found["hours"].lines] == [("10", ""), ("14", "")]
    assert [line.common for line in found["hours"].lines] == ["75%", "25%"]


def test_a_number_is_told_by_its_mean_on_the_page(client: TestClient, app: FastAPI) -> None:
    rng = np.random.default_rng(8)
    site = rng.choice(["north", "south"], 400)
    hours = np.where(site == "north", 10.0, 14.0) + rng.normal(0.0, 2.0, 400)
    frame = pd.DataFrame({"site": site, "hours": hours, "pay": 20.0 * hours + rng.normal(0.0, 9.0, 400)})
    plan = Plan(stages=tuple((name, (name,)) for name in frame.columns))
    study = app.state.store.bring("Numbers", frame, "numbers.csv", plan=plan)
    keep_a_model(app.state.store, study)
    model = app.state.store.model(study.key)
    assert model.network.numbers == ("hours", "pay")
    told = words(client.get(f"/study/{study.key}/model").text)
    for name in model.network.numbers:
        rules = model.account(name).rules
        for clause in (*rules.clauses, rules.then):
            assert "".join(part.text for part in clause) in told
        assert f"Means and intervals of {name}" in told
    assert "Each row is a combination of levels; across it, hours in it. 90% intervals" in told
