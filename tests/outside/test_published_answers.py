"""Published examples of seeing and setting, each figure beside its source. Tolerance 1e-9: exact but for rounding."""

import math

import pytest

import engine

NO_YES = ["no", "yes"]


def model(*nodes):
    return engine.Model.from_network([engine.Category(*node) for node in nodes])


def evidence(answer):
    return math.exp(answer.log_evidence)


def share(answer, world, column, level):
    return getattr(answer[column], world).shares[level]


# Charig, Webb, Payne & Wickham 1986, Comparison of treatment of renal calculi by open surgery, percutaneous
# nephrolithotomy, and extracorporeal shockwave lithotripsy, BMJ 292; the reversal in Julious & Mullee 1994,
# Confounding and Simpson's paradox, BMJ 309. Published counts: size, treatment, success, patients.
KIDNEY_STONES = [
    ("small", "A", "yes", 81),
    ("small", "A", "no", 6),
    ("large", "A", "yes", 192),
    ("large", "A", "no", 71),
    ("small", "B", "yes", 234),
    ("small", "B", "no", 36),
    ("large", "B", "yes", 55),
    ("large", "B", "no", 25),
]


def kidney_stones():
    return model(
        ("size", ["large", "small"], [], [343 / 700, 357 / 700]),
        ("treatment", ["A", "B"], ["size"], [[263 / 343, 80 / 343], [87 / 357, 270 / 357]]),
        (
            "success",
            NO_YES,
            ["size", "treatment"],
            [[[71 / 263, 192 / 263], [25 / 80, 55 / 80]], [[6 / 87, 81 / 87], [36 / 270, 234 / 270]]],
        ),
    )


@pytest.mark.parametrize(
    ("pins", "levers", "world", "expected", "probability"),
    [
        ({}, {}, "recorded", 0.802857142857, 1.0),
        ({"treatment": "A"}, {}, "among", 0.78, 0.5),
        ({"treatment": "B"}, {}, "among", 0.825714285714, 0.5),
        ({}, {"treatment": "A"}, "set", 0.832546217386, 1.0),
        ({}, {"treatment": "B"}, "set", 0.778875, 1.0),
        ({"size": "small"}, {"treatment": "A"}, "set", 0.931034482759, 0.51),
    ],
)
def test_kidney_stones_turn_round_when_the_treatment_is_set(pins, levers, world, expected, probability):
    answer = kidney_stones().ask(pins, {lever: engine.Fix(level) for lever, level in levers.items()}, ["success"])
    assert share(answer, world, "success", "yes") == pytest.approx(expected, abs=1e-9)
    assert evidence(answer) == pytest.approx(probability, rel=1e-6)


# Bickel, Hammel & O'Connell 1975, Sex bias in graduate admissions: data from Berkeley, Science 187; the six largest
# departments as tabulated in Freedman, Pisani & Purves 1978, Statistics. Published counts:
# department -> (men admitted, men refused, women admitted, women refused).
ADMISSIONS = {
    "A": (512, 313, 89, 19),
    "B": (353, 207, 17, 8),
    "C": (120, 205, 202, 391),
    "D": (138, 279, 131, 244),
    "E": (53, 138, 94, 299),
    "F": (22, 351, 24, 317),
}


def admissions():
    counts = list(ADMISSIONS.values())
    total = sum(map(sum, counts))
    return model(
        ("department", list(ADMISSIONS), [], [sum(row) / total for row in counts]),
        ("gender", ["female", "male"], ["department"], [_shares(c + d, a + b) for a, b, c, d in counts]),
        (
            "admitted",
            NO_YES,
            ["department", "gender"],
            [[_shares(d, c), _shares(b, a)] for a, b, c, d in counts],
        ),
    )


def _shares(*counts):
    return [count / sum(counts) for count in counts]


@pytest.mark.parametrize(
    ("pins", "levers", "world", "expected", "probability"),
    [
        ({"gender": "male"}, {}, "among", 0.445187662579, 0.594564737075),
        ({"gender": "female"}, {}, "among", 0.303542234332, 0.405435262925),
        ({}, {"gender": "male"}, "set", 0.387318582689, 1.0),
        ({}, {"gender": "female"}, "set", 0.429955380461, 1.0),
        ({"gender": "male", "department": "A"}, {}, "among", 0.620606060606, 0.182280159081),
    ],
)
def test_admissions_standardise_over_departments(pins, levers, world, expected, probability):
    # Setting gender is the arithmetic of direct standardisation, not a policy.
    answer = admissions().ask(pins, {lever: engine.Fix(level) for lever, level in levers.items()}, ["admitted"])
    assert share(answer, world, "admitted", "yes") == pytest.approx(expected, abs=1e-9)
    assert evidence(answer) == pytest.approx(probability, rel=1e-6)


