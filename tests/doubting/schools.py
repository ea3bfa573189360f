"""Worlds that several checks are tried on."""

import engine
from tests.doubting.worlds import repeated, world

STAGES = [("Before", ["shift"]), ("Offer", ["mentor"]), ("After", ["passed"])]
LINKS = [("shift", "mentor"), ("shift", "passed"), ("mentor", "passed")]


def school(nights_with_mentor, days_with_mentor=100, nights=200):
    """Learners on days and nights; half of any group passes."""
    groups = []
    for shift, total, offered in (("days", 300, days_with_mentor), ("nights", nights, nights_with_mentor)):
        for mentor, count in (("yes", offered), ("no", total - offered)):
            half = count // 2
            groups.append((half, {"shift": shift, "mentor": mentor, "passed": "yes"}))
            groups.append((count - half, {"shift": shift, "mentor": mentor, "passed": "no"}))
    return world(repeated(*groups), LINKS, STAGES, {"passed": "yes"}, ["mentor"])


def offer(model, pins=None, **rest):
    return model.ask(pins, {"mentor": engine.Fix("yes", **rest)}, draws=50)


def halves(times):
    return [(times // 2, "yes"), (times - times // 2, "no")]


def settling(links, stages=None):
    """Columns x, m, y, z with dependence along `links`, whose directions only `stages` may settle."""
    rows = repeated(
        *[
            (20 + 10 * (x == m) + 10 * (m == y) + 10 * (x == z), {"x": x, "m": m, "y": y, "z": z})
            for x in "ab"
            for m in "ab"
            for y in "ab"
            for z in "ab"
        ]
    )
    return world(rows, links, stages or [("All", ["x", "m", "y", "z"])], {"y": "a"})


def hidden_beside(nights_with_mentor, outcome=None):
    """A school where five learners on early shifts hide how many there are on nights."""
    model = school(nights_with_mentor)
    groups = [(5, {"shift": "early", "mentor": "no", "passed": "no"})]
    for row in zip(*(model.coded.codes[:, place] for place in range(3)), strict=True):
        levels = (model.coded.levels[place][code] for place, code in enumerate(row))
        groups.append((1, dict(zip(model.coded.names, levels, strict=True))))
    return world(repeated(*groups), LINKS, STAGES, outcome or {"passed": "yes"}, ["mentor"])
