"""Shelf, Records, Order and Model through the app: what they show, change, refuse, and keep when they refuse."""

from __future__ import annotations

import re
import time

import pandas as pd
import pytest
from fastapi import FastAPI
from fastapi.testclient import TestClient

from app.jobs import Jobs
from app.main import create_app
from app.settings import Settings
from app.store import Plan, Store, Study
from engine.order import MORE
from tests.app import slow_work

HOSTILE = '<script>alert("x")</script> & \'"'


@pytest.fixture
def shelf(app: FastAPI) -> Store:
    store: Store = app.state.store
    return store


@pytest.fixture
def study(client: TestClient, shelf: Store, visits: pd.DataFrame) -> Study:
    """The visits as they are brought: everything in one stage, nothing marked."""
    return shelf.bring("Visits", visits, "visits.csv")


@pytest.fixture
def learned(client: TestClient, app: FastAPI, study: Study, visits_plan: Plan) -> Study:
    """The visits in order, with a model."""
    app.state.store.save_plan(study.key, visits_plan)
    client.post(f"/study/{study.key}/learn")
    until = time.monotonic() + 60
    while app.state.jobs.state(study.key).state == "running":
        assert time.monotonic() < until, "learning did not end"
        time.sleep(0.05)
    found: Study = app.state.store.study(study.key)
    return found


def form_of(page: str, column: str) -> dict[str, str]:
    """The hidden fields and the kind of one card's form on the Records page."""
    card = re.search(rf'<form class="rcard[^>]*aria-label="{column}".*?</form>', page, re.DOTALL)
    assert card
    fields = dict(re.findall(r'<input type="hidden" name="(\w+)" value="([^"]*)"', card[0]))
    kind = re.search(r"<option selected>([^<]+)</option>", card[0])
    assert kind
    return fields | {"kind": kind[1]}


def test_an_empty_shelf_says_what_to_do(client: TestClient) -> None:
    page = client.get("/").text
    assert "Bring a table" in page
    assert "No</b> studies yet" in page


def test_a_table_is_brought_and_its_records_are_shown(client: TestClient, visits: pd.DataFrame) -> None:
    sent = {"file": ("spring visits.csv", visits.to_csv(index=False), "text/csv")}
    answer = client.post("/bring", data={"name": " Spring "}, files=sent)
    assert answer.status_code == 200
    assert str(answer.url).endswith("/study/spring/records")
    assert "240</b> records" in answer.text
    assert "spring visits.csv" in answer.text


def test_a_table_of_columns_that_never_vary_is_shown_and_leads_nowhere_else(client: TestClient, shelf: Store) -> None:
    same = shelf.bring("Same", pd.DataFrame({"town": ["Tern"] * 30, "year": ["2025"] * 30}), "same.csv")
    assert client.get(f"/study/{same.key}/records").status_code == 200
    page = client.get(f"/study/{same.key}/order")
    assert page.status_code == 200
    assert "No column can be put in order" in page.text
    assert f'href="/study/{same.key}/records">Go to Records' in page.text


def test_a_study_without_a_typed_name_is_called_after_its_file(client: TestClient, visits: pd.DataFrame) -> None:
    sent = {"file": ("spring_visits.csv", visits.to_csv(index=False), "text/csv")}
    assert str(client.post("/bring", files=sent).url).endswith("/study/spring-visits/records")


@pytest.mark.parametrize(
    "content",
    [b"", b"\x89PNG\r\n\x1a\n\x00\x00\x00\rIHDR", b"a,b\n1,2\n1,2,3\n", b"a,a\n1,2\n3,4\n"],
    ids=["empty", "a picture", "ragged", "a column twice"],
)
def test_a_bad_file_is_refused_in_a_sentence_and_nothing_is_stored(
    client: TestClient, shelf: Store, content: bytes
) -> None:
    answer = client.post("/bring", data={"name": "Spring & <b>"}, files={"file": ("spring.csv", content, "text/csv")})
    assert answer.status_code == 422
    assert "Not read" in answer.text
    assert 'value="Spring &amp; &lt;b&gt;"' in answer.text
    assert shelf.studies() == []


