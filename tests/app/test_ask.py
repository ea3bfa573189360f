"""Ask and the printed answer through the app: what they say, show, withhold, refuse, and where their links lead."""

from __future__ import annotations

import html
import itertools
import re
from collections.abc import Iterator
from datetime import UTC, datetime
from pathlib import Path
from urllib.parse import urlsplit

import pytest
from fastapi import FastAPI
from fastapi.testclient import TestClient

import engine
from app.jobs import JobState
from app.store import Choices, Plan, Store, Study
from app.store.rows import table_of
from tests.app.evening import PLAN, evening, keep_a_model

BASE = "http://127.0.0.1:8377"
SCRIPT = "<script>alert(1)</script>"
QUOTES = "a\"b'c & <i>d</i>.e"


@pytest.fixture(scope="module")
def client(tmp_path_factory: pytest.TempPathFactory) -> Iterator[TestClient]:
    from app.main import create_app
    from app.settings import Settings

    data: Path = tmp_path_factory.mktemp("asked")
    with TestClient(create_app(Settings(data=data)), base_url=BASE) as client:
        yield client


@pytest.fixture(scope="module")
def store(client: TestClient) -> Store:
    assert isinstance(client.app, FastAPI)
    found: Store = client.app.state.store
    return found


@pytest.fixture(scope="module")
def study(store: Store) -> Study:
    return keep_a_model(store, store.bring("Evening", evening(), "evening.csv", Choices(), PLAN))


@pytest.fixture
def ask(client: TestClient, study: Study):
    def get(query="", status=200, page="ask"):
        answer = client.get(f"/study/{study.key}/{page}?{query}")
        assert answer.status_code == status, answer.text
        return answer.text

    return get


def words(page, pattern):
    """The text of the first element that matches, without its tags."""
    found = re.search(pattern, page, re.DOTALL)
    assert found, pattern
    return " ".join(
        html.unescape(re.sub(r"<[^>]+>", "", found[1].replace("</t", " </t"))).replace("\u2060", "").split()
    )


def sentence(page):
    return words(page, r'<h1[^>]*id="answer"[^>]*>(.*?)</h1>')


def link(page, element):
    found = re.search(rf'<a[^>]* id="{element}"[^>]*>', page)
    assert found, element
    return html.unescape(re.search(r'href="([^"]*)"', found[0])[1])


def card(page, slug):
    found = re.search(rf'<article[^>]* id="column-{slug}".*?</article>', page, re.DOTALL)
    assert found, slug
    return found[0]


NIGHTS = "pin=shift-work.nights"
MENTOR = "set=mentor.yes"


def test_the_first_visit_says_how_to_ask_and_has_two_examples(ask):
    page = ask()
    assert re.fullmatch(
        r"Across all 600 records passed is yes for \d+%\. \(90% interval \d+% to \d+%\)", sentence(page)
    )
    assert "How to ask" in page and "Click a ring" in page and "Click a diamond" in page
    examples = re.search(r"Try one:(.*?)</p>", page, re.DOTALL)[1]
    assert len(re.findall("<a ", examples)) == 2


def fetched(client, study, address):
    """What a click fetches."""
    return client.get(html.unescape(address), headers={"HX-Request": "true"}).text


def test_a_click_is_answered_within_the_model_and_then_over_sampled_models(client, study):
    page = fetched(client, study, f"/study/{study.key}/ask?{NIGHTS}&{MENTOR}")
    first = sentence(page)
    assert re.search(r"\(\+\d+ points, within this model \+\d+ to \+\d+\)\.", first)
    assert "they leave out the doubt about its links" in page
    waiting = re.search(r'<div class="doubt" id="[^"]*" hx-get="([^"]*)" hx-trigger="load"', page)
    assert html.unescape(waiting[1]) == f"/study/{study.key}/ask/doubt?{NIGHTS}&{MENTOR}"
    page = fetched(client, study, waiting[1])
    assert re.search(r"\(\+\d+ points, 90% interval \+\d+ to \+\d+\)\.", sentence(page))
    assert sentence(page).split("(")[0] == first.split("(")[0]
    assert words(page, r'id="status">(.*?)</p>') == sentence(page)
    assert 'class="doubt"' not in page
    alike = r"(, all alike|, \d+ of them different)?"
    assert re.search(rf"intervals over 50 sampled models{alike}, with 20 draws each", page)


