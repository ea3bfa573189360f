"""One question asked of one study's model: what Ask shows and the printed answer prints."""

from __future__ import annotations

import weakref
from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from functools import cached_property

from app.drawing.scale import Scale, rounded_outward
from app.drawing.strip import Drawn
from app.names import Names
from app.pages.usual import Usual, usual
from app.question import By, Pin, Question, Setting, To, Within
from app.wording.answers import Said, answer_sentence
from app.wording.estimates import Estimates, estimates
from app.wording.questions import question_sentence
from app.wording.units import behind
from app.wording.values import Words, in_question
from engine.answering.answer import Answer, Marginal, Reading
from engine.answering.kept import Kept
from engine.answering.levers import Fix, Shift
from engine.model import Model
from engine.network.equivalence import unsettled_links
from engine.network.nodes import Node
from engine.order import Order
from engine.refusal import Refusal

DRAWS, SEED = 200, 0
GRAPHS, EACH = 50, 20  # sampled models, and draws of the figures in each
CURVES = 256  # curves as recorded that one model keeps
MOST = 0.5  # share of the records asked about


class Spine:
    """What every question of one model shares: its columns by stage, their links in words, their names in addresses."""

    def __init__(self, model: Model) -> None:
        assert model.order is not None
        self.model = model
        self.order: Order = model.order
        self.nodes: Mapping[str, Node] = {node.name: node for node in model.network.nodes}
        self.stages = tuple((stage.name, stage.columns) for stage in self.order.stages if stage.columns)
        self.columns = tuple(column for _, columns in self.stages for column in columns)
        self.numbers = frozenset(model.network.numbers)
        self.names = Names([(column, self.nodes[column].levels) for column in self.columns], self.numbers)
        self.unsettled = model.unsettled | unsettled_links(model.links, self.order.may_lead)
        self.outcomes = tuple(column for column in self.columns if column in self.order.outcomes)
        self.changeable = frozenset(model.changeable)
        self._usual: dict[str, Usual] = {}
        self.curves: Kept[tuple[str, Scale], Drawn] = Kept(CURVES)  # as recorded, the same in every question

    def usual(self, column: str, recorded: Marginal) -> Usual:
        """What is usual of a number. recorded: its marginal as recorded, which tells where there are no records."""
        if column not in self._usual:
            self._usual[column] = usual(self.model.coded, column, recorded)
        return self._usual[column]

    @property
    def records(self) -> int:
        return 0 if self.model.coded is None else int(self.model.coded.codes.shape[0])

    @property
    def first_watch(self) -> str:
        return (self.outcomes or self.columns[-1:])[0]

    def watched(self, question: Question) -> tuple[str, ...]:
        """The column of the answer sentence first, then the other outcomes."""
        return tuple(dict.fromkeys((question.watch or self.first_watch, *self.outcomes)))

    def comes_from(self, column: str) -> list[str]:
        return [source for source, target in self._settled if target == column]

    def leads_to(self, column: str) -> list[str]:
        return [target for source, target in self._settled if source == column]

    def goes_with(self, column: str) -> list[str]:
        """Columns linked to this one by a link whose direction nobody settled."""
        pairs = [link for link in self.model.links if link in self.unsettled and column in link]
        return [source if target == column else target for source, target in pairs]

    def settled_by(self, source: str, target: str) -> str:
        """Who settled the direction of a link: "your order", "the data" or "nobody"."""
        if not self.order.may_lead(target, source):
            return "your order"
        return "nobody" if (source, target) in self.unsettled else "the data"

    @cached_property
    def _settled(self) -> list[tuple[str, str]]:
        return [link for link in self.model.links if link not in self.unsettled]


_spines: weakref.WeakKeyDictionary[Model, Spine] = weakref.WeakKeyDictionary()


def spine_of(model: Model) -> Spine:
    """The model's spine, made once."""
    found = _spines.get(model)
    if found is None:
        found = _spines[model] = Spine(model)
    return found


