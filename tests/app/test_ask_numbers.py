"""Ask and the printed answer about numbers: pinned by band or in a range, set, shifted, answered by their means."""

from __future__ import annotations

import html
import re
from collections.abc import Iterator
from pathlib import Path
from urllib.parse import parse_qsl, urlsplit

import pytest
from fastapi import FastAPI
from fastapi.testclient import TestClient

from app.store import Choices, Plan, Store, Study
from tests.app.evening import keep_a_model
from tests.app.mixed_evening import MIXED_PLAN, mixed_evening
from tests.app.test_ask import BASE, SCRIPT, card, link, sentence, words

SIGNED = r"[+−][\d.,]+"
HIGHER = "shift=mentor-hours.by.2"


@pytest.fixture(scope="module")
def client(tmp_path_factory: pytest.TempPathFactory) -> Iterator[TestClient]:
    from app.main import create_app
    from app.settings import Settings

    data: Path = tmp_path_factory.mktemp("numbers")
    with TestClient(create_app(Settings(data=data)), base_url=BASE) as client:
        yield client


@pytest.fixture(scope="module")
def store(client: TestClient) -> Store:
    assert isinstance(client.app, FastAPI)
    found: Store = client.app.state.store
    return found


@pytest.fixture(scope="module")
def study(store: Store) -> Study:
    return keep_a_model(store, store.bring("Mixed", mixed_evening(), "mixed.csv", Choices(), MIXED_PLAN))


@pytest.fixture
def ask(client: TestClient, study: Study):
    def get(query="", status=200, page="ask"):
        answer = client.get(f"/study/{study.key}/{page}?{query}")
        assert answer.status_code == status, answer.text
        return answer.text

    return get


def form(page, element):
    """The action and fields of a form: hidden and typed."""
    found = re.search(rf'<form[^>]* id="{element}".*?</form>', page, re.DOTALL)
    assert found, element
    return dict(
        (html.unescape(name), html.unescape(value))
        for name, value in re.findall(r'<input[^>]*name="([^"]*)" value="([^"]*)"', found[0])
    )


def send(client, study, fields):
    """Where a form leads, and the page that is there."""
    answer = client.get(f"/study/{study.key}/ask", params=fields, follow_redirects=False)
    assert answer.status_code == 303
    there = answer.headers["location"]
    return urlsplit(there).query, client.get(there).text


def test_a_number_is_answered_by_its_mean(ask, store, study):
    page = ask()
    assert re.fullmatch(r"Across all 500 records mark is [\d.]+ on average\. \(.*[\d.]+ to [\d.]+\)", sentence(page))
    mean = float(re.search(r"is ([\d.]+) on average", sentence(page))[1])
    assert mean == pytest.approx(store.table(study.key).frame["mark"].mean(), abs=0.1)
    assert re.fullmatch(
        r"Counted in the records: mean [\d.]+ over 500 records\.", words(page, r'<p class="counted">(.*?)</p>')
    )
    assert words(page, r'<span class="what">(.*?)</span>') == "mark, on average"


def test_a_lever_moves_a_mean(ask):
    page = ask("set=mentor.yes")
    assert re.match(
        rf"By this estimate, setting mentor to yes would move mark from [\d.]+ to [\d.]+ on average \({SIGNED}, ",
        sentence(page),
    )
    assert re.match(
        r"Those with mentor = yes anyway: [\d.]+ on average\. That is not", words(page, r'<p class="had">(.*?)</p>')
    )


def test_a_band_is_pinned_by_its_ring_and_has_neither_bar_nor_diamond(ask, client):
    shown = card(ask("open=mentor-hours"), "mentor-hours")
    assert len(re.findall('class="val nobar"', shown)) == 4 and 'class="bar"' not in shown
    assert "Set to" not in re.sub(r"<form.*?</form>", "", shown, flags=re.DOTALL)
    first = re.search(r'id="(pin-mentor-hours-[^"]+)"', shown)[1]
    page = client.get(link(ask("open=mentor-hours"), first)).text
    assert re.match(r"Among records with mentor hours under [\d.]+, mark is [\d.]+ on average, against", sentence(page))
    assert "take out" in card(page, "mentor-hours")


