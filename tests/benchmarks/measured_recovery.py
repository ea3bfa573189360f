"""Measures how much of what generated a table learning finds again; prints a line of JSON a network.

python -m tests.benchmarks.measured_recovery                     12 networks, 10,000 records
python -m tests.benchmarks.measured_recovery 3                   the first 3 of them
python -m tests.benchmarks.measured_recovery 12 1000 skewed logistic
"""

import json
import sys
import time
from dataclasses import asdict, dataclass

import numpy as np

from engine.learning.learn import learn
from engine.network.scoring import log_score
from engine.records.table import Table
from tests.benchmarks.mixed_networks import generated

SIZES = (10, 16, 24, 37, 13, 19, 20, 22, 27, 30, 33, 37)  # columns
HELD_OUT = 10_000


@dataclass(frozen=True)
class Recovery:
    """short: nats a held-out row below the generating model.  share: of its gain over independent columns.

    precision, recall: of links, whichever way inside a stage.  seconds: of one processor, with held-out folds.
    """

    columns: int
    links: int
    found: int
    short: float
    share: float
    precision: float
    recall: float
    seconds: float


def recovery(columns: int, seed: int, rows: int, **shape: bool) -> Recovery:
    truth = generated(columns, seed, **shape)
    cells = truth.sample(rows + HELD_OUT, np.random.default_rng([seed, 1]))
    seen, unseen = truth.frame(cells[:rows]), truth.frame(cells[rows:])
    began = time.process_time()
    learned = learn(Table.from_frame(seen), truth.order, max_parents=3)
    seconds = time.process_time() - began
    told = truth.log_score(cells[rows:]).mean()
    network = learned.network()
    reached = log_score(network, unseen[list(network.names)]).mean()
    apart = log_score(learned.network(0), unseen[list(network.names)]).mean()
    real, found = ({frozenset(link) for link in links} for links in (truth.links, network.links))
    both = len(real & found)
    return Recovery(
        columns=columns,
        links=len(real),
        found=len(found),
        short=float(told - reached),
        share=float((reached - apart) / (told - apart)),
        precision=both / max(len(found), 1),
        recall=both / max(len(real), 1),
        seconds=seconds,
    )


if __name__ == "__main__":
    networks = int(sys.argv[1]) if len(sys.argv) > 1 else len(SIZES)
    records = int(sys.argv[2]) if len(sys.argv) > 2 else 10_000
    shape = {word: True for word in sys.argv[3:]}
    for place in range(networks):
        print(json.dumps(asdict(recovery(SIZES[place], place, records, **shape))), flush=True)
