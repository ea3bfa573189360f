"""Steelyard's engine: records become a model, a question becomes an answer, with the reasons for doubt beside it.

These names are the way in for scripts, tests and the app.
"""

from engine.answering.answer import Answer, Caution, Counted, Marginal, Reading
from engine.answering.levers import Fix
from engine.model import Model
from engine.network.network import Category
from engine.order import LESS, MORE, Order, Stage
from engine.refusal import Refusal

__all__ = [
    "LESS",
    "MORE",
    "Answer",
    "Category",
    "Caution",
    "Counted",
    "Fix",
    "Marginal",
    "Model",
    "Order",
    "Reading",
    "Refusal",
    "Stage",
]
