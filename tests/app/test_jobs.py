"""Learning in a process of its own: progress, a cancel that cancels, ends that are said."""

import os
import signal
import time
from dataclasses import replace

import numpy as np
import pandas as pd
import pytest

import engine
from app.jobs import Jobs
from app.store import NoSuchStudy, Plan, Store
from engine.refusal import Refusal
from tests.app import slow_work

PATIENCE = 60.0  # seconds that a loaded machine may need to start a process


@pytest.fixture
def study(store, visits, visits_plan):
    return store.bring("Visits", visits, "visits.csv", plan=visits_plan)


@pytest.fixture
def working(store):
    """Jobs whose processes run one of the workers in slow_work."""
    made = []

    def make(work, over=store):
        jobs = Jobs(over, work)
        made.append(jobs)
        return jobs

    yield make
    for jobs in made:
        jobs.close()


def until(jobs, key, condition):
    deadline = time.monotonic() + PATIENCE
    while not condition(jobs.state(key)):
        assert time.monotonic() < deadline, jobs.state(key)
        time.sleep(0.02)
    return jobs.state(key)


def ended(jobs, key):
    return until(jobs, key, lambda state: state.state != "running")


def searching(jobs, key):
    return until(jobs, key, lambda state: state.words == "Searching")


def worker(jobs, key):
    return jobs._jobs[key].process.pid


def alive(pid):
    try:
        os.kill(pid, 0)
    except ProcessLookupError:
        return False
    return True


def leftovers(store, study):
    return [path.name for path in store.files(study.key).iterdir() if path.name.endswith(".unfinished")]


def test_learning_keeps_the_model_that_the_engine_learns_in_this_process(store, jobs, study):
    assert jobs.state(study.key) is None
    assert jobs.start(study.key).state == "running"
    done = ended(jobs, study.key)
    assert (done.state, done.fraction, done.message) == ("done", 1.0, None)
    assert store.study(study.key).model == "current"
    here = engine.learn(store.table(study.key), study.plan.order())
    pd.testing.assert_frame_equal(store.learned(study.key).curve, here.curve)
    assert leftovers(store, study) == []


def test_learning_allows_as_many_parents_as_the_study_says(store, jobs, study):
    store.limit_parents(study.key, 1)
    jobs.start(study.key)
    assert ended(jobs, study.key).state == "done"
    learned = store.learned(study.key)
    assert learned.max_parents == 1
    assert max(len(parents) for parents in learned.parents_at(int(learned.curve["links"].max())).values()) == 1


def test_progress_is_told_in_words_and_what_was_done_stays(jobs, store, study, working):
    jobs = working(slow_work.waits)
    jobs.start(study.key)
    state = searching(jobs, study.key)
    assert (state.state, state.fraction, state.done) == ("running", 0.5, ("Starting", "Counting"))


def test_a_reload_and_a_second_server_see_the_same_progress(store, study, working):
    jobs = working(slow_work.waits)
    jobs.start(study.key)
    state = searching(jobs, study.key)
    second = Store(store.folder)
    seen = until(Jobs(second), study.key, lambda found: found is not None and found.words == "Searching")
    assert seen == state
    second.close()


def test_starting_twice_goes_on_with_the_first(store, study, working):
    jobs = working(slow_work.waits)
    first = jobs.start(study.key)
    searching(jobs, study.key)
    pid = worker(jobs, study.key)
    assert jobs.start(study.key).started == first.started
    assert worker(jobs, study.key) == pid


@pytest.mark.parametrize("work", [slow_work.waits, slow_work.will_not_stop], ids=lambda work: work.__name__)
def test_cancel_ends_the_process_within_two_tenths_of_a_second(store, study, working, work):
    jobs = working(work)
    jobs.start(study.key)
    searching(jobs, study.key)
    pid, began = worker(jobs, study.key), time.monotonic()
    assert jobs.cancel(study.key).state == "cancelled"
    took = time.monotonic() - began
    until(jobs, study.key, lambda _: not alive(pid))
    assert took < 0.2
    jobs._jobs[study.key].thread.join(PATIENCE)
    assert leftovers(store, study) == []
    assert store.study(study.key) == study


def test_cancel_stops_real_learning_in_the_middle(store, jobs):
    rng = np.random.default_rng(3)
    names = [f"c{place}" for place in range(18)]
    frame = pd.DataFrame({name: rng.choice(["a", "b", "c"], 3000) for name in names})
    study = store.bring("Big", frame, "big.csv", plan=Plan(stages=(("Everything", tuple(names)),)))
    jobs.start(study.key)
    until(jobs, study.key, lambda state: state.fraction > 0 or state.state != "running")
    pid = worker(jobs, study.key)
    assert jobs.cancel(study.key).state == "cancelled"
    until(jobs, study.key, lambda _: not alive(pid))
    assert store.study(study.key).model == "none"


