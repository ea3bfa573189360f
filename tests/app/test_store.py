"""The store: studies come back as they were saved, and a failed change changes nothing."""

import os
import sqlite3
import threading
import zipfile
from dataclasses import replace

import numpy as np
import pandas as pd
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

import engine
from app.store import Choices, ModelUnreadable, NoModelYet, NoSuchStudy, Plan, Store, files
from app.store.schema import VERSION
from engine.learning.learned import VERSION as FORMAT
from engine.refusal import Refusal


@pytest.fixture
def study(store, visits, visits_plan):
    return store.bring("Visits", visits, "visits.csv", plan=visits_plan, warnings=["A line was odd."])


def learned_file(store, study):
    """A learned file in the study's folder, as a job leaves it."""
    learned = engine.learn(store.table(study.key), study.plan.order())
    path = files.unfinished(store.files(study.key))
    learned.save(path)
    return path


def everything(folder):
    """Every file of the store with its content, the database by its rows."""
    held = {str(path): path.read_bytes() for path in (folder / "studies").rglob("*") if path.is_file()}
    with sqlite3.connect(folder / "steelyard.db") as database:
        rows = database.execute("SELECT * FROM studies ORDER BY key").fetchall()
    database.close()
    return held, rows


class TestBringing:
    def test_a_study_comes_back_after_the_store_is_reopened(self, store, study, visits):
        store.close()
        reopened = Store(store.folder)
        assert reopened.study(study.key) == study
        assert [found.key for found in reopened.studies()] == [study.key]
        pd.testing.assert_frame_equal(reopened.table(study.key).frame, visits)
        assert reopened.table(study.key).digest == study.digest
        reopened.close()

    def test_what_was_odd_in_the_file_is_kept(self, study):
        assert study.warnings == ("A line was odd.",)
        assert (study.source, study.columns, study.model, study.links, study.last) == (
            "visits.csv",
            5,
            "none",
            None,
            None,
        )

    def test_without_a_plan_every_usable_column_is_in_one_stage(self, store, visits):
        study = store.bring("Visits", visits, "visits.csv")
        assert study.plan == Plan(stages=(("Everything", ("age", "shift", "mentor", "passed")),))

    def test_two_studies_of_one_name_have_their_own_keys(self, store, visits):
        keys = [store.bring(name, visits, "v.csv").key for name in ("Visits", "Visits", "vísits!", "夜間", " ")]
        assert keys == ["visits", "visits-2", "visits-3", "study", "untitled"]

    @pytest.mark.parametrize(
        "name", ["../../escape", "a/b", "<script>", "'; DROP TABLE studies; --", "con\x00trol", "x" * 500]
    )
    def test_a_hostile_name_stays_a_name(self, store, visits, name):
        study = store.bring(name, visits, name)
        assert store.study(study.key).source == name
        assert store.files(study.key).parent == store.folder / "studies"
        assert set(study.key) <= set("abcdefghijklmnopqrstuvwxyz0123456789-")

    def test_a_table_that_cannot_be_used_leaves_the_store_as_it_was(self, store, study):
        before = everything(store.folder)
        with pytest.raises(Refusal):
            store.bring(
                "Bad", pd.DataFrame({"a": ["x"] * 40, "b": ["y"] * 40}), "b.csv", plan=Plan(stages=(("S", ("z",)),))
            )
        assert everything(store.folder) == before

    def test_an_unknown_study_is_refused_by_its_key(self, store):
        for ask in (store.study, store.table, store.learned, store.model):
            with pytest.raises(NoSuchStudy, match="nowhere"):
                ask("nowhere")
        with pytest.raises(NoSuchStudy):
            store.save_plan("nowhere", Plan())
        with pytest.raises(NoSuchStudy):
            store.note_question("nowhere", "", "", ())

    def test_a_sample_is_brought_once(self, store, visits):
        first = store.bring("Sample", visits, "v.csv", sample="s")
        assert store.bring("Sample", visits, "v.csv", sample="s") == first
        assert store.sample("s") == first
        assert store.sample("other") is None
        assert len(list((store.folder / "studies").iterdir())) == 1


hostile = st.text(st.characters(exclude_categories=["Cs"]), min_size=1, max_size=8)