def test_bringing_no_file_says_so(client: TestClient) -> None:
    answer = client.post("/bring", data={"name": "Spring"}, files={"file": ("", b"", "application/octet-stream")})
    assert answer.status_code == 422
    assert "No file was chosen." in answer.text


def test_the_shelf_lists_each_study_with_its_next_step(client: TestClient, study: Study) -> None:
    page = client.get("/").text
    assert f'href="/study/{study.key}/order">Put them in order' in page
    assert "One</b> study on this machine." in page


@pytest.mark.parametrize("place", ["records", "order", "model"])
def test_a_study_that_is_not_there_is_a_404_with_a_sentence(client: TestClient, place: str) -> None:
    answer = client.get(f"/study/nowhere/{place}")
    assert answer.status_code == 404
    assert "There is no study “nowhere”." in answer.text


@pytest.mark.parametrize("place", ["records", "order"])
def test_hostile_names_and_levels_are_text(client: TestClient, shelf: Store, place: str) -> None:
    frame = pd.DataFrame({HOSTILE: ["<b>", "no"] * 50, "select": ["x", "y", "x", "y", "y"] * 20})
    study = shelf.bring(HOSTILE, frame, f"{HOSTILE}.csv")
    page = client.get(f"/study/{study.key}/{place}").text
    assert "<script>alert" not in page
    assert "<b>, no" not in page
    assert "&lt;script&gt;alert" in page


# Records


def test_a_mark_is_saved_and_shown(client: TestClient, study: Study, shelf: Store) -> None:
    address = f"/study/{study.key}/records"
    fields = form_of(client.get(address).text, "passed")
    answer = client.post(address, data={**fields, "changeable": "true", "better": ["1"]}, follow_redirects=False)
    assert answer.status_code == 303
    assert answer.headers["location"].endswith(f"#column-{fields['column']}")
    plan = shelf.study(study.key).plan
    assert plan.changeable == ("passed",)
    assert plan.outcomes == {"passed": (shelf.table(study.key).columns["passed"].levels[1],)}
    assert "outcome, yes is better" in client.get(address).text


def test_a_number_gets_cuts_and_a_direction(client: TestClient, study: Study, shelf: Store) -> None:
    address = f"/study/{study.key}/records"
    fields = form_of(client.get(address).text, "age")
    client.post(address, data={**fields, "cuts": "30, 50", "direction": "more"})
    assert shelf.study(study.key).choices.bands == {"age": (30.0, 50.0)}
    assert shelf.study(study.key).plan.outcomes == {"age": MORE}
    page = client.get(address).text
    assert "under 30" in page
    client.post(address, data={**form_of(page, "age"), "cuts": "", "direction": "more"})
    assert shelf.study(study.key).choices.bands == {}


def test_a_unit_stands_behind_the_range_and_is_never_markup(client: TestClient, study: Study, shelf: Store) -> None:
    address = f"/study/{study.key}/records"
    for unit, shown in (("years", "years"), ("<b>&\"'%", "&lt;b&gt;&amp;&#34;&#39;%")):
        fields = form_of(client.get(address).text, "age")
        answer = client.post(address, data={**fields, "unit": unit})
        assert shelf.study(study.key).choices.units == {"age": unit}
        assert re.search(rf" to [\d.]+ {re.escape(shown)}, middle", answer.text)
        assert f'name="unit" value="{shown}"' in answer.text
    client.post(address, data={**form_of(answer.text, "age"), "unit": ""})
    assert shelf.study(study.key).choices.units == {}


def test_a_unit_that_is_too_long_is_refused_and_stays_typed(client: TestClient, study: Study, shelf: Store) -> None:
    address, unit = f"/study/{study.key}/records", "years since the first visit"
    answer = client.post(address, data={**form_of(client.get(address).text, "age"), "unit": unit})
    assert answer.status_code == 422 and "at most 20 fit behind a figure" in answer.text
    assert f'value="{unit}"' in answer.text and shelf.study(study.key) == study


