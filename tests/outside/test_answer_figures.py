"""Questions about given networks against figures from outside; the source of each stands in answer_figures.json."""

import json
import math
from pathlib import Path

import pytest

import engine

CASES = json.loads((Path(__file__).parent / "answer_figures.json").read_text(encoding="utf-8"))
ASKED = [(case, told) for case, held in CASES.items() for told in held["figures"] if "ask" in told]
KINDS = {"category": engine.Category, "number": engine.Number}


@pytest.fixture(scope="module")
def models():
    return {case: engine.Model.from_network(map(node, held["network"])) for case, held in CASES.items()}


def node(written):
    return KINDS[written["kind"]](**{name: value for name, value in written.items() if name != "kind"})


def pin(written):
    if not isinstance(written, dict):
        return written
    return set(written["set"]) if "set" in written else tuple(written["range"])


def lever(written):
    written = dict(written)
    reach = written.pop("reach", 1.0)
    ((what, value),) = written.items()
    if what == "rule":
        return engine.Rule(*value, reach=reach)
    return {"fix": engine.Fix, "mix": engine.Mix, "shift": engine.Shift}[what](value, reach=reach)


def asked(model, ask, **rest):
    pins = {column: pin(written) for column, written in ask["pins"].items()}
    levers = {column: lever(written) for column, written in ask["levers"].items()}
    return model.ask(pins, levers, ask["watch"], **rest)


def read(answer, what, *where):
    if what == "evidence_probability":
        return math.exp(answer.log_evidence)
    world, measure, *which = where
    marginal = getattr(answer[what], world)
    found = {"share": marginal.share, "quantile": marginal.quantile}.get(measure)
    return getattr(marginal, measure) if found is None else found(*which)


def name_of(case_and_told):
    case, told = case_and_told
    return f"{case}: {told['name']}"


@pytest.mark.parametrize("case_and_told", ASKED, ids=name_of)
def test_an_answer_has_the_figure_told_elsewhere(models, case_and_told):
    case, told = case_and_told
    answer = asked(models[case], told["ask"], exact=True)
    assert answer.method.startswith("exact") and answer.mc_error == 0.0
    assert read(answer, *told["read"]) == pytest.approx(told["value"], abs=told["tolerance"])


@pytest.mark.parametrize("case", CASES)
def test_a_sampled_answer_is_within_four_of_its_own_errors(models, case):
    """The last question of each case; errors are told of shares and of means, in sds, and of no sd and no quantile."""
    told = [told for of, told in ASKED if of == case and not {"sd", "quantile"} & set(told["read"])][-1]
    column, world, measure, *_ = told["read"]
    answer = asked(models[case], told["ask"], exact=False)
    assert answer.method.startswith("sampled")
    unit = getattr(answer[column], world).sd if measure == "mean" else 1.0
    error = 4.0 * answer.mc_error * unit + told["tolerance"]
    assert read(answer, *told["read"]) == pytest.approx(told["value"], abs=error)


# Path tracing (Wright 1934): every column but z has a standard deviation of 1, and z has too.


def tracing(starting):
    found = [told for told in CASES["path-tracing"]["figures"] if told["name"].startswith(starting)]
    assert found, f"no figure {starting}"
    return found


@pytest.mark.parametrize("told", tracing("correlation of"), ids=lambda told: told["name"])
def test_seeing_one_number_moves_another_by_their_correlation(models, told):
    one, other = told["name"].removeprefix("correlation of ").split(" and ")
    low, high = (models["path-tracing"].ask({one: value}, watch=[other])[other].among for value in (0.0, 1.0))
    sds = [models["path-tracing"].ask(watch=[column])[column].recorded.sd for column in (one, other)]
    assert sds == pytest.approx([1.0, 1.0], abs=1e-9)
    assert high.mean - low.mean == pytest.approx(told["value"], abs=told["tolerance"])
    assert low.sd == pytest.approx(math.sqrt(1.0 - told["value"] ** 2), abs=1e-9)


@pytest.mark.parametrize("told", tracing("total effect of"), ids=lambda told: told["name"])
def test_setting_one_number_moves_another_by_the_total_effect(models, told):
    one, other = told["name"].removeprefix("total effect of ").split(" on ")
    answer = models["path-tracing"].ask({}, {one: engine.Fix(1.0)}, [other], against={one: engine.Fix(0.0)})
    change, low, high = answer.change(other)
    assert change == low == high == pytest.approx(told["value"], abs=told["tolerance"])
    moved = models["path-tracing"].ask({}, {one: engine.Shift(1.0)}, [other])
    assert moved.change(other)[0] == pytest.approx(told["value"], abs=told["tolerance"])