@pytest.mark.parametrize(("gender", "expected"), [("male", 0.445187662579), ("female", 0.303542234332)])
def test_admissions_with_gender_first_read_the_crude_share(gender, expected):
    counts = list(ADMISSIONS.values())
    men, women = ([sum(row[place : place + 2]) for row in counts] for place in (0, 2))
    other_order = model(
        ("gender", ["female", "male"], [], _shares(sum(women), sum(men))),
        ("department", list(ADMISSIONS), ["gender"], [_shares(*women), _shares(*men)]),
        (
            "admitted",
            NO_YES,
            ["gender", "department"],
            [[_shares(d, c) for _, _, c, d in counts], [_shares(b, a) for a, b, _, _ in counts]],
        ),
    )
    answer = other_order.ask({}, {"gender": engine.Fix(gender)}, ["admitted"])
    assert share(answer, "set", "admitted", "yes") == pytest.approx(expected, abs=1e-9)


# Lauritzen & Spiegelhalter 1988, Local computations with probabilities on graphical structures and their application
# to expert systems, JRSS B 50. The published network; answers by enumeration.
def chest_clinic():
    return model(
        ("visit", NO_YES, [], [0.99, 0.01]),
        ("smoke", NO_YES, [], [0.5, 0.5]),
        ("tub", NO_YES, ["visit"], [[0.99, 0.01], [0.95, 0.05]]),
        ("lung", NO_YES, ["smoke"], [[0.99, 0.01], [0.9, 0.1]]),
        ("bronc", NO_YES, ["smoke"], [[0.7, 0.3], [0.4, 0.6]]),
        ("either", NO_YES, ["tub", "lung"], [[[1.0, 0.0], [0.0, 1.0]], [[0.0, 1.0], [0.0, 1.0]]]),
        ("xray", NO_YES, ["either"], [[0.95, 0.05], [0.02, 0.98]]),
        ("dysp", NO_YES, ["either", "bronc"], [[[0.9, 0.1], [0.2, 0.8]], [[0.3, 0.7], [0.1, 0.9]]]),
    )


YES = "yes"


@pytest.mark.parametrize(
    ("pins", "probability", "expected"),
    [
        (
            {},
            1.0,
            {
                "visit": 0.01,
                "smoke": 0.5,
                "tub": 0.0104,
                "lung": 0.055,
                "bronc": 0.45,
                "either": 0.064828,
                "xray": 0.11029004,
                "dysp": 0.4359706,
            },
        ),
        (
            {"dysp": YES},
            0.4359706,
            {
                "tub": 0.0188453074588,
                "lung": 0.102759222755,
                "bronc": 0.83396733633,
                "smoke": 0.633996879606,
                "visit": 0.0103249508109,
            },
        ),
        (
            {"visit": YES, "dysp": YES},
            0.004501375,
            {"tub": 0.0877509649829, "lung": 0.0995251450946, "bronc": 0.811402071589},
        ),
        (
            {"visit": YES, "dysp": YES, "xray": YES},
            0.00098822675,
            {"tub": 0.391711720008, "lung": 0.444270507755, "bronc": 0.628821775974, "either": 0.813768702375},
        ),
        (
            {"visit": YES, "dysp": YES, "xray": "no", "smoke": YES},
            0.00212374,
            {"tub": 0.00193055647113, "lung": 0.00386111294226, "bronc": 0.9215958639},
        ),
    ],
)
def test_chest_clinic_seen(pins, probability, expected):
    answer = chest_clinic().ask(pins, watch=list(expected))
    assert evidence(answer) == pytest.approx(probability, rel=1e-6)
    for column, value in expected.items():
        assert share(answer, "among", column, YES) == pytest.approx(value, abs=1e-9)


@pytest.mark.parametrize(
    ("pins", "levers", "probability", "expected"),
    [
        ({}, {"smoke": YES}, 1.0, {"dysp": 0.552808, "lung": 0.1, "xray": 0.1517048}),
        ({"smoke": YES}, {"bronc": "no"}, 0.5, {"dysp": 0.165616, "smoke": 1.0}),
        ({}, {"either": YES}, 1.0, {"dysp": 0.79, "xray": 0.98, "tub": 0.0104}),
    ],
)
def test_chest_clinic_set(pins, levers, probability, expected):
    fixes = {column: engine.Fix(level) for column, level in levers.items()}
    answer = chest_clinic().ask(pins, fixes, watch=list(expected))
    assert evidence(answer) == pytest.approx(probability, rel=1e-6)
    for column, value in expected.items():
        assert share(answer, "set", column, YES) == pytest.approx(value, abs=1e-9)


def test_chest_clinic_refuses_what_cannot_be():
    with pytest.raises(
        engine.Refusal, match="No record in this model can have “lung” = “yes” and “either” = “no” together"
    ):
        chest_clinic().ask({"lung": YES, "either": "no", "smoke": YES}, watch=["dysp"])


# A textbook network, e.g. Russell & Norvig 1995, Artificial Intelligence: A Modern Approach; answers by enumeration.
def wet_grass():
    return model(
        ("cloudy", NO_YES, [], [0.5, 0.5]),
        ("sprinkler", NO_YES, ["cloudy"], [[0.5, 0.5], [0.9, 0.1]]),
        ("rain", NO_YES, ["cloudy"], [[0.8, 0.2], [0.2, 0.8]]),
        ("wet", NO_YES, ["sprinkler", "rain"], [[[1.0, 0.0], [0.1, 0.9]], [[0.1, 0.9], [0.01, 0.99]]]),
    )


