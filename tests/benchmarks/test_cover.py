"""Processor time of exact covers, beside the same programme by default settings.

Only what is proved is asserted; times are printed and written as JSON.
"""

import json
import platform
import random
import statistics
import sys
import time

import numpy as np
import pytest
from scipy.optimize import Bounds, LinearConstraint, milp

from panelkit import cheapest_cover

pytestmark = pytest.mark.bench

SIZES = {"48 by 60": (48, 60), "96 by 60": (96, 60), "200 by 60": (200, 60)}
N_PROBLEMS = 5


def problem(markers, kits, seed):
    """Kits of four markers to an eighth of all, in cents; single assays for all."""
    draw = random.Random(seed)
    names = [f"m{i:03d}" for i in range(markers)]
    offered = [
        {
            "id": f"k{i:02d}",
            "markers": draw.sample(names, draw.randint(4, max(5, markers // 8))),
            "cost": draw.randint(50_000, 400_000),
        }
        for i in range(kits)
    ]
    return names, offered, {name: draw.randint(30_000, 90_000) for name in names}


def bare(names, offered, singles):
    """The same integer programme once, with the solver's default gap and no ties."""
    place = {name: i for i, name in enumerate(names)}
    rows = np.zeros((len(names), len(offered) + len(names)))
    for k, kit in enumerate(offered):
        rows[[place[name] for name in kit["markers"]], k] = 1
    rows[:, len(offered) :] = np.eye(len(names))
    costs = np.array([kit["cost"] for kit in offered] + [singles[n] for n in names])
    answer = milp(
        costs,
        integrality=np.ones(len(costs), dtype=int),
        bounds=Bounds(0, 1),
        constraints=LinearConstraint(rows, 1, np.inf),
    )
    return int(costs[answer.x > 0.5].sum())


@pytest.mark.parametrize("name", SIZES)
def test_covers_are_proved(name, results_folder, capsys):
    seconds, ratios = [], []
    for seed in range(N_PROBLEMS):
        given = problem(*SIZES[name], seed)
        start = time.process_time()
        cover = cheapest_cover(*given)
        ours = time.process_time() - start
        start = time.process_time()
        reference = bare(*given)
        theirs = time.process_time() - start
        assert cover.proved
        assert cover.cost <= reference  # their default gap may leave it dearer
        seconds.append(ours)
        ratios.append(ours / theirs)
    found = {
        "seconds": [round(each, 3) for each in seconds],
        "median_seconds": round(statistics.median(seconds), 3),
        "ratio_to_bare_solver": round(statistics.median(ratios), 2),
        "machine": platform.machine(),
    }
    (results_folder / f"cover_{name.replace(' ', '_')}.json").write_text(
        json.dumps(found, indent=2)
    )
    with capsys.disabled():
        sys.stdout.write(f"\ncover {name}: {json.dumps(found)}\n")
