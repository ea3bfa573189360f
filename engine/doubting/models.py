"""Do other plausible models say what the accepted one says, and can they be asked at all?"""

from __future__ import annotations

from functools import partial

from engine.answering.answer import Caution, Doubt
from engine.doubting.case import Case, Found, named, per_cent, rounded

COVERAGE = 0.90
FEW = 0.05  # of the plausible models: fewer than this share are not told of
ROUNDING = 1e-9  # what sums of the same shares may differ by


def check(case: Case) -> Found | None:
    """Once an answer's interval is over plausible models: tell where the model's own figure lies outside it, and how
    many of them the question could not be asked of. The latter weakens when they are the larger part."""
    doubt = case.answer.doubt
    if doubt is None:
        return None
    found = [_left_out(case, doubt)] if doubt.left_out else []
    if case.answer.doubted:
        for column in case.asked.watch:
            found += [*_unlinked(case, doubt, column), *_outside(case, column)]
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


def _unlinked(case: Case, doubt: Doubt, column: str) -> list[Caution]:
    """Plausible models that part with the accepted one over whether anything leads from the levers to a column."""
    asked = doubt.graphs - doubt.left_out
    apart = doubt.apart.get(column, 0)
    levers = [lever for lever in case.asked.working if lever != column]
    if not levers or not FEW * asked <= apart <= (1.0 - FEW) * asked:
        return []
    linked = column in case.network.descendants(levers)
    here = named(levers, "or")
    if linked:
        text = f"no link, nor any chain of them, from {here} to {column}. The longer whisker counts them."
    else:
        text = f"a link, or a chain of them, from {here} to {column}; the one you accepted has none."
    told = apart if linked else asked - apart
    return [
        Caution(
            "know",
            "models",
            f"{told} of {asked}",
            f"plausible versions of the model have {text}",
            "On the Model page, see how sure its links are.",
            {"graphs": float(asked), "apart": float(apart)},
            (column, *levers),
        )
    ]


def _outside(case: Case, column: str) -> list[Caution]:
    """The accepted model's figure, or change where something is set, against the interval over plausible models."""
    answer, reading = case.answer, case.answer[column]
    wanted = None if reading.among.number is not None else case.in_question(column)
    changes = reading.set is not None and not answer.pinned_after
    if changes:
        said, low, high = answer.change(column, wanted, COVERAGE)
    else:
        shown = reading.among if reading.set is None else reading.set
        said = shown.mean if wanted is None else shown.share(wanted)
        low, high = shown.interval(wanted, COVERAGE)
    hair = ROUNDING * (1.0 if wanted is not None else reading.recorded.sd)
    if low - hair <= said <= high + hair:
        return []
    told = partial(rounded, digits=3) if wanted is None else _points if changes else per_cent
    kind = "change" if changes else "mean" if wanted is None else "share"
    what = f"the {kind} of {column}" if wanted is None else f"the {kind} for {column} = {named(wanted, 'or')}"
    unit = " points" if changes and wanted is not None else ""
    return [
        Caution(
            "know",
            "models",
            f"{told(said)}{unit}",
            f"is {what} in the model you accepted; nine in ten plausible ones say between {told(low)} and "
            f"{told(high)}{unit}.",
            "Go by the interval rather than by this figure; on the Model page, see which links are unsure.",
            {"model": said, "low": low, "high": high},
            (column, *case.asked.levers),
        )
    ]


def _points(change: float) -> str:
    """A difference of shares in points, with a sign (U+2212 for minus)."""
    return f"{100.0 * change:+.1f}".replace("-", "−")