@pytest.mark.parametrize(
    ("pins", "levers", "world", "probability", "expected"),
    [
        ({}, {}, "recorded", 1.0, {"wet": 0.6471}),
        ({"wet": YES}, {}, "among", 0.6471, {"sprinkler": 0.429763560501, "rain": 0.70792767733}),
        ({"wet": YES, "rain": YES}, {}, "among", 0.4581, {"sprinkler": 0.194499017682}),
        ({"sprinkler": YES}, {}, "among", 0.3, {"wet": 0.927, "cloudy": 0.166666666667, "rain": 0.3}),
        ({}, {"sprinkler": YES}, "set", 1.0, {"wet": 0.945, "cloudy": 0.5, "rain": 0.5}),
    ],
)
def test_wet_grass_seen_and_set(pins, levers, world, probability, expected):
    fixes = {column: engine.Fix(level) for column, level in levers.items()}
    answer = wet_grass().ask(pins, fixes, watch=list(expected))
    assert evidence(answer) == pytest.approx(probability, rel=1e-6)
    for column, value in expected.items():
        assert share(answer, world, column, YES) == pytest.approx(value, abs=1e-9)


def test_wet_grass_refuses_what_cannot_be():
    with pytest.raises(engine.Refusal, match="can have “wet” = “yes”, “rain” = “no” and “sprinkler” = “no” together"):
        wet_grass().ask({"wet": YES, "rain": "no", "sprinkler": "no"}, watch=["cloudy"])


# Pearl 2000, Causality, section 3.3 (the invented numbers of its table): what is seen, which needs no unrecorded cause.
# smoker, tar -> (with cancer, without).
FRONT_DOOR = {("no", "no"): (190, 1710), ("no", YES): (5, 95), (YES, "no"): (90, 10), (YES, YES): (1615, 285)}


@pytest.mark.parametrize(("smoker", "expected"), [(YES, 0.8525), ("no", 0.0975)])
def test_front_door_seen(smoker, expected):
    held = {pair: sum(counts) for pair, counts in FRONT_DOOR.items()}
    smokers = [sum(held[who, tar] for tar in NO_YES) for who in NO_YES]
    seen = model(
        ("smoker", NO_YES, [], _shares(*smokers)),
        ("tar", NO_YES, ["smoker"], [_shares(*(held[who, tar] for tar in NO_YES)) for who in NO_YES]),
        (
            "cancer",
            NO_YES,
            ["smoker", "tar"],
            [[_shares(*FRONT_DOOR[who, tar][::-1]) for tar in NO_YES] for who in NO_YES],
        ),
    )
    answer = seen.ask({"smoker": smoker}, watch=["cancer"])
    assert share(answer, "among", "cancer", YES) == pytest.approx(expected, abs=1e-9)


# Fix with reach on an invented network, arithmetic by hand; stochastic settings: Pearl 2000, Causality, section 4.2;
# Dawid & Didelez 2010, Identifying the consequences of dynamic treatment strategies, Statistics Surveys 4.
def visits():
    return model(
        ("district", ["north", "south"], [], [0.6, 0.4]),
        ("visit", NO_YES, ["district"], [[0.7, 0.3], [0.4, 0.6]]),
        ("repaid", NO_YES, ["district", "visit"], [[[0.5, 0.5], [0.3, 0.7]], [[0.6, 0.4], [0.45, 0.55]]]),
    )


@pytest.mark.parametrize(
    ("pins", "reach", "world", "probability", "expected"),
    [
        ({}, None, "recorded", 1.0, {"repaid": 0.532}),
        ({"visit": YES}, None, "among", 0.42, {"repaid": 0.614285714286}),
        ({}, 1.0, "set", 1.0, {"repaid": 0.64, "visit": 1.0}),
        ({}, 0.5, "set", 1.0, {"repaid": 0.586, "visit": 0.71}),
        ({"district": "south"}, 1.0, "set", 0.4, {"repaid": 0.55}),
        ({"district": "south"}, 0.5, "set", 0.4, {"repaid": 0.52, "visit": 0.8}),
    ],
)
def test_levers_with_reach_by_hand(pins, reach, world, probability, expected):
    levers = {} if reach is None else {"visit": engine.Fix(YES, reach=reach)}
    answer = visits().ask(pins, levers, watch=["repaid", "visit", "district"])
    assert evidence(answer) == pytest.approx(probability, rel=1e-6)
    for column, value in expected.items():
        assert share(answer, world, column, YES) == pytest.approx(value, abs=1e-9)


def test_who_was_visited_lives_more_often_in_the_south():
    answer = visits().ask({"visit": YES}, watch=["district"])
    assert share(answer, "among", "district", "south") == pytest.approx(0.571428571429, abs=1e-9)