def test_a_page_loaded_whole_waits_for_the_doubt(ask, client, study):
    page = ask(f"{NIGHTS}&{MENTOR}")
    assert "within this model +" not in sentence(page) and "90% interval +" in sentence(page)
    assert 'class="doubt"' not in page
    assert sentence(page) == sentence(fetched(client, study, f"/study/{study.key}/ask/doubt?{NIGHTS}&{MENTOR}"))


def test_watched_columns_have_both_whiskers_and_the_others_one(ask, client, study):
    def widths(page, slug):
        return [set(re.findall(r'stroke="#1B1E22" stroke-width="(1|2.5)"', card(page, slug)))]

    within = fetched(client, study, f"/study/{study.key}/ask?{NIGHTS}&{MENTOR}&open=turned-up")
    over = ask(f"{NIGHTS}&{MENTOR}&open=turned-up")
    assert widths(within, "passed") == [{"2.5"}] and widths(over, "passed") == [{"1", "2.5"}]
    assert widths(over, "turned-up") == [{"2.5"}]
    beam = re.search(r'<svg class="beam".*?</svg>', over, re.DOTALL)[0]
    assert beam.count('stroke-width="2.5"') >= 1


def test_a_refused_question_has_no_doubt_to_wait_for(client, study):
    page = fetched(client, study, f"/study/{study.key}/ask?pin=turned-up.most&{MENTOR}")
    assert "would mix two worlds" in page and 'class="doubt"' not in page


def test_a_model_learned_without_sampled_models_tells_what_it_can(client, store):
    bare = store.bring("Bare", evening(), "bare.csv", Choices(), PLAN)
    learned = engine.learn(table_of(store.table(bare.key).frame, bare.choices, bare.name), bare.plan.order(), graphs=0)
    path = store.files(bare.key) / "a.unfinished"
    learned.save(path)
    store.keep_learned(bare.key, path, bare.basis)
    page = client.get(f"/study/{bare.key}/ask?{NIGHTS}&{MENTOR}").text
    assert "within this model +" in sentence(page) and 'class="doubt"' not in page


def test_the_examples_can_be_asked(ask, client):
    examples = re.search(r"Try one:(.*?)</p>", ask(), re.DOTALL)[1]
    for address in re.findall(r'href="([^"]*)"', examples):
        assert client.get(html.unescape(address)).status_code == 200


def test_a_pin_and_a_lever_are_answered_with_their_cautions(ask):
    page = ask(f"{NIGHTS}&{MENTOR}")
    assert sentence(page).startswith(
        "By this estimate, among records with shift work = nights, setting mentor to yes would move passed from "
    )
    assert words(page, r'<p class="q">(.*?)</p>') == (
        "What would passed be among records with shift work = nights× if mentor were yes× for all of them?"
    )
    assert re.match(
        r"Those with mentor = yes anyway: .*That is not the effect\.", words(page, r'<p class="had">(.*?)</p>')
    )
    assert "does not replace a trial" in page and "They cannot see what was not recorded." in page
    assert words(page, r'id="status">(.*?)</p>') == sentence(page)


def test_clicks_lead_from_nothing_to_the_question_and_back(ask, client):
    page = ask()
    for element in ("set-mentor-yes", "card-shift-work", "pin-shift-work-nights", "also-shift-work-mixed"):
        page = client.get(link(page, element)).text
    assert "shift work = mixed or nights" in sentence(page) and "setting mentor to yes" in sentence(page)
    for element in ("pin-shift-work-nights", "pin-shift-work-mixed", "set-mentor-yes", "card-shift-work"):
        page = client.get(link(page, element)).text
    assert sentence(page) == sentence(ask())


