"""A unit behind figures, and which sentences say it."""

from __future__ import annotations

from dataclasses import replace

import pytest

from app.question import By, Question, To, Within
from app.wording.answers import counted_sentence
from app.wording.links import strength
from app.wording.parts import plain
from app.wording.units import apart, band, behind, of_change
from app.wording.values import held, in_question, set_to, setting_words, value
from engine.answering.answer import Counted
from engine.network.nodes import Category, Number
from tests.wording import test_answers_of_numbers as of_numbers

HOURS = Number("hours", bands=(5.0, 15.0), unit="hours a week")
TRAVEL = Category("travel time", ("under 20", "20 to under 45", "45 and over"), kind="number", unit="minutes")
BLANK = Category(
    "attendance", ("under 60", "60 and over", "blank"), kind="number", has_blank=True, unit="% of evenings"
)
NODES = {**of_numbers.NODES, "hours": HOURS, "travel time": TRAVEL, "attendance": BLANK}


@pytest.fixture(autouse=True)
def with_units(monkeypatch):
    monkeypatch.setattr(of_numbers, "NODES", NODES)


def found(unit="hours a week", **more):
    return replace(of_numbers.found(**more), unit=unit)


def test_a_unit_follows_its_figure_and_per_cent_without_a_space():
    assert [f"31{behind(unit)}" for unit in ("minutes", "% of evenings", "°C", "€", "")] == [
        *("31 minutes", "31% of evenings", "31°C", "31 €", "31")
    ]


def test_differences_of_per_cent_are_points():
    assert [apart(figure, "% of evenings") for figure in ("+2", "−1", "+1", "0", "1")] == [
        *("+2 points", "−1 point", "+1 point", "0 points", "1 point")
    ]
    assert (apart("+2", "hours"), of_change("hours"), of_change("%"), of_change("")) == (
        *("+2 hours", "hours", "points", ""),
    )


@pytest.mark.parametrize(
    ("node", "pin", "words"),
    [
        (TRAVEL, ("under 20",), "travel time under 20 minutes"),
        (TRAVEL, ("20 to under 45", "45 and over"), "travel time 20 to under 45 or 45 minutes and over"),
        (BLANK, ("60 and over",), "attendance 60% of evenings and over"),
        (BLANK, ("blank",), "attendance = blank"),
        (HOURS, Within(5.0, 7.5), "hours 5 to under 7.5 hours a week"),
        (HOURS, Within(5.0, None), "hours 5 hours a week and over"),
        (HOURS, Within(None, 7.5), "hours under 7.5 hours a week"),
        (HOURS, Within(7.0, 7.0), "hours = 7 hours a week"),
        (Number("hours", unit="h"), ("any value",), "hours any value"),
    ],
)
def test_what_is_pinned_is_said_with_its_unit(node, pin, words):
    assert plain(value(node, pin)) == words
    assert held(node, pin) in words


def test_what_is_set_or_shifted_is_said_with_its_unit():
    assert (set_to(HOURS, To(12.0)), set_to(HOURS, By(-2.0))) == ("12 hours a week", "2 hours a week")
    percent = Number("attendance", unit="%")
    assert (setting_words(percent, To(80.0)), setting_words(percent, By(5.0))) == ("to 80%", "5 points higher")


def test_the_answer_of_a_mean_says_its_unit_behind_the_last_figure_and_the_change():
    moved = of_numbers.said(
        Question(pins={"travel time": ("45 and over",)}, levers={"hours": (By(2.0), 1.0)}),
        found(among=12.1, after=14.1, low=2.0, high=2.0),
    )
    assert moved == (
        "By this estimate, among records with travel time 45 minutes and over, raising hours by 2 hours a week would "
        "move hours from 12.10 to 14.10 hours a week on average (+2.00 hours a week)."
    )
    across = of_numbers.said(Question(), found())
    assert across.startswith("Across all 1,847 records hours is 12.31 hours a week on average.")
    seen = of_numbers.said(Question(pins={"travel time": ("45 and over",)}), found(among=14.1))
    assert "hours is 14.10 hours a week on average, against 12.31 across all records. (+1.79 hours a week" in seen


def test_a_mean_in_per_cent_moves_by_points():
    moved = of_numbers.said(
        Question(levers={"mentor": ("yes", 1.0)}), found("% of evenings", after=14.3, low=1.5, high=2.5)
    )
    assert "to 14.3% of evenings on average (+2.0 points, within this model +1.5 to +2.5)." in moved


def test_a_band_of_a_number_is_answered_with_its_unit():
    wanted = in_question(TRAVEL, ("45 and over",), [0.4, 0.4, 0.2])
    assert plain(value(TRAVEL, wanted)) == "travel time 45 minutes and over"


def test_a_counted_mean_says_its_unit():
    count = Counted(412, {}, mean=11.04)
    words = counted_sentence(Question(), "hours", (), count, 412, NODES, 10, 1847, 1)
    assert plain(words) == "Counted in the records: mean 11.0 hours a week over 412 records."


def test_a_link_to_a_number_moves_it_in_its_unit():
    assert strength(2.31, True, "minutes") == "2.3 minutes on average"
    assert (strength(2.31, True, "%"), strength(2.31, True)) == ("2.3 points on average", "2.3 on average")


def test_any_other_column_is_said_as_before():
    assert band("20 to under 45", "") == "20 to under 45" and plain(value(NODES["mentor"], ("yes",))) == "mentor = yes"