@dataclass(frozen=True, eq=False)
class Asked:
    """A question and what came of it.

    watched: as Spine.watched.  wanted: column -> its levels in question.  refusal: why it was not answered, else None;
    the readings are then those of the records as they are.
    within: the readings within the accepted model, where those of the answer are over sampled models; else none.
    """

    question: Question
    watched: tuple[str, ...]
    answer: Answer
    spine: Spine
    refusal: Refusal | None = None
    within: Mapping[str, Reading] = field(default_factory=dict)

    @property
    def awaits_doubt(self) -> bool:
        """Whether the intervals over sampled models are still to come."""
        return self.refusal is None and self.answer.doubt is None and self.answer.again is not None

    @property
    def watch(self) -> str:
        return self.watched[0]

    @property
    def blocked(self) -> bool:
        """Whether what the levers would do is withheld."""
        return bool(self.question.levers) and self.answer.blocked

    @property
    def shows_among(self) -> bool:
        return bool(self.question.pins) and self.refusal is None

    @property
    def shows_set(self) -> bool:
        return bool(self.question.levers) and not self.blocked and self.refusal is None

    @property
    def thin(self) -> bool:
        """Whether, for more than half of the records asked about, the model fills in what the levers would do."""
        found = [caution.figures["share thin"] for caution in self.answer.cautions if caution.code == "overlap"]
        return bool(self.question.levers) and any(share > MOST for share in found)

    @property
    def apart(self) -> frozenset[str]:
        """Levers from which nothing in the model leads to the column of the answer sentence."""
        network = self.spine.model.network
        return frozenset(
            lever
            for lever in self.question.levers
            if lever != self.watch and self.watch not in network.descendants([lever])
        )

    def untouched(self, column: str) -> bool:
        """Whether a column is pinned and not set: it comes before every lever, so that nothing can move it."""
        return column in self.question.pins and column not in self.question.levers

    def usual(self, column: str) -> Usual:
        """What is usual of a number in the records."""
        return self.spine.usual(column, self.answer[column].recorded)

    def beyond(self, column: str, setting: Setting) -> bool:
        """Whether a lever sets a number to where no record is, so that nobody had its value anyway."""
        return isinstance(setting, To) and column in self.spine.numbers and not self.usual(column).holds(setting.value)

    def scale(self, column: str) -> Scale:
        """The axis of a number: over what is usual, and on to the means that are shown."""
        found, usual = self.estimates(column), self.usual(column)
        shown = [found.recorded, *([found.among] if self.shows_among else ())]
        shown += [found.set] if self.shows_set and found.set is not None else []
        ends = [end for each in shown for end in (each.point, each.low, each.high)]
        return rounded_outward(usual.low, usual.high, ends, behind(found.unit))

    def wanted(self, column: str) -> tuple[str, ...]:
        """The levels of a column whose share answers the question; none where its mean does."""
        recorded = [float(part) for part in self.answer[column].recorded.point]
        return in_question(self.spine.nodes[column], self.spine.order.outcomes.get(column), recorded)

    def estimates(self, column: str) -> Estimates:
        if column not in self._estimates:
            found = estimates(self.answer[column], self.wanted(column), self.within.get(column))
            beyond = any(self.beyond(lever, setting) for lever, (setting, _) in self.question.levers.items())
            found = replace(found, unit=self.spine.nodes[column].unit)
            self._estimates[column] = replace(found, had=None) if beyond else found
        return self._estimates[column]

    @cached_property
    def _estimates(self) -> dict[str, Estimates]:
        return {}

    @cached_property
    def sentence(self) -> Words:
        """The question in words."""
        return question_sentence(self.question, self.watch, self.wanted(self.watch), self.spine.nodes)

    @cached_property
    def said(self) -> Said:
        """The answer in words."""
        return answer_sentence(
            self.question,
            self.watch,
            self.wanted(self.watch),
            self.estimates(self.watch),
            self.spine.nodes,
            self.spine.records or None,
            self.blocked,
            self.thin,
            self.apart,
        )


def ask(model: Model, question: Question, doubt: bool = False) -> Asked:
    """Ask `question` of `model`, with every column read beside it.

    doubt: whether intervals of the watched columns are over sampled models, which takes longer.
    """
    spine = spine_of(model)
    watched = spine.watched(question)
    try:
        asked = Asked(question, watched, _answer(spine, question, watched), spine)
        return _doubted(asked) if doubt else asked
    except Refusal as refusal:
        bare = replace(question, pins={}, levers={})
        return Asked(question, watched, _answer(spine, bare, watched), spine, refusal)


def _answer(spine: Spine, question: Question, watched: tuple[str, ...], beside: bool = True) -> Answer:
    levers = {column: _lever(setting, reach) for column, (setting, reach) in question.levers.items()}
    pins = {column: _pin(pin) for column, pin in question.pins.items()}
    columns = spine.columns if beside else ()
    return spine.model.ask(pins, levers, watch=watched, beside=columns, draws=DRAWS, seed=SEED)


def _doubted(asked: Asked) -> Asked:
    """The same with the doubt over sampled models about its watched columns; as it is where there is none to tell."""
    answer = asked.answer
    try:
        over = _answer(asked.spine, asked.question, asked.watched, beside=False).with_doubt(GRAPHS, EACH)
    except Refusal:  # no graphs were drawn when this was learned
        return replace(asked, answer=replace(answer, again=None))
    within = {column: answer[column] for column in asked.watched} if over.doubted else {}
    together = replace(
        answer,
        readings={**answer.readings, **over.readings},
        method=over.method,
        milliseconds=answer.milliseconds + over.milliseconds,
        cautions=over.cautions,
        checks_made=over.checks_made,
        doubt=over.doubt,
    )
    return replace(asked, answer=together, within=within)


def _pin(pin: Pin) -> object:
    """As the engine takes it: levels, a value, or a range."""
    if not isinstance(pin, Within):
        return frozenset(pin)
    return (pin.low, pin.high) if pin.value is None else pin.value


def _lever(setting: Setting, reach: float) -> Fix | Shift:
    match setting:
        case To(value):
            return Fix(value, reach)
        case By(amount):
            return Shift(amount, reach)
        case level:
            return Fix(level, reach)