@settings(max_examples=25, suppress_health_check=[HealthCheck.function_scoped_fixture, HealthCheck.too_slow])
@given(
    st.lists(hostile, min_size=2, max_size=3, unique_by=str.strip),
    st.lists(hostile, min_size=2, max_size=3, unique=True),
)
def test_hostile_columns_and_levels_come_back_from_the_disk(store, columns, levels):
    rng = np.random.default_rng(1)
    frame = pd.DataFrame({column: rng.choice(np.array(levels, dtype=object), 60) for column in columns}).astype("str")
    choices = Choices(kinds={column: "category" for column in columns})
    study = store.bring("Hostile", frame, "h.csv", choices=choices)
    pd.testing.assert_frame_equal(pd.read_parquet(store.records(study.key)), frame)
    assert store.study(study.key).plan.columns == tuple(columns)


class TestMending:
    def test_a_column_left_out_leaves_the_plan_and_this_is_said(self, store, study, visits_plan):
        store.save_plan(study.key, replace(visits_plan, insist=(("shift", "mentor"),), rule_out=(("age", "passed"),)))
        mended = store.save_choices(study.key, Choices(kinds={"mentor": "left out"}))
        assert mended.plan == Plan(
            stages=(("Background", ("age", "shift")), ("Programme", ()), ("Result", ("passed",))),
            rule_out=(("age", "passed"),),
            outcomes={"passed": ("yes",)},
        )
        said = " ".join(mended.mended)
        assert "“mentor” is left out now, so it was taken out of the stage Programme." in said
        assert "The link you insisted on from “shift” to “mentor” went with it." in said
        assert "“mentor” is no longer marked as changeable." in said

    def test_a_column_brought_back_joins_the_last_stage_and_this_is_said(self, store, study):
        store.save_choices(study.key, Choices(kinds={"mentor": "left out"}))
        back = store.save_choices(study.key, Choices())
        assert back.plan.stages[-1] == ("Result", ("passed", "mentor"))
        assert back.mended == ("“mentor” was put into the stage Result; move it where it belongs.",)

    def test_an_outcome_whose_better_levels_are_gone_is_unmarked_and_this_is_said(self, store, study, visits_plan):
        store.save_plan(
            study.key, replace(visits_plan, outcomes={"age": (store.table(study.key).columns["age"].levels[0],)})
        )
        mended = store.save_choices(study.key, Choices(bands={"age": (30.5, 50.5)}))
        assert mended.plan.outcomes == {}
        assert mended.mended == ("“age” is no longer marked as an outcome: what counted as better is gone.",)

    @pytest.mark.parametrize("kind", ["weight", "group"])
    def test_a_column_that_says_how_records_count_leaves_the_plan_and_this_is_said(self, store, study, kind):
        choices = Choices(kinds={"age": kind}, blanks={"age": "drop row"})
        mended = store.save_choices(study.key, choices)
        assert mended.plan.stages[0] == ("Background", ("shift",))
        assert mended.mended == (f"“age” is the {kind} now, so it was taken out of the stage Background.",)
        assert store.study(study.key).choices == choices
        with pytest.raises(Refusal, match=f"“age” is the {kind}, so no stage can hold it"):
            store.save_plan(study.key, study.plan)

    def test_the_words_go_when_the_plan_is_looked_at_and_saved(self, store, study):
        mended = store.save_choices(study.key, Choices(kinds={"mentor": "left out"}))
        assert store.save_plan(study.key, mended.plan).mended == ()

    @pytest.mark.parametrize(
        ("stages", "said"),
        [
            ((("A", ("age", "shift", "mentor")),), "No stage holds “passed”"),
            ((("A", ("age", "shift", "mentor", "passed", "town")),), "“town” is left out"),
            ((("A", ("age", "shift", "mentor", "passed", "ghost")),), "no column “ghost”"),
            ((("A", ("age", "shift")), ("A", ("mentor", "passed"))), "Two stages are called A"),
            (((" ", ("age", "shift", "mentor", "passed")),), "A stage has no name"),
        ],
    )
    def test_a_plan_that_does_not_fit_is_refused_and_the_old_one_stays(self, store, study, stages, said):
        with pytest.raises(Refusal, match=said):
            store.save_plan(study.key, Plan(stages=stages))
        assert store.study(study.key) == study

    def test_better_levels_that_do_not_exist_are_refused(self, store, study, visits_plan):
        for wanted in (("maybe",), engine.MORE):
            with pytest.raises(Refusal, match="does not fit its levels"):
                store.save_plan(study.key, replace(visits_plan, outcomes={"passed": wanted}))


