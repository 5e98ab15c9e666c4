"""Speed and memory of the engine beside other solvers; only accuracy is asserted.

Each job runs in a process of its own (`jobs.py`), prints its figures and writes them
as JSON.
"""

import importlib.util
import json
import sys
from pathlib import Path

import pytest

pytestmark = pytest.mark.bench

GOAL = 1e-6
ROUNDING = 1e-9  # of a violation recomputed in another order of sums
JOBS = {
    # job: libraries it cannot do without
    "binomial_stop": ("celer", "skglm", "sklearn"),
    "binomial_whole": ("celer", "skglm"),
    "binomial_deep": ("celer", "skglm"),
    "families": (),
    "wide": (),
    "one_path": (),
    "folds": (),
    "compilation": (),
    "growth": (),
    "checks": (),
}
SAME_PROBLEM = ("skglm",)  # fits an intercept as we do; the others fit none


def _measure():
    path = Path(__file__).with_name("measure.py")
    specification = importlib.util.spec_from_file_location("bench_measure", path)
    module = importlib.util.module_from_spec(specification)
    specification.loader.exec_module(module)
    return module


def _every_kkt(found):
    kkt = found.get("kkt", {})
    return [kkt] if "certificate" in kkt else list(kkt.values())


@pytest.mark.parametrize("job", JOBS)
def test_job(job, results_folder, capsys):
    for library in JOBS[job]:
        pytest.importorskip(library)
    found = _measure().run_job(job, results_folder)
    shown = {
        key: value
        for key, value in found.items()
        if key.startswith(("median", "ratio", "peak", "exponent", "objective", "kkt"))
    }
    with capsys.disabled():
        sys.stdout.write(f"\n{job}: {json.dumps(shown, indent=1)}\n")
    if "skipped" in found:
        pytest.skip(found["skipped"])
    for kkt in _every_kkt(found):
        assert kkt["certificate"] <= GOAL
        assert kkt["recomputed"] <= GOAL + ROUNDING
    for library, gap in found.get("objective_gap", {}).items():
        if library in SAME_PROBLEM:
            assert abs(gap) <= GOAL
        else:  # without an intercept the optimum cannot be lower
            assert gap >= -GOAL
