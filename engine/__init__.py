"""Steelyard's engine: records become a model, a question becomes an answer, with the reasons for doubt beside it.

These names are the way in for scripts, tests and the app.
"""

from engine.answering.answer import Answer, Caution, Counted, Marginal, Reading
from engine.answering.levers import Fix, Mix, Rule, Shift
from engine.judging.judge import judge
from engine.judging.judgement import Judgement
from engine.model import Learned, Model, learn, open_learned
from engine.network.nodes import Category, Number
from engine.order import LESS, MORE, Order, Stage, Unrecorded
from engine.records.reading import read_frame, read_table
from engine.records.table import Table
from engine.refusal import Refusal

__all__ = [
    "LESS",
    "MORE",
    "Answer",
    "Category",
    "Caution",
    "Counted",
    "Fix",
    "Judgement",
    "Learned",
    "Marginal",
    "Mix",
    "Model",
    "Number",
    "Order",
    "Reading",
    "Refusal",
    "Rule",
    "Shift",
    "Stage",
    "Table",
    "Unrecorded",
    "judge",
    "learn",
    "open_learned",
    "read_frame",
    "read_table",
]
