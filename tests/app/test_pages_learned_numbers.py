"""The Model page of a mixed table: how records were counted, limits that were reached, who settled directions."""

from __future__ import annotations

import re
import time

import numpy as np
import pandas as pd
import pytest
from fastapi import FastAPI
from fastapi.testclient import TestClient

import engine
from app.pages import learning_view, model_view
from app.store import Choices, Plan, Study
from app.store.progress import JobState
from app.wording.learned import at_limit, counting, shaped
from engine.network.said import plain
from tests.app.evening import keep_a_model
from tests.app.mixed_evening import MIXED_PLAN, mixed_evening
from tests.app.test_pages_model import words


def kept(app: FastAPI, frame: pd.DataFrame, plan: Plan, kinds: dict[str, str] | None = None, most: int = 3) -> Study:
    """A study with a model learned with up to `most` parents."""
    store = app.state.store
    study = store.bring("Mixed", frame, "mixed.csv", plan=plan, choices=Choices(kinds=kinds or {}))
    if most == 3:
        return keep_a_model(store, study)
    store.limit_parents(study.key, most)
    path = store.files(study.key) / "a.unfinished"
    engine.learn(store.table(study.key), plan.order(), max_parents=most).save(path)
    store.keep_learned(study.key, path, study.basis)
    return store.study(study.key)


def ended(client: TestClient, key: str) -> str:
    """The Model page once learning has ended."""
    for _ in range(600):
        page = client.get(f"/study/{key}/model").text
        if "Learning the model" not in page:
            return page
        time.sleep(0.05)
    raise AssertionError("learning did not end")


def three_causes(rows: int = 1_500) -> pd.DataFrame:
    """A mark that three columns raise."""
    rng = np.random.default_rng(4)
    frame = pd.DataFrame({name: np.where(rng.random(rows) < 0.5, "yes", "no") for name in ("one", "two", "three")})
    return frame.assign(mark=(frame == "yes").sum(axis=1) * 2.0 + rng.normal(0.0, 1.0, rows))


CAUSES = Plan(stages=(("Before", ("one", "two", "three")), ("After", ("mark",))))


def test_weights_and_groups_are_said_with_what_the_records_are_worth(client: TestClient, app: FastAPI) -> None:
    rng = np.random.default_rng(3)
    frame = mixed_evening(600)
    site = rng.integers(0, 30, 600)
    for alike in ("mark", "travel time"):
        frame[alike] = np.round(frame[alike] + rng.normal(0.0, 9.0, 30)[site], 1)
    frame = frame.assign(site=[f"site {each}" for each in site], counts=rng.choice([0.5, 1.0, 3.0], 600))
    study = kept(app, frame, MIXED_PLAN, {"site": "group", "counts": "weight"})
    table = app.state.store.table(study.key)
    equal = frame["counts"].sum() ** 2 / (frame["counts"] ** 2).sum()
    order = MIXED_PLAN.order()
    worth = round(float(table.coded(order.columns, (), order.may_lead).weights.sum()))
    assert worth < equal < 600
    told = words(client.get(f"/study/{study.key}/model").text)
    assert f"By their weights the 600 records are worth {round(equal):,} of equal weight" in told
    assert f"The records stand in 30 groups. Those of one are alike, so that all count as {worth:,} separate" in told
    assert "Each group is held out whole or not at all" in told
    assert f"in nats for each of the {worth:,} cases that the records are worth" in told
    learned = app.state.store.learned(study.key)
    view = model_view.view(study, learned)
    (shown,) = (size for size in view.all_sizes if size.shown)
    assert float(shown.score.replace("−", "-")) == pytest.approx(float(shown.held_out.replace("−", "-")), rel=0.05)


def test_equal_records_without_a_group_need_no_such_sentence(client: TestClient, app: FastAPI) -> None:
    study = kept(app, mixed_evening(), MIXED_PLAN)
    told = words(client.get(f"/study/{study.key}/model").text)
    assert "By their weights" not in told and "separate cases" not in told and "in nats a record" in told
    assert counting(500, 500.0, 500.0, None) == ()
    assert counting(500, 499.9, 499.9, 9) == (
        "The records stand in under 10 groups. Each group is held out whole or not at all, so that no record is "
        "predicted from others of its group.",
    )


def test_a_number_taken_as_bands_is_said_with_its_reason(client: TestClient, app: FastAPI) -> None:
    frame = mixed_evening()
    frame.loc[::2, "travel time"] = 0.0
    study = kept(app, frame, MIXED_PLAN)
    assert "“travel time” is taken as bands: 50% of its records hold 0." in words(
        client.get(f"/study/{study.key}/model").text
    )


def test_a_column_at_the_limit_is_said_and_one_button_learns_with_one_parent_more(
    client: TestClient, app: FastAPI
) -> None:
    study = kept(app, three_causes(), CAUSES, most=2)
    address = f"/study/{study.key}/model"
    page = client.get(address).text
    (missing,) = {"one", "two", "three"} - set(app.state.store.model(study.key).network.node("mark").parents)
    assert (
        f"mark is at the limit of 2 parents; one more, {missing}, would describe it better: "
        "the odds are over 1,000 to 1."
    ) in words(page)
    assert "described better with 3 parents" not in words(page), "it is said once"
    assert "Learn again with up to 3 parents</button>" in page
    assert re.search(r'<option value="2" selected', page)
    client.post(f"/study/{study.key}/learn", data={"max_parents": "3"})
    page = ended(client, study.key)
    assert "at the limit of" not in words(page)
    assert re.search(r'<option value="3" selected', page)
    assert "with up to 3; the same records" in words(page)
    assert app.state.store.learned(study.key).max_parents == app.state.store.study(study.key).max_parents == 3
    assert "at the limit of" not in words(client.get(f"{address}?links=1").text)