def test_the_name_of_a_mark_is_the_next_act(ask):
    page = ask(f"{NIGHTS}&{MENTOR}")
    assert 'aria-label="Pinned at nights, take out"' in page and 'aria-label="Also pin days"' in page
    assert 'aria-label="Set to yes, take out"' in page and 'aria-label="Set to no"' in page
    assert 'aria-label="Pin no"' in card(page, "passed")
    assert "Set to" not in card(page, "passed")


def test_the_form_of_a_reach_becomes_part_of_the_address(client, study, ask):
    page = card(ask(f"{NIGHTS}&{MENTOR}"), "mentor")
    fields = dict(re.findall(r'<input type="hidden" name="([^"]*)" value="([^"]*)"', page))
    sent = client.get(f"/study/{study.key}/ask", params={**fields, "reach.mentor": "80"}, follow_redirects=False)
    assert sent.status_code == 303
    assert urlsplit(sent.headers["location"]).query == f"{NIGHTS}&{MENTOR}&reach=mentor.80"
    assert "setting mentor to yes for 80% of them" in sentence(client.get(sent.headers["location"]).text)


def test_another_column_can_be_watched(ask, client):
    page = client.get(link(ask(f"{NIGHTS}&{MENTOR}&open=turned-up"), "watch-turned-up")).text
    assert "would move turned up = " in sentence(page)


def test_the_filter_finds_columns_and_never_hides_what_is_pinned_or_set(ask):
    page = ask(f"{NIGHTS}&{MENTOR}&find=TUTOR+A")
    assert re.findall(r'<article[^>]* id="column-([^"]*)"', page) == ["shift-work", "mentor"]
    assert re.findall(r'<li class="fold"><a id="card-([^"]*)"', page) == ["tutor"]
    assert 'value="TUTOR A"' in page


def test_moved_shows_only_what_moved(ask):
    page = ask(f"{MENTOR}&show=moved")
    assert 'id="card-age"' not in page and 'id="column-passed"' in page and 'id="card-turned-up"' in page


def test_all_opens_every_card_and_many_levels_are_cut_short(ask, client):
    page = ask("show=all")
    assert len(re.findall("<article", page)) == 6
    assert len(re.findall('class="val', card(page, "tutor"))) == 5 and "and 4 more" in page
    assert len(re.findall('class="val', card(client.get(link(page, "more-tutor")).text, "tutor"))) == 9


def test_the_told_line_says_where_a_column_comes_from_and_leads(ask):
    told = words(card(ask(), "mentor"), r'<p class="told">(.*?)</p>')
    assert told.startswith("comes from ") and "shift work" in told and "leads to turned up" in told


def test_a_blocked_answer_is_withheld_everywhere(ask):
    query = f"pin=age.60-and-over&{MENTOR}"
    page = ask(query)
    assert sentence(page).startswith("These records cannot say what setting mentor to yes would do to passed.")
    assert "Blocks the answer" in page and "1 caution blocks it" in page
    assert "its effect is withheld" in card(page, "mentor") and "if set: withheld" in card(page, "passed")
    assert "#D55E00" not in re.search(r'<svg class="beam".*?</svg>\s*<p', page, re.DOTALL)[0]
    for bar in re.findall(r'<svg class="bar".*?</svg>', page):
        assert "#D55E00" not in bar
    assert not re.search(r'class="n n2">\d', page) and 'class="had"' not in page
    printed = ask(query, page="answer")
    assert "withheld" in printed and "Change" not in words(printed, r'<table class="plain nums">(.*?)</table>')


def test_small_counts_are_not_shown(ask, store, study):
    frame = store.table(study.key).frame
    few = int((frame["age"] == "60 and over").sum())
    assert 10 <= few < 30  # the world of this test
    page = ask("pin=age.60-and-over&pin=shift-work.mixed")
    assert int(((frame["age"] == "60 and over") & (frame["shift work"] == "mixed")).sum()) < 10
    assert "so nothing is counted" in page
    assert "under 10 records" in ask("pin=age.60-and-over&pin=shift-work.mixed", page="answer")