def test_a_job_cancelled_before_its_process_started_never_starts(store, study, working):
    jobs = working(slow_work.waits)
    jobs.start(study.key)
    jobs.cancel(study.key)
    jobs._jobs[study.key].thread.join(PATIENCE)
    assert jobs.state(study.key).state == "cancelled"
    assert leftovers(store, study) == []


def test_a_second_server_can_cancel(store, study, working):
    jobs = working(slow_work.waits)
    jobs.start(study.key)
    searching(jobs, study.key)
    pid, second = worker(jobs, study.key), Store(store.folder)
    Jobs(second).cancel(study.key)
    assert ended(jobs, study.key).state == "cancelled"
    until(jobs, study.key, lambda _: not alive(pid))
    second.close()


def test_a_worker_that_is_killed_is_said_and_the_study_is_intact(store, study, working):
    jobs = working(slow_work.waits)
    jobs.start(study.key)
    searching(jobs, study.key)
    os.kill(worker(jobs, study.key), signal.SIGKILL)
    state = ended(jobs, study.key)
    assert state.state == "died"
    assert "ended from outside (signal 9)" in state.message
    assert state.do
    assert store.study(study.key) == study
    assert leftovers(store, study) == []


def test_after_a_killed_worker_learning_starts_again(store, study, working):
    jobs = working(slow_work.waits)
    jobs.start(study.key)
    searching(jobs, study.key)
    os.kill(worker(jobs, study.key), signal.SIGKILL)
    ended(jobs, study.key)
    jobs._work = slow_work.refuses
    assert jobs.start(study.key).state == "running"
    assert ended(jobs, study.key).state == "failed"


def test_a_refusal_of_the_engine_arrives_whole(store, study, working):
    jobs = working(slow_work.refuses)
    jobs.start(study.key)
    state = ended(jobs, study.key)
    assert (state.state, state.message) == ("failed", "The stage Background has too many columns.")
    assert (state.where, state.do) == ("Background", "Split it.")


def test_an_error_of_the_program_is_said_without_its_inner_words(store, study, working):
    jobs = working(slow_work.breaks)
    jobs.start(study.key)
    state = ended(jobs, study.key)
    assert state.state == "failed"
    assert "ZeroDivisionError" in state.message
    assert "inner words" not in state.message


def test_a_damaged_result_is_not_kept(store, study, working):
    jobs = working(slow_work.leaves_a_damaged_file)
    jobs.start(study.key)
    assert ended(jobs, study.key).state == "failed"
    assert store.study(study.key).model == "none"
    jobs._jobs[study.key].thread.join(PATIENCE)
    assert leftovers(store, study) == []


def test_a_server_that_is_closed_ends_its_jobs_and_says_so_afterwards(store, study, working):
    jobs = working(slow_work.waits)
    jobs.start(study.key)
    searching(jobs, study.key)
    pid = worker(jobs, study.key)
    jobs.close()
    until(jobs, study.key, lambda _: not alive(pid))
    state = Jobs(store).state(study.key)
    assert state.state == "died"
    assert "Steelyard was closed" in state.message


def test_a_server_that_vanished_is_noticed_by_its_silence(store, study):
    silent = time.time() - 60
    with store.database.writing() as database:
        database.execute(
            "INSERT INTO jobs (study, state, fraction, words, done, started, beat) "
            "VALUES (?, 'running', 0.4, 'Counting', "
            "'[\"Starting\"]', '2026-01-01T00:00:00+00:00', ?)",
            (study.key, silent),
        )
    state = Jobs(store).state(study.key)
    assert (state.state, state.fraction, state.done) == ("died", 0.4, ("Starting",))
    assert "Steelyard was closed" in state.message


def test_a_job_that_ended_can_be_forgotten_and_one_that_runs_cannot(store, study, working):
    jobs = working(slow_work.waits)
    jobs.start(study.key)
    jobs.forget(study.key)
    assert jobs.state(study.key).state == "running"
    jobs.cancel(study.key)
    jobs.forget(study.key)
    assert jobs.state(study.key) is None
    assert Jobs(store).state(study.key) is None


def test_what_cannot_be_learned_is_refused_before_a_process_starts(store, jobs, study, visits_plan):
    with pytest.raises(NoSuchStudy):
        jobs.start("nowhere")
    with store.database.writing() as database:
        circle = replace(visits_plan, insist=(("passed", "age"),))
        database.execute("UPDATE studies SET plan = ? WHERE key = ?", (circle.to_json(), study.key))
    with pytest.raises(Refusal, match="“passed” leads to “age”"):
        jobs.start(study.key)
    assert jobs.state(study.key) is None


def test_a_plan_changed_while_learning_makes_the_model_an_old_one(store, jobs, study, visits_plan):
    jobs.start(study.key)
    store.save_plan(study.key, replace(visits_plan, rule_out=(("age", "passed"),)))
    assert ended(jobs, study.key).state == "done"
    assert store.study(study.key).model == "old"
