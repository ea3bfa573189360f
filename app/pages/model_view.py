"""What the Model page shows of a learned model: the size curve, the budget, the links, each column's story."""

from __future__ import annotations

import math
from dataclasses import dataclass
from urllib.parse import urlencode

import numpy as np
from markupsafe import Markup

from app.drawing import arcs, curve
from app.drawing.arcs import Arc
from app.drawing.curve import Point, figure_words
from app.pages.model_accounts import Account, accounts
from app.pages.model_notes import Limit, limits, notes, settled_by_shape, supports
from app.store import Study
from app.wording.amounts import plural
from app.wording.links import SETTLED, doubted, strength, support, wide_stages
from engine.learning.layers import WIDEST_LAYERED
from engine.model import Learned, Model

Link = tuple[str, str]

SHOWN_LINKS = 20  # rows of the links table before those with less support are folded
SUREST = 1.0  # where every support shown as "over 99%" stands in the table; "under 1%" stands at none
SHOWN_COLUMNS = 6  # columns told before the others are folded, and every outcome and picked column
EXACT = 1e-6  # nats by which a bound may exceed the score it bounds, for rounding


@dataclass(frozen=True)
class Size:
    """A row of the table of sizes."""

    links: int
    score: str
    held_out: str
    note: str
    address: str
    shown: bool


@dataclass(frozen=True)
class LinkRow:
    """A row of the links table. verb: "leads to" or "goes with".  settled: who gave it its direction, in words."""

    source: str
    verb: str
    target: str
    support: str
    bar: Markup
    strength: str
    settled: str
    picked: bool


@dataclass(frozen=True)
class ModelView:
    """The whole page once something was learned.

    links: the budget shown.  recommended, best: the sizes that the held-out records point to; best None without them.
    fewer, more: addresses of the budgets beside it, None at an end.  picked: the column picked out, or None.
    unpicked: the address with nothing picked out.  program: the address of the model as a program.
    wide: what to know of support where a stage holds many columns.  doubted: of links with little, None without any.
    shaped: why nobody settled some directions, None without such.  limits: columns that want more parents.
    most: parents that were allowed.  worth: what the records count for, None where each counts for one.
    """

    links: int
    recommended: int
    best: int | None
    accepted: int | None
    exact: bool
    curve: Markup
    figure: dict[str, object]
    sizes: tuple[Size, ...]
    all_sizes: tuple[Size, ...]
    fewer: str | None
    more: str | None
    arcs: Markup
    arc_key: list[tuple[Markup, str]]
    rows: tuple[LinkRow, ...]
    wide: str | None
    doubted: str | None
    accounts: tuple[Account, ...]
    addresses: dict[str, str]
    picked: str | None
    notes: tuple[str, ...]
    shaped: str | None
    limits: tuple[Limit, ...]
    most: int
    worth: int | None
    records: int
    unpicked: str
    program: str

    @property
    def first_rows(self) -> tuple[LinkRow, ...]:
        """The links with most support, and every link of the picked column."""
        return tuple(row for place, row in enumerate(self.rows) if place < SHOWN_LINKS or row.picked)

    @property
    def more_rows(self) -> tuple[LinkRow, ...]:
        return tuple(row for place, row in enumerate(self.rows) if place >= SHOWN_LINKS and not row.picked)

    @property
    def first_accounts(self) -> tuple[Account, ...]:
        return self.accounts[: self._shown_accounts]

    @property
    def more_accounts(self) -> tuple[Account, ...]:
        return self.accounts[self._shown_accounts :]

    @property
    def _shown_accounts(self) -> int:
        return max(SHOWN_COLUMNS, sum(account.first for account in self.accounts))

    @property
    def is_in_use(self) -> bool:
        return self.links == (self.accepted if self.accepted is not None else self.recommended)


def view(study: Study, learned: Learned, links: int | None = None, picked: str | None = None) -> ModelView:
    """The page at a budget of `links` (None: the accepted, else the recommended one), with `picked` picked out."""
    points = _points(learned)
    budgets = [point.links for point in points]
    shown = links if links in budgets else study.links if study.links in budgets else learned.recommended
    place = budgets.index(shown)
    best = _best(points)
    model = learned.model(shown)
    picked = picked if picked in model.network.names else None
    addresses = {name: _address(study.key, shown, name) for name in model.network.names}
    found = learned.settled(shown)
    settled = {
        (str(source), str(target)): str(by)
        for source, target, by in zip(found["source"], found["target"], found["settled"], strict=True)
    }
    likely = supports(learned, model, settled)
    sizes = tuple(_size(study.key, point, learned.recommended, best, shown, picked) for point in points)
    return ModelView(
        links=shown,
        recommended=learned.recommended,
        best=best,
        accepted=study.links,
        exact=bool((learned.curve["bound"] - learned.curve["score"]).abs().max() <= EXACT),
        curve=curve.size_curve(points, learned.recommended, shown),
        figure=curve.figure(points, learned.recommended),
        sizes=tuple(sizes[each] for each in _telling(budgets, shown, learned.recommended, best)),
        all_sizes=sizes,
        fewer=_address(study.key, budgets[place - 1], picked) if place else None,
        more=_address(study.key, budgets[place + 1], picked) if place + 1 < len(budgets) else None,
        arcs=_arcs(learned, model, settled, likely, addresses, picked),
        arc_key=arcs.key(),
        rows=_rows(learned, model, settled, likely, picked),
        wide=_wide(learned),
        doubted=_doubted(learned, likely),
        accounts=accounts(model, picked),
        addresses=addresses,
        picked=picked,
        notes=notes(learned),
        shaped=settled_by_shape(learned, model, settled),
        limits=limits(model, learned.max_parents),
        most=learned.max_parents,
        worth=worth if (worth := round(float(learned.coded.weights.sum()))) < learned.rows else None,
        records=learned.rows,
        unpicked=_address(study.key, shown, None),
        program=f"/study/{study.key}/model.py?{urlencode({'links': str(shown)})}",
    )