def test_a_group_that_leaves_few_out_does_not_give_their_count_away(client, store):
    frame = evening()[["shift work", "passed"]]
    frame.loc[:6, "shift work"] = "other"
    plan = Plan((("Before", ("shift work",)), ("After", ("passed",))), outcomes={"passed": ("yes",)})
    few = keep_a_model(store, store.bring("Few", frame, "few.csv", Choices(), plan))
    query = "pin=shift-work.days.mixed.nights"
    for page, hidden in (("ask", "All but under 10 records have this value"), ("answer", "all but under 10 records")):
        text = client.get(f"/study/{few.key}/{page}?{query}").text
        assert hidden in text
        assert "593" not in re.sub(r"<svg.*?</svg>", "", text, flags=re.DOTALL)


def test_pins_that_together_give_a_small_count_away_are_not_counted(client, store):
    towns = ["A"] * 196 + ["B"] * 197 + ["C"] * 7
    frame = evening(400)[["passed"]].assign(town=towns)
    plan = Plan((("Before", ("town",)), ("After", ("passed",))), outcomes={"passed": ("yes",)})
    study = keep_a_model(store, store.bring("Towns", frame, "towns.csv", Choices(), plan))
    get = {}
    for page, pins in itertools.product(("ask", "answer"), ("a", "b", "a.c", "b.c")):
        text = client.get(f"/study/{study.key}/{page}?pin=town.{pins}").text
        get[page, pins] = re.sub(r"<svg.*?</svg>", "", text, flags=re.DOTALL)
    assert "at B · 197 of 400 records" in get["ask", "b"] and "among these, 197 records" in get["answer", "b"]
    assert "at A or C · 203 of 400 records" in get["ask", "a.c"]
    for pins, count in (("a", "196"), ("b.c", "204")):
        assert "number not shown" in get["ask", pins] and "it would give a count under 10 away" in get["ask", pins]
        assert "among these, number not shown" in get["answer", pins]
        assert "Counted in the records" not in get["answer", pins]
        for page in ("ask", "answer"):
            assert not re.search(rf"\b{count}\b", get[page, pins])


def test_a_lever_from_which_nothing_leads_there_is_said_not_to_move_it(ask):
    page = ask(f"{MENTOR}&watch=tutor")
    assert sentence(page).startswith(
        "Setting mentor to yes would not move tutor: nothing in this model leads from one to the other. (tutor = tutor "
    )
    beam = re.search(r'<svg class="beam".*?</svg>\s*<p', page, re.DOTALL)[0]
    assert "if set" in beam and "#D55E00" in beam
    page = ask(f"{MENTOR}&reach=mentor.0")
    assert sentence(page).startswith(
        "Setting mentor to yes would not move passed: for 0% of all records nothing changes. (passed stays at "
    )


def test_an_answer_that_the_model_mostly_fills_in_says_so(client, store):
    rows = 300
    frame = evening(rows)[["shift work", "passed"]].assign(mentor=["yes"] * 8 + ["no"] * (rows - 8))
    plan = Plan(
        (("Before", ("shift work",)), ("Offered", ("mentor",)), ("After", ("passed",))),
        (("shift work", "mentor"), ("mentor", "passed")),
        (),
        ("mentor",),
        {"passed": ("yes",)},
    )
    study = keep_a_model(store, store.bring("Thin", frame, "thin.csv", Choices(), plan))
    page = client.get(f"/study/{study.key}/ask?{MENTOR}").text
    assert sentence(page).startswith("By this estimate, most of it filled in by the model, setting mentor to yes ")
    assert "as far as" not in sentence(client.get(f"/study/{study.key}/ask?set=mentor.no").text)