class TestModels:
    def test_a_model_is_current_until_the_plan_or_the_choices_change(self, store, study, visits_plan):
        store.keep_learned(study.key, learned_file(store, study), study.basis)
        assert store.study(study.key).model == "current"
        store.save_plan(study.key, replace(visits_plan, rule_out=(("age", "passed"),)))
        assert store.study(study.key).model == "old"
        store.save_plan(study.key, visits_plan)
        assert store.study(study.key).model == "current"
        store.save_choices(study.key, Choices(bands={"age": (40.5,)}))
        assert store.study(study.key).model == "old"
        assert store.learned(study.key) is not None

    def test_a_changed_unit_leaves_the_model_current_and_is_told_at_once(self, store, study):
        store.keep_learned(study.key, learned_file(store, study), study.basis)
        for unit in ("years", "y"):
            changed = store.save_choices(study.key, Choices(units={"age": unit}))
            assert (changed.model, changed.digest) == ("current", study.digest)
            assert store.model(study.key).network.node("age").unit == unit
            assert store.learned(study.key) is store.learned(study.key)
        store.save_choices(study.key, Choices())
        assert store.model(study.key).network.node("age").unit == ""

    def test_a_model_answers_the_same_after_the_store_is_reopened(self, store, study):
        store.keep_learned(study.key, learned_file(store, study), study.basis)
        pins, levers = {"shift": "nights"}, {"mentor": engine.Fix("yes")}
        before = store.model(study.key).ask(pins, levers).change("passed", "yes")
        store.close()
        reopened = Store(store.folder)
        assert reopened.model(study.key).ask(pins, levers).change("passed", "yes") == before
        reopened.close()

    def test_the_recommended_model_is_used_until_another_is_accepted(self, store, study):
        store.keep_learned(study.key, learned_file(store, study), study.basis)
        learned = store.learned(study.key)
        assert store.study(study.key).recommended == learned.recommended
        assert len(store.model(study.key).links) == learned.recommended
        other = next(links for links in learned.curve["links"] if links != learned.recommended)
        assert store.accept(study.key, int(other)).links == other
        assert len(store.model(study.key).links) == other
        store.keep_learned(study.key, learned_file(store, study), study.basis)
        assert store.study(study.key).links is None

    def test_a_budget_without_a_model_is_refused(self, store, study):
        with pytest.raises(NoModelYet):
            store.accept(study.key, 1)
        with pytest.raises(NoModelYet):
            store.model(study.key)
        assert store.learned(study.key) is None
        store.keep_learned(study.key, learned_file(store, study), study.basis)
        with pytest.raises(Refusal, match="no model with 999 links"):
            store.accept(study.key, 999)

    def test_a_damaged_learned_file_is_not_taken_over(self, store, study):
        store.keep_learned(study.key, learned_file(store, study), study.basis)
        before = everything(store.folder)
        path = files.unfinished(store.files(study.key))
        path.write_bytes(b"half a file")
        with pytest.raises(Refusal):
            store.keep_learned(study.key, path, study.basis)
        path.unlink()
        assert everything(store.folder) == before

    def test_one_file_is_kept_for_each_study(self, store, study):
        for _ in range(3):
            store.keep_learned(study.key, learned_file(store, study), study.basis)
        assert len(list(store.files(study.key).iterdir())) == 2

    def test_how_many_parents_are_allowed_next_is_kept_and_leaves_the_model_as_it_is(self, store, study):
        store.keep_learned(study.key, learned_file(store, study), study.basis)
        changed = store.limit_parents(study.key, 5)
        assert (changed.max_parents, changed.model, changed.basis) == (5, "current", study.basis)
        for wrong in (0, 6, -1):
            with pytest.raises(Refusal, match="at most 1 to 5 parents"):
                store.limit_parents(study.key, wrong)
        assert store.study(study.key).max_parents == 5
        with pytest.raises(NoSuchStudy):
            store.limit_parents("nowhere", 4)

    def test_a_model_of_a_version_before_is_told_to_be_learned_again(self, store, study):
        path = learned_file(store, study)
        store.keep_learned(study.key, path, study.basis)
        (kept,) = store.files(study.key).glob("*.learned")
        with zipfile.ZipFile(kept) as archive:
            held = {name: archive.read(name) for name in archive.namelist()}
        older = {
            name: content.replace(f'"version": {FORMAT}'.encode(), b'"version": 2') for name, content in held.items()
        }
        assert older != held
        with zipfile.ZipFile(kept, "w") as archive:
            for name, content in older.items():
                archive.writestr(name, content)
        later = Store(store.folder)
        with pytest.raises(ModelUnreadable, match="another version of Steelyard wrote it") as refused:
            later.model(study.key)
        assert refused.value.do == "Learn it again; the records and the order are as they were."
        later.close()


