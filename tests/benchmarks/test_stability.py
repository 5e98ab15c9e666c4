"""Speed of the shortlist beside the bare fits of the same subsamples.

Nothing asserts a time; the figures are printed and written as JSON. The ratio says what
counting, grouping and shuffling add to the fits.
"""

import importlib.util
import json
import os
import sys
import time
from pathlib import Path

import numpy as np
import pytest

from panelkit.fits import ArraySource, fit_paths
from panelkit.runtime import MemoryStore
from panelkit.stability import (
    ShortlistRules,
    draw_pairs,
    select_markers,
    shuffle_null,
)

pytestmark = pytest.mark.bench

N, P, N_PAIRS = 79, 12_625, 50
THREADS = 2


def _circumstances():
    path = Path(__file__).with_name("measure.py")
    specification = importlib.util.spec_from_file_location("bench_measure", path)
    module = importlib.util.module_from_spec(specification)
    specification.loader.exec_module(module)
    return module.circumstances()


@pytest.fixture(scope="module")
def cohort():
    draws = np.random.default_rng(0)
    X = draws.normal(size=(N, P)).astype(np.float32)
    y = (np.arange(N) % 2) * 1.0
    X[:, :5] += (1.2 * y[:, None]).astype(np.float32)
    rows = np.arange(N)
    return ArraySource(X), y, rows, draw_pairs(rows, rows, y, N_PAIRS, draws)


def seconds(task, repeats=3):
    """Return the shortest time of some rounds, and what the last one gave."""
    taken, given = [], None
    for _ in range(repeats):
        start = time.perf_counter()
        given = task()
        taken.append(time.perf_counter() - start)
    return min(taken), given


@pytest.mark.parametrize("shuffles", [50, 999])
def test_shortlist_and_shuffles(cohort, shuffles, results_folder, capsys):
    source, y, rows, plan = cohort
    rules, ones = ShortlistRules(), np.ones(N)

    def select():
        return select_markers(source, y, rows, rows, ones, plan, rules, threads=THREADS)

    observed = select()
    fits, _ = seconds(
        lambda: fit_paths(
            source, y, subsamples=plan.rows, n_penalties=rules.n_penalties,
            penalty_floor=rules.penalty_floor, max_markers=observed.bound.asked,
            threads=THREADS,
        )
    )  # fmt: skip
    whole, _ = seconds(select)
    told, before = [], time.process_time()
    null_time, null = seconds(
        lambda: shuffle_null(
            source, y, rows, rows, ones, rules, observed, n_shuffles=shuffles, seed=1,
            inputs="benchmark", store=MemoryStore(), threads=THREADS,
            listener=told.append,
        ),
        repeats=1,
    )  # fmt: skip
    processor = time.process_time() - before
    found = {
        "sizes": {"n": N, "p": P, "subsamples": 2 * N_PAIRS, "shuffles": shuffles},
        "load": list(os.getloadavg()),
        "fits_s": fits,
        "shortlist_s": whole,
        "ratio_shortlist_to_fits": whole / fits,
        "shuffles_s": null_time,
        "shuffles_processor_s": processor,
        "seconds_a_shuffle": null_time / shuffles,
        "ratio_shuffle_to_shortlist": null_time / shuffles / whole,
        **_circumstances(),
    }
    path = results_folder / f"stability_{shuffles}.json"
    path.write_text(json.dumps(found, indent=1))
    with capsys.disabled():
        sys.stdout.write(f"\n{json.dumps(found, indent=1)}\n")
    assert null.n_shuffles == shuffles
    assert len(told) == -(-shuffles // 5)
    assert told[-1].done == told[-1].total