def test_a_pin_after_the_lever_is_refused_with_a_way_out_for_each(ask, client):
    page = ask(f"pin=turned-up.most&{MENTOR}", status=422)
    assert sentence(page) == "“turned up” follows “mentor”, which you set, so pinning it would mix two worlds."
    acts = re.search(r'<p class="acts">(.*?)</p>', page, re.DOTALL)[1]
    assert [words(act, ">(.*)") for act in acts.split("</a>")[:-1]] == [
        "Take out turned up = most",
        "Do not set mentor",
    ]
    for address in re.findall(r'href="([^"]*)"', acts):
        assert client.get(html.unescape(address)).status_code == 200
    assert 'aria-label="Pinned at most, take out"' in page


@pytest.mark.parametrize("query", ["pin=nothing.here", "set=mentor.perhaps", "pin=", "what=ever", "reach.mentor=80"])
@pytest.mark.parametrize("place", ["ask", "answer"])
def test_a_nonsense_address_is_told_in_a_sentence_with_a_way_on(ask, client, query, place):
    page = ask(f"{NIGHTS}&{query}", status=422, page=place)
    assert words(page, "<h1[^>]*>(.*?)</h1>").endswith(".")
    onward = html.unescape(re.search(r'class="btn main" href="([^"]*)"', page)[1])
    assert NIGHTS in onward and client.get(onward).status_code == 200


def test_a_lever_on_what_nobody_can_change_is_refused(ask):
    page = ask("set=tutor.tutor-a", status=422)
    assert "not marked as changeable" in sentence(page) and "Do not set tutor" in page


def test_an_unknown_study_is_not_found(client):
    for place in ("ask", "answer", "answer.css"):
        assert client.get(f"/study/nowhere/{place}").status_code == 404


def test_an_answered_question_is_noted_once_with_its_sentence(ask, store, study):
    before = store.study(study.key).asked
    page = ask(f"{MENTOR}&open=tutor")
    ask(f"{MENTOR}&open=age")
    ask()
    ask(f"pin=turned-up.most&{MENTOR}", status=422)
    noted = store.study(study.key)
    assert noted.asked == before + 1
    assert noted.last.query == MENTOR and noted.last.sentence == sentence(page)


def test_the_same_question_has_the_same_answer_twice(ask):
    without = re.compile(r"in (under )?\d+ ms")
    assert without.sub("", ask(f"{NIGHTS}&{MENTOR}")) == without.sub("", ask(f"{NIGHTS}&{MENTOR}"))


def test_no_page_has_a_style_or_script_of_its_own(ask):
    for page in (ask(), ask(f"{NIGHTS}&{MENTOR}&show=all"), ask(NIGHTS, page="answer")):
        assert not re.search(r"\sstyle=|<style|<script(?! src=)|\son\w+=|javascript:", page)


def test_the_printed_answer_holds_what_it_rests_on(ask, study):
    page = ask(f"{NIGHTS}&{MENTOR}&open=tutor", page="answer")
    assert sentence(page) == sentence(ask(f"{NIGHTS}&{MENTOR}"))
    numbers = words(page, r'<table class="plain nums">(.*?)</table>')
    for row in (
        "as recorded, 600 records",
        "among these, ",
        "if set",
        "Change if set, points",
        "Counted in the records",
    ):
        assert row in numbers
    for heading in ("The order this rests on", "The links this answer runs through", "The data", "To ask it again"):
        assert heading in page
    assert "Insisted on: age leads to mentor" in page
    assert f"ask?{NIGHTS}&amp;{MENTOR}</b>" in page
    assert study.digest[:4] in page and "seed 0" in page
    links = words(page, r'<table class="plain lk">(.*?)</table>')
    assert "mentor leads to turned up" in links and "your order" in links


def test_the_foot_of_the_printed_page_cannot_be_broken_by_a_name(client, store):
    name = 'x"; } body { display: none } /*'
    key = store.bring(name, evening(60), "evening.csv", Choices(), PLAN).key
    foot = client.get(f"/study/{key}/answer.css")
    assert foot.headers["content-type"].startswith("text/css")
    content = re.search(r'content: "([^"]*)"', foot.text)[1]
    assert re.fullmatch(r"(?:[A-Za-z0-9]|\\[0-9a-f]{6})*", content)
    said = re.sub(r"\\([0-9a-f]{6})", lambda found: chr(int(found[1], 16)), content)
    assert said.startswith(" ".join(name.split()))


