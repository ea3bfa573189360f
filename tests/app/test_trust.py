"""Trust: judged in a process of its own, kept with the study, told in words that give no small count away."""

from __future__ import annotations

import html
import re
import time
from dataclasses import replace

import numpy as np
import pytest

import engine
from app.judging import JudgingJobs
from app.pages import trust_view
from app.store import NoModelYet, Plan
from app.store.judgements import Judgements, Kept
from app.wording import trust as wording
from app.wording.parts import plain
from engine.judging.archive import as_text
from engine.judging.missed import Dependences, Missed
from engine.judging.thin import Thin
from engine.refusal import Refusal
from tests.app import slow_work
from tests.app.evening import PLAN, evening, keep_a_model

PATIENCE = 90.0
HOSTILE = '<script>alert("x")</script> & co'


@pytest.fixture(scope="module")
def judgement():
    table = engine.Table.from_frame(evening())
    return engine.judge(engine.learn(table, PLAN.order()), table)


def ended(jobs, key):
    deadline = time.monotonic() + PATIENCE
    while (state := jobs.state(key)).state == "running":
        assert time.monotonic() < deadline, state
        time.sleep(0.05)
    return state


def brought(client, plan=PLAN, frame=None):
    store = client.app.state.store
    return keep_a_model(store, store.bring("Evening", evening() if frame is None else frame, "e.csv", plan=plan))


def keep(store, study, judgement):
    judgements = Judgements(store.database)
    judgements.keep(study.key, judgements.learned_file(study.key), as_text(judgement))


def text_of(page):
    return html.unescape(re.sub(r"\s+", " ", re.sub(r"<[^>]+>", " ", page.text)))


def test_a_study_is_judged_in_a_process_of_its_own_and_the_page_tells_what_was_found(client, judgement):
    study = brought(client)
    home = f"/study/{study.key}"
    before = client.get(f"{home}/trust")
    assert "Not judged yet." in before.text and f'action="{home}/judge"' in before.text
    assert client.post(f"{home}/judge", follow_redirects=False).headers["location"] == f"{home}/trust"
    assert ended(client.app.state.judging, study.key).state == "done"
    kept = Judgements(client.app.state.store.database).of(client.app.state.store.study(study.key))
    assert kept.current and as_text(kept.judgement) == as_text(judgement)
    said = text_of(client.get(f"{home}/trust"))
    assert f"Does it describe these records well enough? {wording.VERDICTS[judgement.verdict]}" in said
    assert "It cannot say whether the order is right" in said
    assert said.count(" met ") >= 4 and "Brier score" in said


def test_a_page_while_judging_tells_how_far_it_is_and_can_be_cancelled(client, monkeypatch, judgement):
    study = brought(client)
    jobs = client.app.state.judging
    monkeypatch.setattr(jobs, "_work", slow_work.waits_judging)
    client.post(f"/study/{study.key}/judge")
    deadline = time.monotonic() + PATIENCE
    while jobs.state(study.key).fraction < 0.5:
        assert time.monotonic() < deadline
        time.sleep(0.05)
    page = client.get(f"/study/{study.key}/trust")
    assert "Judging the model: searching." in page.text and "50 of 100 done" in page.text
    assert '<noscript><meta http-equiv="refresh" content="2"></noscript>' in page.text
    assert "Judging the model" in client.get(f"/study/{study.key}/judge").text
    client.post(f"/study/{study.key}/judge/cancel")
    assert jobs.state(study.key).state == "cancelled"
    assert "Judging was cancelled." in client.get(f"/study/{study.key}/trust").text
    keep(client.app.state.store, study, judgement)
    assert "Judging was cancelled." in client.get(f"/study/{study.key}/trust").text
    client.post(f"/study/{study.key}/judge/forget")
    assert "Judging was cancelled." not in client.get(f"/study/{study.key}/trust").text


def test_another_model_makes_what_was_found_old(client, judgement):
    study = brought(client)
    store = client.app.state.store
    keep(store, study, judgement)
    assert Judgements(store.database).of(store.study(study.key)).current
    store.accept(study.key, judgement.links - 1)
    assert not Judgements(store.database).of(store.study(study.key)).current
    page = client.get(f"/study/{study.key}/trust")
    assert "found of another model than the one in use now" in page.text and "Judge this model" in page.text
    store.accept(study.key, judgement.links)
    assert Judgements(store.database).of(store.study(study.key)).current
    keep_a_model(store, store.study(study.key))
    assert not Judgements(store.database).of(store.study(study.key)).current


def test_a_model_of_another_order_is_not_judged(client, judgement):
    study = brought(client)
    store = client.app.state.store
    keep(store, study, judgement)
    store.save_plan(study.key, replace(study.plan, insist=()))
    refused = client.post(f"/study/{study.key}/judge")
    assert refused.status_code == 422 and "changed since the model was learned" in refused.text
    assert "Learn it again on Model" in client.get(f"/study/{study.key}/trust").text


def test_without_a_model_the_page_leads_to_the_model_page(client):
    study = client.app.state.store.bring("Evening", evening(), "e.csv", plan=PLAN)
    page = client.get(f"/study/{study.key}/trust")
    assert "There is no model yet." in page.text and f'href="/study/{study.key}/model"' in page.text
    with pytest.raises(NoModelYet):
        client.app.state.judging.start(study.key)


