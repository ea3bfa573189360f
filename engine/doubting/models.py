"""Do other plausible models say what the accepted one says, and can they be asked at all?"""

from __future__ import annotations

from engine.answering.answer import Caution, Doubt
from engine.doubting.case import Case, Found, named, per_cent
from engine.order import better_levels

COVERAGE = 0.90
ROUNDING = 1e-9  # what sums of the same shares may differ by


def check(case: Case) -> Found | None:
    """Once an answer's interval is over plausible models: tell where the model's own figure lies outside it, and how
    many of them the question could not be asked of. The latter weakens when they are the larger part."""
    doubt = case.answer.doubt
    if doubt is None:
        return None
    found = [_left_out(case, doubt)] if doubt.left_out else []
    if case.answer.doubted:
        found += [caution for column in case.asked.watch for caution in _outside(case, column)]
    return tuple(found)


def _left_out(case: Case, doubt: Doubt) -> Caution:
    text = "plausible versions of the model cannot be asked this, so the interval is over the others"
    if not case.answer.doubted:
        text = "plausible versions of the model can be asked this, so the interval is within the one model"
    rank = "weakens" if 2 * doubt.left_out > doubt.graphs else "know"
    figures = {"graphs": float(doubt.graphs), "left out": float(doubt.left_out)}
    return Caution(
        rank,
        "models",
        f"{doubt.left_out} of {doubt.graphs}" if case.answer.doubted else f"none of {doubt.graphs}",
        f"{text}. There it reads: {doubt.why}",
        "On the Model page, see which links of these columns are unsure, or say more in the order.",
        figures,
        tuple(dict.fromkeys((*case.asked.pinned, *case.asked.levers))),
    )


def _outside(case: Case, column: str) -> list[Caution]:
    """The accepted model's share, or change where something is set, against the interval over plausible models."""
    reading = case.answer[column]
    better = None if case.order is None else case.order.outcomes.get(column)
    levels = better_levels(better, reading.among.levels, case.network.node(column).has_blank)
    levels = levels or (max(reading.among.levels, key=lambda level: reading.among.shares[level]),)
    what = f"{column} = {named(levels, 'or')}"
    if reading.set is None:
        said = reading.among.share(levels)
        low, high = reading.among.interval(levels, COVERAGE)
        figure, span = per_cent(said), f"{per_cent(low)} and {per_cent(high)}"
    else:
        said, low, high = case.answer.change(column, levels, COVERAGE)
        figure, span = f"{_points(said)} points", f"{_points(low)} and {_points(high)} points"
    if low - ROUNDING <= said <= high + ROUNDING:
        return []
    kind = "share" if reading.set is None else "change"
    return [
        Caution(
            "know",
            "models",
            figure,
            f"is the {kind} for {what} in the model you accepted; nine in ten plausible ones say between {span}.",
            "Go by the interval rather than by this figure; on the Model page, see which links are unsure.",
            {"model": said, "low": low, "high": high},
            (column, *case.asked.levers),
        )
    ]


def _points(change: float) -> str:
    """A difference of shares in points, with a sign (U+2212 for minus)."""
    return f"{100.0 * change:+.1f}".replace("-", "−")