def test_without_a_model_the_page_says_what_comes_first(client, store):
    unordered = store.bring("Unordered", evening(60), "evening.csv")
    page = client.get(f"/study/{unordered.key}/ask").text
    assert "has no model yet" in page and f"/study/{unordered.key}/order" in page
    ordered = store.bring("Ordered", evening(60), "evening.csv", Choices(), PLAN)
    page = client.get(f"/study/{ordered.key}/ask").text
    assert "has no model yet" in page and f'href="/study/{ordered.key}/model">Go to Model' in page
    assert client.get(f"/study/{ordered.key}/answer").status_code == 409


@pytest.mark.parametrize(
    ("job", "says"),
    [
        (JobState("running", 0.4, "Counting families", (), datetime.now(UTC)), "is being learned"),
        (
            JobState("failed", 0.4, "Counting", (), datetime.now(UTC), "Learning ran out.", None, "Try again."),
            "ran out",
        ),
    ],
)
def test_while_learning_the_page_says_how_far_it_is_or_why_it_stopped(client, store, monkeypatch, job, says):
    study = store.bring("Waiting", evening(60), "evening.csv", Choices(), PLAN)
    monkeypatch.setattr(client.app.state.jobs, "state", lambda key: job)
    page = client.get(f"/study/{study.key}/ask?{NIGHTS}&{MENTOR}").text
    assert says in words(page, "<h1[^>]*>(.*?)</h1>")
    if job.state == "running":
        assert "40 of 100 done: Counting families" in page and "/learn/cancel" in page
        assert f'hx-get="/study/{study.key}/ask?{NIGHTS}&amp;{MENTOR}"' in page
        assert '<noscript><meta http-equiv="refresh"' in page
    else:
        assert "Try again." in page and f'href="/study/{study.key}/model"' in page


def test_an_old_model_still_answers_and_says_that_it_is_old(client, store):
    study = keep_a_model(store, store.bring("Older", evening(200), "evening.csv", Choices(), PLAN))
    store.save_plan(study.key, Plan(PLAN.stages, PLAN.insist, (("tutor", "passed"),), PLAN.changeable, PLAN.outcomes))
    page = client.get(f"/study/{study.key}/ask?{MENTOR}").text
    assert "have changed since this model was learned" in page
    assert sentence(page).startswith("By this estimate, setting mentor to yes ")


def test_hostile_names_are_text_everywhere(client, store):
    frame = evening(300).rename(columns={"mentor": SCRIPT, "shift work": QUOTES})
    frame[SCRIPT] = frame[SCRIPT].replace({"yes": QUOTES, "no": "<b>no"})
    swap = {"mentor": SCRIPT, "shift work": QUOTES}
    stages = tuple((stage, tuple(swap.get(name, name) for name in columns)) for stage, columns in PLAN.stages)
    insist = tuple((swap.get(source, source), swap.get(target, target)) for source, target in PLAN.insist)
    plan = Plan(stages, insist, (), (SCRIPT,), {"passed": ("yes",)})
    study = keep_a_model(store, store.bring(SCRIPT, frame, "hostile.csv", Choices(), plan))
    page = client.get(f"/study/{study.key}/ask?show=all").text
    acts = re.findall(r'<a[^>]* id="((?:set|pin)-[^"]*)"', page)
    for address in [link(page, act) for act in acts]:
        answer = client.get(address)
        assert answer.status_code == 200
        for text in (answer.text, client.get(address.replace("/ask?", "/answer?")).text):
            assert "<script>" not in text and "<u>" not in text and "<b>no" not in text
    page = client.get(next(link(page, act) for act in acts if act.startswith("set-"))).text
    assert f"setting {SCRIPT} to " in sentence(page)