@pytest.mark.parametrize("most", ["0", "6", "many", "-1", "9" * 40])
def test_a_limit_of_parents_out_of_range_is_refused_and_nothing_is_learned(
    client: TestClient, app: FastAPI, most: str
) -> None:
    study = kept(app, three_causes(200), CAUSES)
    answer = client.post(f"/study/{study.key}/learn", data={"max_parents": most})
    assert answer.status_code == 422 and "Traceback" not in answer.text
    assert app.state.jobs.state(study.key) is None
    assert app.state.store.study(study.key).max_parents == 3


def test_at_the_limit_all_parents_are_named_where_some_would_give_way() -> None:
    said = plain(at_limit("mark", ["a", "b"], ["c", "d", "e"], "20 to 1"))
    assert (
        said == "mark is at the limit of 2 parents; c, d and e together would describe it better: the odds are 20 to 1."
    )
    assert plain(at_limit("mark", ["a"], ["a", "b"], "20 to 1")).startswith(
        "mark is at the limit of 1 parent; one more, b"
    )


def test_why_nobody_settled_a_category_against_a_number_is_said(client: TestClient, app: FastAPI) -> None:
    *before, (_, mark), (_, passed) = MIXED_PLAN.stages
    together = Plan(stages=(*before, ("After", (*mark, *passed))))
    study = kept(app, mixed_evening(), together)
    told = words(client.get(f"/study/{study.key}/model").text)
    assert "Nobody settled this direction: mark goes with passed. Between a category and a number of one stage" in told
    apart = kept(app, mixed_evening(), MIXED_PLAN)
    assert "Nobody settled" not in words(client.get(f"/study/{apart.key}/model").text)
    assert shaped([("a", "b"), ("c", "d"), ("e", "f"), ("g", "h")]).startswith(
        "Nobody settled these directions: a goes with b, c goes with d, e goes with f and 1 more."
    )


def test_links_into_numbers_are_as_strong_as_they_move_them_in_their_own_spread(app: FastAPI) -> None:
    """Else a number in large units would come before everything."""
    frame = mixed_evening(1_500)
    small = kept(app, frame, MIXED_PLAN)
    large = kept(app, frame.assign(mark=1000.0 * frame["mark"]), MIXED_PLAN)
    views = [model_view.view(study, app.state.store.learned(study.key)) for study in (small, large)]
    assert [(row.source, row.target) for row in views[0].rows] == [(row.source, row.target) for row in views[1].rows]
    strengths = {(row.source, row.target): row.strength for row in views[0].rows}
    assert strengths["mentor hours", "mark"].endswith(" on average")
    assert strengths["mark", "passed"].endswith(" points")


def test_a_collinear_number_is_refused_by_name_with_a_way_to_its_card(client: TestClient, app: FastAPI) -> None:
    frame = mixed_evening()
    frame["mark lost"] = (100.0 - frame["mark"]).round(1)
    plan = Plan(stages=(*MIXED_PLAN.stages[:3], ("After", ("mark", "mark lost", "passed"))))
    study = app.state.store.bring("Mixed", frame, "mixed.csv", plan=plan)
    client.post(f"/study/{study.key}/learn")
    page = ended(client, study.key)
    assert "“mark lost” follows exactly from “mark” in every record" in words(page)
    place = list(frame.columns).index("mark lost")
    address = f"/study/{study.key}/records?open={place}#column-{place}"
    assert f'<a class="btn main" href="{address}">Go to mark lost on Records</a>' in page
    assert f'id="column-{place}"' in client.get(address).text
    app.state.store.save_choices(study.key, Choices(kinds={"mark lost": "left out"}))
    page = client.get(f"/study/{study.key}/model").text
    assert "follows exactly" not in page and "Learn the model</button>" in page


def test_what_stops_learning_is_mended_where_it_stands(app: FastAPI) -> None:
    study = app.state.store.bring("Mixed", mixed_evening(), "mixed.csv", plan=MIXED_PLAN)
    table = app.state.store.table(study.key)

    def way(where: str | None, state: str = "failed") -> tuple[str, str] | None:
        job = JobState(state, 0.5, "Counting", (), study.created, "It stopped.", where)  # type: ignore[arg-type]
        return learning_view.way_on(job, table, study)

    home = f"/study/{study.key}"
    assert way("mark") == (f"{home}/records?open=4#column-4", "Go to mark on Records")
    assert way("insist") == way("Before") == (f"{home}/order", "Go to Order")
    assert way("records") == (f"{home}/records", "Go to Records")
    assert way(None) is way("mark", "cancelled") is way("mark", "died") is None


def test_the_order_tells_numbers_from_numbers_taken_as_bands(client: TestClient, app: FastAPI) -> None:
    frame = mixed_evening()
    frame.loc[::2, "travel time"] = 0.0
    study = app.state.store.bring("Mixed", frame, "mixed.csv", plan=MIXED_PLAN)
    told = words(client.get(f"/study/{study.key}/order").text)
    bands = len(app.state.store.table(study.key).columns["travel time"].levels)
    assert f"travel time number as {bands} bands" in told
    assert "mark number" in told and "mark number as" not in told
