"""The Records page on numbers, weights and groups: what is shown, saved, refused, and not given away."""

from __future__ import annotations

import re

import numpy as np
import pandas as pd
import pytest
from fastapi import FastAPI
from fastapi.testclient import TestClient

from app.pages import records_pictures, records_view
from app.store import Choices, Plan, Store, Study
from tests.app.test_pages import form_of

HOSTILE = "<b>hours</b>"


@pytest.fixture
def shelf(app: FastAPI) -> Store:
    store: Store = app.state.store
    return store


@pytest.fixture(scope="module")
def mixed() -> pd.DataFrame:
    """300 visits of 60 persons: a smooth number, one with a spike, one with blanks, weights, some of them blank."""
    rng = np.random.default_rng(11)
    person = rng.permutation(np.repeat(np.arange(60), 5))
    return pd.DataFrame(
        {
            "person": [f"P{each:03}" for each in person],
            "w": rng.choice([0.5, 1.0, 1.5], 300),
            "thin": np.where(rng.random(300) < 0.1, np.nan, 1.0 + rng.random(300)),
            HOSTILE: np.round(rng.normal(40, 9, 300)),
            "pay": np.where(rng.random(300) < 0.3, 0.0, rng.normal(900, 80, 300)),
            "code": rng.choice([1.5, 1000.25, 2026.0], 300),
            "passed": rng.choice(["no", "yes"], 60)[person],
        }
    )


@pytest.fixture
def study(client: TestClient, shelf: Store, mixed: pd.DataFrame) -> Study:
    plan = Plan(
        stages=(("Before", ("w", "thin", HOSTILE, "pay", "code")), ("After", ("passed",))),
        insist=(("w", "passed"),),
        changeable=("w",),
        outcomes={"passed": ("yes",)},
    )
    return shelf.bring("Mixed", mixed, "mixed.csv", Choices(kinds={"w": "number"}), plan)


def card(page: str, column: str) -> str:
    found = re.search(rf'<form class="rcard[^>]*aria-label="{re.escape(column)}".*?</form>', page, re.DOTALL)
    assert found
    return found[0]


def told(card: str) -> str:
    return " ".join(re.sub(r"<[^>]+>", " ", card).split())


def test_a_number_shows_its_range_step_bands_and_that_it_is_learned_as_one(client: TestClient, study: Study) -> None:
    shown = card(client.get(f"/study/{study.key}/records").text, "&lt;b&gt;hours&lt;/b&gt;")
    assert re.search(r"\d+ to \d+, middle \d+, in whole numbers; bands: under \d+, \d+ to under \d+", told(shown))
    assert "learned as a number; on categories it acts by its bands" in shown
    assert shown.count('class="cut"') == 3


def test_a_number_that_is_learned_as_bands_says_why(client: TestClient, study: Study) -> None:
    page = client.get(f"/study/{study.key}/records").text
    assert re.search(r"learned as bands: \d\d% of its records hold 0", card(page, "pay"))
    assert "learned as bands: a blank is a level of its own here" in card(page, "thin")


def test_weights_and_groups_leave_the_order_and_what_they_do_is_said(
    client: TestClient, study: Study, shelf: Store
) -> None:
    address = f"/study/{study.key}/records"
    fields = form_of(client.get(address).text, "w")
    page = client.post(address, data={**fields, "kind": "weight", "changeable": "true"}).text
    assert "“w” is the weight now, so it was taken out of the stage Before." in page
    assert "The link you insisted on from “w” to “passed” went with it." in page
    assert "“w” is no longer marked as changeable." in page
    assert "By their weights in “w” the 300 records are worth" in page
    assert "how much each record counts; not learned from" in card(page, "w")
    page = client.post(address, data={**form_of(page, "person"), "kind": "group"}).text
    assert "The records stand in 60 groups by “person”." in page
    assert "“passed” does not vary inside a group" in page
    assert "60 groups, the largest of under 10 records" in card(page, "person")
    assert "<b>5</b> columns will be used, <b>none</b> is left out" in page
    plan = shelf.study(study.key).plan
    assert not {"w", "person"} & set(plan.columns) and plan.insist == () and plan.changeable == ()
    table = shelf.table(study.key)
    assert table.group is not None and table.weights.sum() < 300


def test_a_card_that_is_not_learned_from_has_no_marks(client: TestClient, study: Study) -> None:
    address = f"/study/{study.key}/records"
    page = client.post(address, data={**form_of(client.get(address).text, "w"), "kind": "weight"}).text
    assert 'name="changeable"' not in card(page, "w") and 'name="better"' not in card(page, "w")
    assert 'name="changeable"' in card(page, "pay")


def test_a_weight_that_is_blank_is_refused_until_those_rows_are_left_out(
    client: TestClient, study: Study, shelf: Store
) -> None:
    address = f"/study/{study.key}/records"
    fields = {**form_of(client.get(address).text, "thin"), "kind": "weight"}
    refused = client.post(address, data={**fields, "blank": "level"})
    assert refused.status_code == 422
    assert "Not saved." in card(refused.text, "thin") and "is blank in records" in card(refused.text, "thin")
    assert "to be mended in the file" in card(refused.text, "thin")
    assert shelf.study(study.key) == study
    page = client.post(address, data={**fields, "blank": "drop row"}).text
    assert "left out because thin is blank there." in page
    assert shelf.table(study.key).columns["thin"].kind == "weight"


def test_a_second_weight_is_refused(client: TestClient, study: Study, shelf: Store) -> None:
    address = f"/study/{study.key}/records"
    client.post(address, data={**form_of(client.get(address).text, "w"), "kind": "weight"})
    answer = client.post(address, data={**form_of(client.get(address).text, "code"), "kind": "weight"})
    assert answer.status_code == 422
    assert "“w” and “code” are taken as the weight, and there can only be one." in answer.text
    assert shelf.table(study.key).columns["code"].kind == "grade"


def test_a_column_brought_back_from_being_the_weight_joins_the_order(
    client: TestClient, study: Study, shelf: Store
) -> None:
    address = f"/study/{study.key}/records"
    for kind in ("weight", "number"):
        page = client.post(address, data={**form_of(client.get(address).text, "w"), "kind": kind}).text
    assert "“w” was put into the stage After; move it where it belongs." in page
    assert "w" in shelf.study(study.key).plan.columns


def test_the_first_rows_name_levels_as_the_cards_do_and_write_amounts_in_full(study: Study, shelf: Store) -> None:
    table = shelf.table(study.key)
    view = records_view.view(study, table)
    names = [name for name, _ in view.names]
    first = table.frame.iloc[:5]
    for row, (_, cells) in zip(view.rows, first.iterrows(), strict=True):
        shown = {name: value for name, (value, _) in zip(names, row, strict=True)}
        assert shown["code"] in ("1.5", "1000.25", "2026") and shown["code"] in table.columns["code"].levels
        assert float(shown["pay"]) == cells["pay"]
        assert shown["thin"] == ("" if np.isnan(cells["thin"]) else str(cells["thin"]))


def test_a_picture_is_made_once_for_a_table(study: Study, shelf: Store) -> None:
    table = shelf.table(study.key)
    assert records_pictures.picture(table, "pay") is records_pictures.picture(table, "pay")
    shelf.save_choices(study.key, Choices(kinds={"pay": "left out"}))
    assert records_pictures.picture(shelf.table(study.key), "pay").told.endswith("different values")