def test_a_range_is_pinned_by_its_form(ask, client, study):
    fields = form(ask("open=travel-time&set=mentor.yes"), "form-range-travel-time")
    query, page = send(client, study, {**fields, "from.travel-time": "25,5", "under.travel-time": "40"})
    assert query == "pin=travel-time.from.25.5.under.40&set=mentor.yes&open=travel-time"
    assert "among records with travel time 25.5 to under 40, setting mentor to yes" in sentence(page)
    shown = card(page, "travel-time")
    assert "at 25.5 to under 40 · " in shown
    assert form(page, "form-range-travel-time") == {
        "set": "mentor.yes",
        "open": "travel-time",
        "from.travel-time": "25.5",
        "under.travel-time": "40",
    }
    assert link(page, "unpin-travel-time") == f"/study/{study.key}/ask?set=mentor.yes&open=travel-time"


def test_a_number_is_set_by_its_form(ask, client, study):
    start = ask("open=mentor-hours")
    fields = form(start, "form-set-mentor-hours")
    assert 5 <= float(fields["set.mentor-hours"]) <= 9 and fields["reach.mentor-hours"] == "100"
    query, page = send(client, study, {**fields, "set.mentor-hours": "10.5", "reach.mentor-hours": "80"})
    assert query == "set=mentor-hours.to.10.5&reach=mentor-hours.80&open=mentor-hours"
    assert "setting mentor hours to 10.5 for 80% of all records would move mark from" in sentence(page)
    shown = card(page, "mentor-hours")
    assert "to 10.5 for 80% of them" in shown and "is-set" in shown
    assert form(page, "form-set-mentor-hours")["set.mentor-hours"] == "10.5"
    assert link(page, "unset-mentor-hours") == f"/study/{study.key}/ask?open=mentor-hours"


def test_a_number_is_shifted_by_its_form(ask, client, study):
    fields = form(ask("pin=shift-work.nights&open=mentor-hours"), "form-shift-mentor-hours")
    query, page = send(client, study, {**fields, "shift.mentor-hours": "−2", "reach.mentor-hours": "100"})
    assert query == "pin=shift-work.nights&shift=mentor-hours.by.-2&open=mentor-hours"
    assert "among records with shift work = nights, lowering mentor hours by 2 would move mark" in sentence(page)
    assert "2 lower for all of them" in card(page, "mentor-hours")
    assert 'class="had"' not in page


def test_a_shift_moves_the_mark_by_the_slope(ask):
    found = re.search(rf"on average \(({SIGNED}), ", sentence(ask(HIGHER)))
    assert float(found[1].replace("−", "-")) == pytest.approx(4.0, abs=0.4)  # two hours at 2 a mark each


def test_a_set_number_is_drawn_as_a_spike_and_a_shift_as_a_curve(ask):
    spike = re.search(
        r'<svg class="strip".*?</svg>(?=<div)', card(ask("set=mentor-hours.to.9"), "mentor-hours"), re.DOTALL
    )
    assert re.search(r'<line x1="([\d.]+%)" x2="\1" y1="44" y2="4.0" stroke="#D55E00"', spike[0])
    assert 'stroke-dasharray="6 2.5" vector-effect' not in spike[0]
    curve = card(ask(HIGHER), "mentor-hours")
    assert 'stroke="#D55E00" stroke-width="2.25" stroke-dasharray="6 2.5" vector-effect' in curve


def test_the_beam_of_a_number_runs_over_what_is_usual(ask):
    beam = re.search(r'<svg class="beam".*?</svg>\s*<p', ask(HIGHER), re.DOTALL)[0]
    figures = [
        float(each.replace(",", "").replace("−", "-"))
        for each in re.findall(r'y="\d+" text-anchor="\w+">([^<]+)<', beam)
    ]
    frame = mixed_evening()["mark"]
    assert figures[0] <= frame.quantile(0.01) and frame.quantile(0.99) <= figures[-1] and "%</text>" not in beam
    assert figures[-1] - figures[0] < 1.6 * (frame.quantile(0.99) - frame.quantile(0.01))