class TestQuestions:
    def test_the_last_question_is_kept_and_a_reload_is_not_counted_twice(self, store, study):
        for query in ("pin=a.b", "pin=a.b", "pin=a.c"):
            store.note_question(study.key, query, "By this estimate <b>54%</b>.", ())
        found = store.study(study.key)
        assert (found.asked, found.last.query, found.last.sentence) == (2, "pin=a.c", "By this estimate <b>54%</b>.")

    def test_the_study_asked_last_comes_first(self, store, study, visits):
        other = store.bring("Other", visits, "o.csv")
        assert [found.key for found in store.studies()] == [other.key, study.key]
        store.note_question(study.key, "", "An answer.", ())
        assert [found.key for found in store.studies()] == [study.key, other.key]


class TestFailures:
    """A write that fails half-way loses nothing that was saved before."""

    def failing(self, monkeypatch, name):
        def fail(*arguments, **keywords):
            raise OSError(28, "No space left on device")

        monkeypatch.setattr(os, name, fail)

    @pytest.mark.parametrize("step", ["fsync", "replace"])
    def test_bringing(self, store, study, visits, monkeypatch, step):
        before = everything(store.folder)
        self.failing(monkeypatch, step)
        with pytest.raises(Refusal, match="No space left on device"):
            store.bring("Second", visits, "v.csv")
        monkeypatch.undo()
        assert everything(store.folder) == before
        assert store.bring("Second", visits, "v.csv").key == "second"

    def test_bringing_while_the_records_are_half_written(self, store, study, visits, monkeypatch):
        before = everything(store.folder)

        def half(self, path, **keywords):
            path.write_bytes(b"PAR1 half")
            raise OSError(28, "No space left on device")

        monkeypatch.setattr(pd.DataFrame, "to_parquet", half)
        with pytest.raises(Refusal, match="No space left on device"):
            store.bring("Second", visits, "v.csv")
        assert everything(store.folder) == before

    @pytest.mark.parametrize("step", ["fsync", "replace"])
    def test_keeping_a_model(self, store, study, monkeypatch, step):
        store.keep_learned(study.key, learned_file(store, study), study.basis)
        before = everything(store.folder)
        path = learned_file(store, study)
        self.failing(monkeypatch, step)
        with pytest.raises(Refusal, match="No space left on device"):
            store.keep_learned(study.key, path, study.basis)
        monkeypatch.undo()
        path.unlink()
        assert everything(store.folder) == before
        assert store.study(study.key).model == "current"

    def test_saving_a_plan_while_the_disk_is_full(self, store, study, visits_plan):
        with store.database.reading() as database:
            database.execute(
                "CREATE TEMP TRIGGER full BEFORE UPDATE ON main.studies BEGIN SELECT RAISE(FAIL, 'disk full'); END"
            )
        with pytest.raises(Exception, match="disk full"):
            store.save(study.key, Choices(kinds={"mentor": "left out"}))
        assert store.study(study.key) == study

    def test_writing_a_file_leaves_the_old_one_until_the_new_one_is_whole(self, tmp_path):
        path = tmp_path / "kept"
        path.write_text("old")

        def half(temporary):
            temporary.write_text("ne")
            assert path.read_text() == "old"
            raise RuntimeError("interrupted")

        with pytest.raises(RuntimeError):
            files.write(path, half)
        assert [(found.name, found.read_text()) for found in tmp_path.iterdir()] == [("kept", "old")]