def test_a_form_from_before_a_unit_was_stated_does_not_take_it_away(
    client: TestClient, study: Study, shelf: Store
) -> None:
    address = f"/study/{study.key}/records"
    early = form_of(client.get(address).text, "age")
    client.post(address, data={**early, "unit": "years"})
    assert client.post(address, data=early).status_code == 422
    assert shelf.study(study.key).choices.units == {"age": "years"}


def test_a_refused_form_keeps_what_was_typed_and_saves_nothing(client: TestClient, study: Study, shelf: Store) -> None:
    address = f"/study/{study.key}/records"
    fields = form_of(client.get(address).text, "age")
    answer = client.post(address, data={**fields, "cuts": "50, thirty", "changeable": "true"})
    assert answer.status_code == 422
    assert "“thirty” among the cuts of “age” is not a number." in answer.text
    assert 'value="50, thirty"' in answer.text
    assert shelf.study(study.key) == study


def test_a_kind_that_the_values_do_not_fit_is_refused(client: TestClient, study: Study, shelf: Store) -> None:
    address = f"/study/{study.key}/records"
    fields = form_of(client.get(address).text, "shift")
    answer = client.post(address, data={**fields, "kind": "number"})
    assert answer.status_code == 422
    assert "Not saved." in answer.text
    assert shelf.study(study.key) == study


def test_a_column_left_out_leaves_the_order_and_that_is_said(client: TestClient, study: Study, shelf: Store) -> None:
    address = f"/study/{study.key}/records"
    answer = client.post(address, data={**form_of(client.get(address).text, "mentor"), "kind": "left out"})
    assert answer.status_code == 200
    assert "mentor" not in shelf.study(study.key).plan.columns
    assert all(sentence.split("“")[0] in answer.text for sentence in shelf.study(study.key).mended)


def test_rows_left_out_for_their_blanks_are_said(client: TestClient, study: Study, shelf: Store) -> None:
    address = f"/study/{study.key}/records"
    answer = client.post(address, data={**form_of(client.get(address).text, "age"), "blank": "drop row"})
    assert "left out because age is blank there." in answer.text
    assert shelf.table(study.key).rows < 240


def test_a_form_opened_before_a_change_elsewhere_is_refused(client: TestClient, study: Study, shelf: Store) -> None:
    address = f"/study/{study.key}/records"
    fields = form_of(client.get(address).text, "age")
    client.post(address, data={**fields, "cuts": "30"})
    answer = client.post(address, data={**fields, "better": ["0"]})
    assert answer.status_code == 422
    assert "changed meanwhile" in answer.text


def test_columns_are_found_by_name_and_those_left_out_by_themselves(client: TestClient, study: Study) -> None:
    assert "1 of 5 shown" in client.get(f"/study/{study.key}/records?find=SHI").text
    assert "No column matches." in client.get(f"/study/{study.key}/records?find=zzz").text
    page = client.get(f"/study/{study.key}/records?show=out").text
    assert 'aria-label="town"' in page
    assert 'aria-label="shift"' not in page


# Order


def test_buttons_move_columns_and_keep_the_typed_names(client: TestClient, study: Study, shelf: Store) -> None:
    address = f"/study/{study.key}/order"
    place = list(shelf.table(study.key).columns).index("passed")
    client.post(address, data={"name": ["Before"], "do": f"place {place} 1"})
    plan = shelf.study(study.key).plan
    assert [name for name, _ in plan.stages] == ["Before", "Stage 2"]
    assert plan.stages[1][1] == ("passed",)
    client.post(address, data={"name": ["Before", "After"], "do": "move", "column": place, "to": 0})
    client.post(address, data={"do": "remove 1"})
    assert [name for name, _ in shelf.study(study.key).plan.stages] == ["Before"]