def test_a_judgement_of_a_model_that_was_replaced_meanwhile_is_not_kept(client, judgement):
    study = brought(client)
    with pytest.raises(Refusal, match="learned again meanwhile"):
        Judgements(client.app.state.store.database).keep(study.key, "other.learned", as_text(judgement))


def test_what_cannot_be_read_is_as_if_it_had_not_been_judged(client):
    study = brought(client)
    judgements = Judgements(client.app.state.store.database)
    judgements.keep(study.key, judgements.learned_file(study.key), '{"format": "something else"}')
    assert judgements.of(study) is None and client.get(f"/study/{study.key}/trust").status_code == 200


def test_an_end_from_outside_is_told_as_judgings_own(client, monkeypatch):
    study = brought(client)
    monkeypatch.setattr(client.app.state.judging, "_work", slow_work.breaks_judging)
    client.post(f"/study/{study.key}/judge")
    assert ended(client.app.state.judging, study.key).message.startswith("Judging met an error of the program")
    assert isinstance(client.app.state.judging, JudgingJobs)


def test_hostile_names_are_text_everywhere(client):
    frame = evening(400).rename(columns={"mentor": HOSTILE, "passed": f"passed {HOSTILE}"})
    frame[HOSTILE] = frame[HOSTILE].replace("yes", f"yes {HOSTILE}")
    plan = Plan(
        stages=(
            (f"Before {HOSTILE}", ("age", "shift work", "tutor", HOSTILE, "turned up")),
            ("After", (f"passed {HOSTILE}",)),
        ),
        rule_out=((HOSTILE, f"passed {HOSTILE}"), ("turned up", f"passed {HOSTILE}")),
        changeable=(HOSTILE,),
        outcomes={f"passed {HOSTILE}": ("yes",)},
    )
    study = brought(client, plan, frame)
    store = client.app.state.store
    keep(store, study, engine.judge(store.learned(study.key), store.table(study.key)))
    page = client.get(f"/study/{study.key}/trust", params={"column": HOSTILE})
    assert page.status_code == 200 and "<script>alert" not in page.text
    assert "&lt;script&gt;alert" in page.text and "style=" not in page.text
    assert " not met " in text_of(page)


def test_the_reliability_of_each_outcome_and_number_can_be_picked(client):
    frame = evening()
    frame["mark"] = np.random.default_rng(0).normal(50.0, 9.0, len(frame)) + 5.0 * (frame["passed"] == "yes")
    stages = (*PLAN.stages, ("Later", ("mark",)))
    study = brought(client, replace(PLAN, stages=stages), frame)
    store = client.app.state.store
    keep(store, study, engine.judge(store.learned(study.key), store.table(study.key)))
    assert "Where it said that about" in text_of(client.get(f"/study/{study.key}/trust"))
    picked = client.get(f"/study/{study.key}/trust", params={"column": "mark"})
    assert "Of the values of mark" in text_of(picked) and "<option selected>mark</option>" in picked.text


def missing(**changes):
    found = Missed(
        ("mentor", "passed", "shift"),
        (("mentor", "yes"), ("shift", "nights")),
        ("yes",),
        0.74,
        0.66,
        50,
        9.0,
        1,
        0.001,
        True,
    )
    return replace(found, **changes)


def test_what_is_missed_is_told_with_what_to_do():
    said, do = wording.missed(missing())
    assert plain(said) == "of those with mentor = yes and shift = nights had passed = yes; the model says 66%."
    assert do.startswith("What mentor does differs by shift")
    assert "leave it" in wording.missed(missing(counts=False))[1]


def test_what_only_few_show_is_told_without_a_figure():
    hidden = missing(when=(), levels=(), seen=np.nan, said=np.nan, records=0)
    assert wording.missed_figure(hidden) == ""
    assert "only groups of under 10 records show it" in plain(wording.missed(hidden)[0])


@pytest.mark.parametrize(("records", "figure"), [(0, "no"), (1, "under 10"), (9, "under 10"), (10, "10"), (38, "38")])
def test_counts_under_the_limit_are_not_told(records, figure):
    assert wording.thin(Thin((("mentor", "yes"), ("home", "quay")), records))[0] == figure


def test_without_an_outcome_the_page_says_so(judgement):
    nothing = replace(judgement, verdict=None, tests=(), reliability=(), dependences=Dependences(3, 0, ()))
    view = trust_view.view(Kept(nothing, True), None)
    assert view.verdict == "No outcome is marked." and view.told is None and view.rule == ()


def test_every_verdict_and_every_test_not_met_has_words(judgement):
    for verdict in ("yes", "in part", "no"):
        unmet = tuple(replace(test, met=False, held=0 if test.code != "missed" else 2) for test in judgement.tests)
        view = trust_view.view(Kept(replace(judgement, verdict=verdict, tests=unmet), True), "passed")
        assert view.verdict in ("Yes.", "In part.", "No.") and all(line.do for line in view.rule)
        assert view.deck.startswith("None of the four tests is met.")