def test_a_folded_number_tells_its_mean_and_how_it_moves(ask):
    page = ask("set=mentor.yes&fold=mentor-hours")
    folded = re.search(r'<li class="fold"><a id="card-mentor-hours".*?</li>', page, re.DOTALL)[0]
    assert re.search(r"</svg>1[01]\.\d+</b>", folded) and "%" not in folded
    still = re.search(r'<li class="fold"><a id="card-travel-time".*?</li>', page, re.DOTALL)[0]
    assert re.search(r'class="v">(29|30)\.\d+</span>', still)


def test_means_stand_under_the_bands_in_the_order_of_the_worlds(ask):
    shown = card(ask(f"pin=shift-work.nights&{HIGHER}&open=mark"), "mark")
    told = words(shown, r'<p class="mean">(.*?)</p>')
    assert re.fullmatch(r"mean ?as recorded [\d.]+ ?among these [\d.]+ ?if set [\d.]+", told)


def test_a_value_beyond_every_record_is_said_and_nobody_had_it(ask):
    page = ask("set=mentor-hours.to.400")
    assert "beyond every record" in card(page, "mentor-hours")
    assert 'class="had"' not in page
    assert "anyway" not in words(
        ask("set=mentor-hours.to.400", page="answer"), r'<table class="plain nums">(.*?)</table>'
    )


def test_moved_finds_numbers_that_moved(ask):
    page = ask(f"{HIGHER}&show=moved")
    assert 'id="card-travel-time"' not in page and 'id="column-mark"' in page


def test_a_small_group_is_not_counted(ask):
    page = ask("pin=travel-time.at.-40")
    assert "No record has this value, so nothing is counted" in page
    assert "Counted in the records" not in ask("pin=travel-time.at.-40", page="answer")


@pytest.mark.parametrize(
    "query",
    [
        "set.mentor-hours=lots&reach.mentor-hours=80",
        "from.travel-time=40&under.travel-time=20",
        "set=mentor-hours.under-5",
        "shift=mentor.by.2",
    ],
)
def test_nonsense_is_told_in_a_sentence_with_a_way_on(ask, client, query):
    page = ask(f"pin=shift-work.nights&{query}", status=422)
    assert words(page, "<h1[^>]*>(.*?)</h1>").endswith(".")
    onward = html.unescape(re.search(r'class="btn main" href="([^"]*)"', page)[1])
    assert "pin=shift-work.nights" in onward and client.get(onward).status_code == 200


def test_a_number_pinned_after_the_lever_is_refused_with_a_way_out(ask, client):
    page = ask("pin=mark.from.50&set=mentor.yes", status=422)
    assert "Take out mark 50 and over" in page
    for address in re.findall(r'href="([^"]*)"', re.search(r'<p class="acts">(.*?)</p>', page, re.DOTALL)[1]):
        assert client.get(html.unescape(address)).status_code == 200


def test_the_printed_answer_tells_means(ask):
    page = ask(f"pin=shift-work.nights&{HIGHER}", page="answer")
    assert sentence(page) == sentence(ask(f"pin=shift-work.nights&{HIGHER}"))
    numbers = words(page, r'<table class="plain nums">(.*?)</table>')
    for row in ("mark, on average", "Mean", "as recorded, 500 records", "if set", "Change if set +"):
        assert row in numbers
    assert "%" not in numbers.replace("90% interval", "") and "points" not in numbers
    links = words(page, r'<table class="plain lk">(.*?)</table>')
    assert re.search(r"mentor hours leads to mark [\d.]+( on average)? your order", links)


