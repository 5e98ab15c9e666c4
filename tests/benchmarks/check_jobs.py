"""The checks of a cohort beside the fits that follow them."""

import measure
import numpy as np
from designs import cohort, halves

from panelkit.fits import fit_paths
from panelkit.ingest import check_cohort
from panelkit.records import Cohort, Design, Findings, Outcome

SHAPES = {"79 x 12,625": (79, 12_625), "400 x 850,000": (400, 850_000)}
STOPPED = {"n_penalties": 40, "penalty_floor": 0.1, "max_markers": 60}
GAPS = 0.01


def _cohort(base, y):
    features, samples = base.shape
    names = np.array([f"S{number}" for number in range(samples)], dtype=object)
    return Cohort(
        values=base,
        features=np.array([f"cg{number:08d}" for number in range(features)], object),
        samples=names,
        outcome=Outcome("binary", "response", "no", "yes", y),
        design=Design(
            np.arange(samples),
            names,
            np.full(samples, 1 / samples),
            batch=np.array([f"plate {k % 4}" for k in range(samples)], dtype=object),
        ),
        sample_columns={},
        feature_columns={},
        findings=Findings(),
    )


def checks():
    """Return the time of all checks against 100 stopped refits of the same matrix."""
    found = {"sizes": {"subsamples": 100, "gaps": GAPS, **STOPPED}}
    small, y, labels = cohort(60, 500)
    fit_paths(small.T, y, subsamples=halves(labels, 4), **STOPPED)  # compiles
    check_cohort(_cohort(small, y))  # imports
    for name, (n, p) in SHAPES.items():
        needed = int(1.8 * n * p * 4)
        if (free := measure.free_bytes()) is not None and free < needed:
            found[f"skipped_{name}"] = f"{free / 2**30:.1f} GiB free"
            continue
        base, y, labels = cohort(n, p)
        subsamples = halves(labels, 100)
        whole = _cohort(base, y)
        idle = measure.peak_bytes()
        measure.forget_peak()
        check_cohort(whole)
        peak = measure.peak_bytes()
        tasks = {
            "checks": lambda turn, whole=whole: check_cohort(whole),
            "fits": lambda turn, base=base, y=y, subsamples=subsamples: fit_paths(
                base.T, y, subsamples=subsamples, threads=2, **STOPPED
            ),
        }
        times, _ = measure.alternate(tasks, 3)
        medians = measure.medians(times)
        rng = np.random.default_rng(0)
        base[rng.integers(0, p, int(GAPS * p)), rng.integers(0, n, int(GAPS * p))] = (
            np.nan
        )
        gappy, _ = measure.seconds(lambda whole=whole: check_cohort(whole))
        found[f"median_s {name}"] = {**medians, "checks, with gaps": gappy}
        found[f"ratio {name}"] = measure.paired_ratio(times["checks"], times["fits"])
        found[f"peak_bytes {name}"] = {
            "idle": idle,
            "checks": peak,
            "matrix": base.nbytes,
        }
        del base, whole, tasks
    return found
