"""Model and Learned, the objects in users' hands: they hold a network and call the rooms."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, fields, replace
from functools import cached_property

import numpy as np
import pandas as pd

from engine.answering.answer import Answer
from engine.answering.asking import ask
from engine.answering.counting import Records
from engine.answering.doubt import Plausible, doubtable, held, plausible
from engine.answering.kept import Kept
from engine.answering.levers import Lever
from engine.answering.planner import Planner
from engine.answering.predicting import predict
from engine.answering.question import Question, question
from engine.doubting.case import Case
from engine.doubting.declared import declared
from engine.doubting.graph import Graph
from engine.doubting.register import cautions
from engine.doubting.rereading import Rereading
from engine.learning import learn as learning
from engine.learning import learned as learnt
from engine.learning.cap import Capped
from engine.network.network import Network, network
from engine.network.nodes import Node
from engine.network.program import program
from engine.network.sampling import sample
from engine.network.scoring import log_score
from engine.network.story import Story
from engine.network.telling import Telling
from engine.order import Order, Unrecorded
from engine.records.table import Coded, Table
from engine.refusal import Refusal, quoted

JOINTS = 16e6  # bytes of joint shares of a few columns each that a model keeps
SAMPLED = 2  # numbers of sampled graphs whose plans are kept
MODELS = 4  # models of one study kept, each with its drawn tables


@dataclass(frozen=True, eq=False)
class Model:
    """A network that answers questions.

    network: tables and their posterior.  order: as stated, None for a network given as it is.
    coded: the records it was learned from, None without.  unsettled: links whose direction nobody settled.
    plausible: so many graphs drawn from the posterior, to ask the same of; None without.
    capped: columns that want more parents than learning allowed; None where no such limit is known.
    unrecorded: causes stated of two columns each, beside which what a lever does is read from what is seen alone.
    """

    network: Network
    order: Order | None = None
    coded: Coded | None = None
    unsettled: frozenset[tuple[str, str]] = frozenset()
    plausible: Callable[[int], Plausible] | None = None
    capped: tuple[Capped, ...] | None = None
    unrecorded: tuple[Unrecorded, ...] = ()

    @classmethod
    def from_network(
        cls, nodes: Iterable[Node], unrecorded: Iterable[Unrecorded] = (), order: Order | None = None
    ) -> Model:
        """A model of parameters known exactly: intervals are points.

        unrecorded: causes that are in no column, beside those that the order states. Where such a cause ties a column
        to an earlier one, its table has the earlier one among its parents, so that the network holds all that is seen.
        order: what may be changed and which levels are better; None: every column may be changed.
        Raises Refusal as engine.network.network.network and engine.doubting.declared.declared do, and for a link that
        the order does not allow.
        """
        stated = (*(() if order is None else order.unrecorded), *unrecorded)
        model = cls(network(nodes), order, unrecorded=stated)
        for source, target in model.links:
            if order is not None and not order.may_lead(source, target):
                raise Refusal(
                    f"{quoted(source)} leads to {quoted(target)}, but {order.why(source, target)}.",
                    where=target,
                    do="Take out that link, or state another order.",
                )
        return model

    @property
    def links(self) -> tuple[tuple[str, str], ...]:
        """(source, target), parents before children; not those that are in the tables for an unrecorded cause alone."""
        if self._declared is None:
            return self.network.links
        return tuple(link for link in self.network.links if link in self._declared.links)

    @property
    def changeable(self) -> tuple[str, ...]:
        """Columns that may get a lever."""
        if self.order is None:
            return self.network.names
        return tuple(column for column in self.order.changeable if column in self.network.index)

    def ask(
        self,
        pins: Mapping[str, object] | None = None,
        levers: Mapping[str, Lever] | None = None,
        watch: Iterable[str] | None = None,
        beside: Iterable[str] = (),
        draws: int = 200,
        seed: int = 0,
        exact: bool | None = None,
        against: Mapping[str, Lever] | None = None,
        pins_after: Mapping[str, object] | None = None,
    ) -> Answer:
        """What `watch` would be among records with `pins`, if `levers` were set (method: Richardson & Robins 2013).

        pins: column -> a level or a set of levels; on a number a value, its bands, or a range, (low, high).
        levers: column -> engine.Fix, Mix, Shift or Rule.  against: levers of a second world to compare with.
        pins_after: pins on what a lever sets or moves, as it is after that: "those who would show it".
        watch: columns in question; None: the order's outcomes, else every column.  beside: further columns to read.
        draws: parameter draws behind the intervals.  exact: True: never sampled; False: always; None: where need be.
        Raises Refusal for an unknown column or level, a pin downstream of a lever, a lever on a column that is not
        changeable, pins that contradict each other, and a question too wide to sum when it has to be exact.
        """
        wanted = self._outcomes() if watch is None else watch
        given = tuple(held(each) for each in (pins, levers, wanted, beside, self.changeable, against, pins_after))

        def question_in(network: Network) -> Question:
            return question(network, *given)

        def checked(answer: Answer) -> Answer:
            case = Case(self.network, self.order, self._records, asked, answer, self.unsettled, self.capped, reread)
            found, made = cautions(case)
            return replace(answer, cautions=found, checks_made=made)

        asked = question_in(self.network)
        reread = None if self._declared is None else Rereading(self._declared, self.network, asked)
        answer = ask(self._planner, self._records, asked, draws, seed, exact)
        if reread is not None:
            answer = reread.of(answer, draws, seed)
        if self.plausible is None:
            return checked(answer)
        return doubtable(answer, self.plausible, question_in, seed, exact, checked)

    def strength(self, source: str, target: str) -> float:
        """How much a link moves its child.

        A category: the largest change, 0 to 1, in the share of its better (else commonest) levels between two values
        of that parent; a number acts through its bands. A number: the largest change in its mean, in its own unit,
        between two levels of that parent; where the parent is a number, between the 5th and the 95th percentile of its
        records, without records between 2 standard deviations below and above its mean.
        Averaged over the child's other parents as they are recorded.
        Raises Refusal when there is no such link.
        """
        if (source, target) not in self.links:
            raise Refusal(
                f"No link leads from {quoted(source)} to {quoted(target)}.",
                where=target,
                do="Ask for one of model.links.",
            )
        return self._telling.strength(source, target)

    def story(self, column: str) -> str:
        """How a column comes about: what it comes from or goes with, and its rules in plain words.

        Raises Refusal for an unknown column.
        """
        return self.account(column).text

    def account(self, column: str, most: int = 24) -> Story:
        """Its parts, and the table behind it: the `most` commonest configurations. Raises Refusal as `story`."""
        return self._telling.account(column, most)

    def log_score(self, frame: pd.DataFrame) -> np.ndarray:
        """(rows,) natural log of the probability or density of each row, by the posterior predictive; -inf where it
        cannot be.

        frame: every column of the model; levels as texts, numbers as numbers, a number taken as bands as either a
        number or the name of a band. A blank that no level stands for is summed out; further columns are not looked at.
        Raises Refusal for a missing column, an unknown level, and a blank number that a known number comes from.
        """
        return log_score(self.network, frame)

    def predict(self, frame: pd.DataFrame, column: str) -> pd.DataFrame:
        """A row per row of `frame`: shares of `column` by level, or mean and sd of a number, given its other columns.

        At the posterior means. Columns that `frame` leaves out, and blanks that no level stands for, are summed out;
        what it holds of `column` itself is not looked at. A row that cannot be is nan.
        Raises Refusal for an unknown column or level, and for blanks that cannot be summed out exactly.
        """
        return predict(self.network, frame, column)

    def sample(self, rows: int, seed: int) -> pd.DataFrame:
        """Invented rows at the posterior means: levels as texts, numbers as floats; the same for the same seed.

        Raises Refusal unless rows is 1 or more and seed 0 or more.
        """
        return sample(self.network, rows, seed)

    def program(self) -> str:
        """The model as a short, readable Python text that draws invented records; it needs numpy alone."""
        return program(self.network, self.order, {node.name: node.unit for node in self.network.nodes})

    def _outcomes(self) -> tuple[str, ...]:
        named = () if self.order is None else tuple(self.order.outcomes)
        return tuple(column for column in named if column in self.network.index) or self.network.names

    @cached_property
    def _telling(self) -> Telling:
        order, coded, unsettled = self.order, self.coded, self.unsettled
        return Telling(self.network, order, coded, unsettled, self._planner.joint, self._joints.get)

    @cached_property
    def _joints(self) -> Kept[tuple[str, ...], np.ndarray]:
        return Kept(JOINTS, lambda shares: shares.nbytes)

    @cached_property
    def _declared(self) -> Graph | None:
        return declared(self.network, self.unrecorded)

    @cached_property
    def _planner(self) -> Planner:
        return Planner(self.network)

    @cached_property
    def _records(self) -> Records | None:
        return None if self.coded is None else Records(self.coded)


@dataclass(frozen=True, eq=False)
class Learned(learnt.Learned):
    """What was learned from a table under an order: the size curve, and a Model at any of its numbers of links."""

    def in_units(self, units: Mapping[str, str]) -> Learned:
        """The same with its numbers in these units, for what learning does not depend on; itself where none changes."""
        coded = self.coded.in_units(units)
        return self if coded is self.coded else replace(self, coded=coded)

    def model(self, links: int | None = None) -> Model:
        """The best model with that many links; None: the recommended number. The same object when asked again.

        Raises Refusal for a number that the curve does not hold.
        """
        size = self.recommended if links is None else links
        return self._models.get(size, lambda: self._model(size))

    def _model(self, links: int) -> Model:
        found = self.settled(links)
        pairs = zip(found["source"], found["target"], found["settled"], strict=True)
        unsettled = frozenset((source, target) for source, target, by in pairs if by == "nobody")
        parents = self.parents_at(links)
        capped = tuple(each for each in self.cap if len(parents[each.column]) == self.max_parents)
        return Model(self.network(links), self.order, self.coded, unsettled, self._plausible, capped)

    def _plausible(self, graphs: int) -> Plausible:
        """The same for every model of this study."""
        return self._sampled.get(graphs, lambda: plausible(self, graphs))

    @cached_property
    def _sampled(self) -> Kept[int, Plausible]:
        return Kept(SAMPLED)

    @cached_property
    def _models(self) -> Kept[int, Model]:
        return Kept(MODELS)


def learn(
    table: Table,
    order: Order,
    max_links: int | None = None,
    max_parents: int = 3,
    graphs: int = 200,
    seed: int = 0,
    progress: Callable[[float, str], None] | None = None,
    folds: bool = True,
) -> Learned:
    """Find the best model at every number of links that `order` allows, and the number that predicts well enough.

    max_links: stop the curve there; None: every number.  max_parents: 1 to 5.
    graphs: how many to draw from the posterior over all graphs that the order allows.
    progress(fraction, words) is called often; raising inside it cancels.
    folds: False leaves the held-out scores out and recommends the size with the best score.
    Raises Refusal for records or an order that cannot be learned from.
    """
    if isinstance(order, Order) and order.unrecorded:
        raise Refusal(
            "Unrecorded causes cannot be declared yet.",
            where="unrecorded",
            do="Leave them out of the order; the cautions speak of what was not recorded.",
        )
    found = learning.learn(table, order, max_links, max_parents, graphs, seed, progress, folds=folds)
    return Learned(**{field.name: getattr(found, field.name) for field in fields(found)})


def open_learned(path: str | os.PathLike[str]) -> Learned:
    """Read what `Learned.save` wrote; it answers as before to the last digit. Raises Refusal for any other file."""
    return Learned.open(path)