def test_the_first_example_lever_of_a_study_of_numbers_can_be_asked(client, store):
    frame = mixed_evening()[["mentor hours", "mark"]]
    plan = Plan(
        (("During", ("mentor hours",)), ("After", ("mark",))),
        (),
        (),
        ("mentor hours",),
        {"mark": MIXED_PLAN.outcomes["mark"]},
    )
    bare = keep_a_model(store, store.bring("Bare", frame, "bare.csv", Choices(), plan))
    page = client.get(f"/study/{bare.key}/ask").text
    examples = re.search(r"Try one:(.*?)</p>", page, re.DOTALL)[1]
    addresses = [html.unescape(address) for address in re.findall(r'href="([^"]*)"', examples)]
    assert any("shift=mentor-hours.by." in address for address in addresses)
    assert all(client.get(address).status_code == 200 for address in addresses)


def test_hostile_names_of_numbers_stay_text(client, store):
    frame = mixed_evening().rename(columns={"mentor hours": SCRIPT, "mark": 'm" onfocus="x'})
    plan = Plan(
        (
            ("Before", ("shift work", "travel time")),
            ("During", ("mentor", SCRIPT)),
            ("After", ('m" onfocus="x', "passed")),
        ),
        changeable=(SCRIPT,),
        outcomes={'m" onfocus="x': MIXED_PLAN.outcomes["mark"]},
    )
    hostile = keep_a_model(store, store.bring("Hostile", frame, "h.csv", Choices(), plan))
    first = client.get(f"/study/{hostile.key}/ask?show=all").text
    fields = form(first, "form-set-script-alert-1-script")
    query, page = send(client, hostile, {**fields, "set.script-alert-1-script": "7"})
    printed = client.get(f"/study/{hostile.key}/answer?{query}").text
    for text in (first, page, printed):
        assert "<script>alert" not in text and 'm" onfocus' not in text
        assert not re.search(r"\sstyle=|<style|<script(?! src=)|\son\w+=\"|javascript:", text)
    assert f"setting {SCRIPT} to 7" in sentence(page)
    assert dict(parse_qsl(query))["set"] == "script-alert-1-script.to.7"


@pytest.fixture
def with_units(store: Store, study: Study) -> Iterator[None]:
    """The study's numbers in units, one of them hostile, without learning again."""
    units = {"mark": "<b>&\"'", "mentor hours": "hours a week", "travel time": "minutes"}
    store.save_choices(study.key, Choices(units=units))
    assert store.study(study.key).model == "current"
    yield
    store.save_choices(study.key, Choices())


@pytest.mark.usefixtures("with_units")
@pytest.mark.parametrize("page", ["ask", "answer"])
def test_units_stand_in_the_sentences_and_on_the_axis(ask, page):
    shown = html.unescape(ask(f"{HIGHER}&watch=mentor-hours", page=page))
    plain = re.sub(r"<[^>]+>", "", shown)
    assert re.search(
        r"raising mentor hours by 2 hours a week would move mentor hours from [\d.]+ to [\d.]+ hours", plain
    )
    assert re.search(r">[\d.]+ hours a week</text>", shown)
    assert "Counted in the records" not in plain or re.search(r"mean [\d.]+ hours a week", plain) or page == "answer"


@pytest.mark.usefixtures("with_units")
@pytest.mark.parametrize("page", ["ask", "answer"])
def test_a_hostile_unit_is_text_everywhere(ask, page):
    shown = ask("pin=shift-work.nights&watch=mark", page=page)
    assert "<b>&" not in shown and "&lt;b&gt;&amp;&#34;&#39; on average" in shown


@pytest.mark.usefixtures("with_units")
def test_the_fields_of_a_number_tell_its_unit(ask):
    shown = ask("pin=travel-time.from.20.under.30&watch=mentor-hours&open=travel-time")
    for element in ("form-set-mentor-hours", "form-shift-mentor-hours"):
        assert re.search(rf'id="{element}".*? hours a week</span>.*?</form>', shown, re.DOTALL), element
    assert "mean, hours a week" in shown and 'pinned</span> <span class="quiet">at 20 to under 30 minutes' in shown