def test_an_order_is_typed_one_line_a_stage(client: TestClient, study: Study, shelf: Store) -> None:
    text = "Who: age, shift\nWhat: mentor\nThen: passed"
    page = client.post(f"/study/{study.key}/order", data={"do": "type", "text": text}).text
    assert [columns for _, columns in shelf.study(study.key).plan.stages] == [
        ("age", "shift"),
        ("mentor",),
        ("passed",),
    ]
    assert "Of 12 possible links this order allows <b>7</b>. It rules out 5 that would run backwards." in page


@pytest.mark.parametrize(
    "text", ["Who: age\nThen passed", "Who: age, shift", "Who: age, age, shift, mentor, passed", "Who: nobody"]
)
def test_a_typed_order_that_is_refused_stays_as_typed(
    client: TestClient, study: Study, shelf: Store, text: str
) -> None:
    answer = client.post(f"/study/{study.key}/order", data={"do": "type", "text": text})
    assert answer.status_code == 422
    assert f">{text}</textarea>" in answer.text
    assert shelf.study(study.key) == study


def test_a_backward_link_is_refused_with_the_engines_sentence(
    client: TestClient, study: Study, shelf: Store, visits_plan: Plan
) -> None:
    shelf.save_plan(study.key, visits_plan)
    names = list(shelf.table(study.key).columns)
    typed = {"do": "rule", "rule": "must", "source": names.index("passed"), "target": names.index("age")}
    answer = client.post(f"/study/{study.key}/order", data=typed)
    assert answer.status_code == 422
    assert "You insist that “passed” leads to “age”, but Result comes after Background." in answer.text
    assert f'<option value="{typed["source"]}" selected>passed</option>' in answer.text
    assert shelf.study(study.key).plan == visits_plan


@pytest.mark.parametrize(
    "do", ["", "nonsense", "place 99 0", "place 0 99", "remove 7", "free must 3", "place x y", "remove " + "9" * 5000]
)
def test_a_button_that_does_not_exist_changes_nothing(client: TestClient, study: Study, shelf: Store, do: str) -> None:
    assert client.post(f"/study/{study.key}/order", data={"do": do}).status_code == 422
    assert shelf.study(study.key) == study


# Model


def test_a_study_without_a_model_says_what_comes_first(client: TestClient, study: Study) -> None:
    page = client.get(f"/study/{study.key}/model").text
    assert "This study has no model yet. Put the columns in order first, then learn one." in page
    assert "Go to Order" in page


def test_a_learned_model_is_told_in_a_headline_a_curve_arcs_a_table_and_words(
    client: TestClient, learned: Study
) -> None:
    page = client.get(f"/study/{learned.key}/model").text
    assert f"{learned.recommended} link" in page
    assert "No allowed model of this size scores higher." in page
    assert f"recommended, {learned.recommended}" in page
    assert page.count('class="plain links"') == 1
    assert "How each column comes about" in page
    assert '<script type="application/json"' in page
    assert " style=" not in page


def test_another_budget_is_shown_accepted_and_kept(client: TestClient, learned: Study, shelf: Store) -> None:
    address = f"/study/{learned.key}/model"
    links = int(shelf.learned(learned.key).curve["links"].max())  # type: ignore[union-attr]
    assert f'<span class="big">{links}</span>' in client.get(f"{address}?links={links}").text
    page = client.post(f"/study/{learned.key}/budget", data={"links": links}).text
    assert shelf.study(learned.key).links == links
    assert "Accepted, and in use." in page
    assert client.post(f"/study/{learned.key}/budget", data={"links": 999}).status_code == 422
    assert shelf.study(learned.key).links == links


def test_a_nonsense_place_in_the_address_is_said_in_words(client: TestClient, study: Study) -> None:
    page = client.get(f"/study/{study.key}/records?open=first")
    assert page.status_code == 422
    assert "“open” is “first”" in page.text
    assert "integer" not in page.text


def test_a_picked_column_is_marked_in_drawing_and_table(client: TestClient, learned: Study) -> None:
    page = client.get(f"/study/{learned.key}/model?column=shift").text
    assert "shift picked out" in page
    assert page.count('aria-current="true"') >= 1
    unknown = client.get(f"/study/{learned.key}/model?column=no+such")
    assert unknown.status_code == 422
    assert "no column <em>no such</em>" in unknown.text