class TestFolder:
    def test_a_folder_of_the_version_before_is_brought_up_to_date_with_all_it_holds(self, store, study):
        store.keep_learned(study.key, learned_file(store, study), study.basis)
        before = store.study(study.key)
        store.close()
        with sqlite3.connect(store.folder / "steelyard.db") as database:
            database.execute("ALTER TABLE studies DROP COLUMN max_parents")
            database.execute("DROP TABLE judging")
            database.execute("DROP TABLE judgements")
            database.execute("PRAGMA user_version = 1")
        database.close()
        reopened = Store(store.folder)
        assert reopened.study(study.key) == before and before.max_parents == 3
        assert reopened.limit_parents(study.key, 4).max_parents == 4
        reopened.close()
        again = Store(store.folder)
        assert again.study(study.key).max_parents == 4
        again.close()

    def test_a_folder_of_a_newer_version_is_refused_untouched(self, store, study):
        store.close()
        with sqlite3.connect(store.folder / "steelyard.db") as database:
            database.execute(f"PRAGMA user_version = {VERSION + 1}")
        database.close()
        before = everything(store.folder)
        with pytest.raises(Refusal, match=f"newer Steelyard .format {VERSION + 1}; this one reads up to {VERSION}"):
            Store(store.folder)
        assert everything(store.folder) == before

    def test_a_database_that_is_none_is_refused_in_words(self, tmp_path):
        (tmp_path / "steelyard.db").write_bytes(b"no database at all" * 100)
        with pytest.raises(Refusal, match="could not be read or written"):
            Store(tmp_path)
        assert (tmp_path / "steelyard.db").read_bytes().startswith(b"no database")

    def test_a_folder_that_cannot_be_made_is_refused_in_words(self, tmp_path):
        (tmp_path / "file").write_text("in the way")
        with pytest.raises(Refusal, match="could not be written"):
            Store(tmp_path / "file" / "data")

    def test_missing_records_are_said_with_their_place(self, store, study, visits_plan):
        store.close()
        reopened = Store(store.folder)
        reopened.records(study.key).write_bytes(b"damaged")
        with pytest.raises(Refusal, match="missing or damaged") as refused:
            reopened.table(study.key)
        assert refused.value.where == str(reopened.records(study.key))
        reopened.close()

    def test_what_a_crash_left_is_swept_when_it_is_old_and_only_then(self, store, study):
        old, new = files.unfinished(store.files(study.key)), files.unfinished(store.files(study.key))
        abandoned = store.folder / "studies" / "abandoned"
        abandoned.mkdir()
        upload = store.incoming / "upload"
        for path in (old, new, upload, abandoned / "records.parquet"):
            path.write_bytes(b"left")
        for path in (old, upload, abandoned, store.records(study.key)):
            os.utime(path, (0, 0))
        store.close()
        Store(store.folder).close()
        assert (old.exists(), upload.exists(), new.exists(), abandoned.exists()) == (False, False, True, False)
        assert store.records(study.key).exists()


class TestTogether:
    def test_many_threads_and_a_second_store_lose_no_change(self, store, study):
        second = Store(store.folder)

        def ask(place):
            for turn in range(5):
                where = store if place % 2 else second
                where.note_question(study.key, f"{place}-{turn}", "An answer.", ())
                assert where.table(study.key).rows == 240

        threads = [threading.Thread(target=ask, args=(place,)) for place in range(8)]
        for thread in threads:
            thread.start()
        for thread in threads:
            thread.join()
        assert store.study(study.key).asked == 40
        second.close()

    def test_two_tabs_see_each_others_changes(self, store, study, visits_plan):
        second = Store(store.folder)
        assert second.table(study.key).columns["age"].kind == "number"
        store.save_choices(study.key, Choices(kinds={"age": "left out"}))
        assert second.table(study.key).columns["age"].kind == "left out"
        with pytest.raises(Refusal, match="“age” is left out"):
            second.save_plan(study.key, visits_plan)
        second.close()