def headline(view: ModelView) -> tuple[str, str]:
    """The figure in bold and the words after it."""
    one = view.links == 1
    if view.links == view.recommended:
        said = f"{'predicts' if one else 'predict'} unseen records about as well as any larger model."
    else:
        than = "fewer" if view.links < view.recommended else "more"
        said = f"{'is' if one else 'are'} {than} than the {view.recommended} that unseen records call for."
    exact = " No allowed model of this size scores higher." if view.exact else ""
    return f"{view.links or 'No'} {plural(view.links, 'link')}", said + exact


def deck(view: ModelView) -> str:
    """Why this size is recommended."""
    said = ["The search was exact."] if view.exact else []
    if view.best is None:
        said.append("No records were held out, so no size can be recommended by them.")
    elif view.best == view.recommended:
        said.append(f"{view.best} {plural(view.best, 'link does', 'links do')} best on held-out records.")
    else:
        said.append(
            f"{view.best} {plural(view.best, 'link does', 'links do')} best on held-out records; {view.recommended} is "
            "the smallest number that does as well, within one standard error."
        )
    if view.best is not None and view.all_sizes[-1].links > view.best:
        said.append("Beyond that, more links predict new records no better.")
    return " ".join(said)


def _points(learned: Learned) -> list[Point]:
    rows, table = float(learned.coded.weights.sum()), learned.curve
    return [
        Point(int(links), float(score) / rows, _measured(held_out), _measured(error))
        for links, score, held_out, error in zip(
            table["links"], table["score"], table["held_out"], table["held_out_se"], strict=True
        )
    ]


def _measured(value: float) -> float | None:
    return float(value) if math.isfinite(value) else None


def _best(points: list[Point]) -> int | None:
    measured = [point for point in points if point.held_out is not None]
    return max(measured, key=lambda point: point.held_out or -math.inf).links if measured else None


def _size(key: str, point: Point, recommended: int, best: int | None, shown: int, picked: str | None) -> Size:
    notes = [
        words
        for words, holds in (("recommended", point.links == recommended), ("best held out", point.links == best))
        if holds
    ]
    return Size(
        links=point.links,
        score=figure_words(point.score, 3),
        held_out="" if point.held_out is None else figure_words(point.held_out, 3),
        note=", ".join(notes),
        address=_address(key, point.links, picked),
        shown=point.links == shown,
    )


def _telling(budgets: list[int], shown: int, recommended: int, best: int | None) -> list[int]:
    """Places of the sizes worth a row: the ends, half of the recommended, the recommended, the best, the shown."""
    wanted = {budgets[0], budgets[-1], recommended, shown, best if best is not None else recommended}
    wanted.add(min(budgets, key=lambda links: abs(links - recommended / 2)))
    return [place for place, links in enumerate(budgets) if links in wanted]


def _arcs(
    learned: Learned,
    model: Model,
    settled: dict[Link, str],
    likely: dict[Link, float],
    addresses: dict[str, str],
    picked: str | None,
) -> Markup:
    sequence = {name: place for place, name in enumerate(model.network.names)}  # parents stand before their children
    stages = [(stage.name, sorted(stage.columns, key=lambda name: sequence[name])) for stage in learned.order.stages]
    drawn = [Arc(*link, settled[link], likely[link]) for link in model.links]
    return arcs.arcs([stage for stage in stages if stage[1]], drawn, addresses, picked)


def _rows(
    learned: Learned, model: Model, settled: dict[Link, str], likely: dict[Link, float], picked: str | None
) -> tuple[LinkRow, ...]:
    """Links of the picked column first, then by support as it is shown, the strongest first within equal."""
    strengths = {link: model.strength(*link) for link in model.links}
    said = {link: "100%" if link in learned.order.insist else support(likely[link]) for link in model.links}
    ends = {"over": SUREST, "under": 0.0}
    shown = {link: ends.get(said[link].split()[0], round(likely[link], 2)) for link in model.links}
    scales = {name: float(np.std(learned.coded.values[:, place])) for place, name in enumerate(_numbers(learned))}
    apart = {link: strengths[link] / scales.get(link[1], 1.0) for link in model.links}
    ordered = sorted(model.links, key=lambda link: (picked not in link, -shown[link], -apart[link]))
    return tuple(
        LinkRow(
            source=source,
            verb="goes with" if settled[source, target] == "nobody" else "leads to",
            target=target,
            support=said[source, target],
            bar=arcs.support_bar(likely[source, target]),
            strength=strength(strengths[source, target], target in model.network.numbers),
            settled=SETTLED[settled[source, target]],
            picked=picked in (source, target),
        )
        for source, target in ordered
    )


def _numbers(learned: Learned) -> list[str]:
    return [learned.coded.names[place] for place in learned.coded.numbers]


def _doubted(learned: Learned, likely: dict[Link, float]) -> str | None:
    few = sum(support < 0.5 for link, support in likely.items() if link not in learned.order.insist)
    return doubted(few) if few else None


def _wide(learned: Learned) -> str | None:
    wide = [stage.name for stage in learned.order.stages if len(stage.columns) > WIDEST_LAYERED]
    drawn = learned.posterior
    return wide_stages(wide, WIDEST_LAYERED, drawn.weights.size, drawn.effective) if wide else None


def _address(key: str, links: int, column: str | None) -> str:
    query = {"links": str(links)} | ({"column": column} if column is not None else {})
    return f"/study/{key}/model?{urlencode(query)}"