@pytest.mark.parametrize("links", ["-1", "many", "9999", "9" * 5000, "%00", "1.5"])
def test_a_nonsense_budget_in_the_address_is_said_and_shows_the_one_in_use(
    client: TestClient, learned: Study, links: str
) -> None:
    page = client.get(f"/study/{learned.key}/model?links={links}")
    assert page.status_code == 422
    assert "There is no model of" in page.text
    assert f'<span class="big">{learned.recommended}</span>' in page.text


def test_a_model_older_than_its_order_says_so(client: TestClient, learned: Study) -> None:
    client.post(f"/study/{learned.key}/order", data={"do": "add"})
    assert "learned before the order or the columns were changed" in client.get(f"/study/{learned.key}/model").text


def test_a_model_that_cannot_be_opened_can_be_learned_again(
    app: FastAPI, learned: Study, shelf: Store, settings: Settings
) -> None:
    (file,) = shelf.files(learned.key).glob("*.learned")
    file.write_bytes(b"of another version")
    with TestClient(create_app(settings), base_url=settings.address) as later:
        for place in ("ask", "answer"):
            refused = later.get(f"/study/{learned.key}/{place}")
            assert refused.status_code == 409
            assert "The model of this study cannot be opened" in refused.text
            assert f'href="/study/{learned.key}/model">Go to the model' in refused.text
        page = later.get(f"/study/{learned.key}/model")
    assert page.status_code == 200
    assert "The model of this study cannot be opened" in page.text
    assert "Learn the model</button>" in page.text


def test_learning_shows_progress_and_can_be_cancelled(client: TestClient, app: FastAPI, study: Study) -> None:
    app.state.jobs = Jobs(app.state.store, work=slow_work.waits)
    address = f"/study/{study.key}/model"
    page = client.post(f"/study/{study.key}/learn").text
    assert "Learning the model" in page
    assert "of 100 done" in page
    assert "See how far it is" in client.get(f"/study/{study.key}/learn").text
    page = client.post(f"/study/{study.key}/learn/cancel").text
    assert "Learning was cancelled; the study is as it was." in page
    assert app.state.store.study(study.key) == study
    assert "This study has no model yet." in client.post(f"/study/{study.key}/learn/forget").text
    assert "Learning was cancelled" not in client.get(address).text
    app.state.jobs.close()


def test_no_address_of_these_pages_moves_anything_when_it_is_only_read(client: TestClient, learned: Study) -> None:
    for place in ("learn/cancel", "budget", "learn/forget"):
        assert client.get(f"/study/{learned.key}/{place}").status_code == 405


def test_a_study_opens_at_its_next_step(client: TestClient, shelf: Store, learned: Study, visits: pd.DataFrame) -> None:
    def opens(study: Study) -> tuple[int, str]:
        answer = client.get(f"/study/{study.key}", follow_redirects=False)
        return answer.status_code, answer.headers.get("location", "")

    unordered = shelf.bring("Unordered", visits, "visits.csv")
    ordered = shelf.bring("Ordered", visits, "visits.csv", plan=learned.plan)
    assert opens(unordered) == (303, f"/study/{unordered.key}/order")
    assert opens(ordered) == (303, f"/study/{ordered.key}/model")
    assert opens(learned) == (303, f"/study/{learned.key}/ask")
    shelf.note_question(learned.key, "pin=shift.nights", "Among records.", ())
    assert opens(learned) == (303, f"/study/{learned.key}/ask?pin=shift.nights")
    assert client.get("/study/nowhere").status_code == 404


@pytest.mark.parametrize(
    "place", ["", "study/{key}/records", "study/{key}/order", "study/{key}/model", "study/{key}/ask"]
)
def test_the_head_of_a_page_is_answered_as_the_page_is(client: TestClient, study: Study, place: str) -> None:
    address = "/" + place.format(key=study.key)
    assert client.head(address).status_code == client.get(address).status_code == 200
