"""Cost of a fold's preparation beside its fits.

Run as `preparation_jobs.py FILE [FEATURES [REPEATS]]`.
"""

import sys
import time
from pathlib import Path

import measure
import numpy as np
from designs import cohort, halves

from panelkit.fits import fit_paths
from panelkit.preparation import Recipe
from panelkit.records import RecipeContext

THREADS = 2
SUBSAMPLES = 100
STOPPED = {"n_penalties": 40, "penalty_floor": 0.1, "max_markers": 60}
FILLED = ("filter", "median-fill")
RECIPES = {  # by what the values are; the first of each kind is the default
    "logarithms": {
        "default": FILLED,
        "below limit": ("filter", "below-limit"),
        "batches": ("batch-centre", *FILLED),
        "references": ("reference-ratio", *FILLED),
        "median difference": ("median-difference", *FILLED),
        "variance": ("filter", {"step": "variance", "number": 5000}, "median-fill"),
        "quantile": ("quantile", *FILLED),
    },
    "counts": {
        "default": ("log-cpm", *FILLED),
        "median of ratios": ("median-of-ratios", *FILLED),
        "upper quartile": ("upper-quartile", *FILLED),
        "trimmed mean": ("trimmed-mean", *FILLED),
    },
}


def known(p, n):
    """Return batches and references."""
    role = np.full(p, "marker", object)
    role[:8] = "reference"
    return RecipeContext(
        role=role, batch=np.array([f"plate {i % 4}" for i in range(n)], object)
    )


def timed(recipe, base, training, context, repeats=1):
    """Return the times of preparing one fold, and the last view."""
    barred = np.full(len(base), "", object)
    times, processor, peak, view = [], [], 0, None
    for _ in range(repeats):
        del view
        measure.forget_peak()
        before, start = time.process_time(), time.perf_counter()
        view = recipe.prepare(base, training, barred, context)[1]
        times.append(time.perf_counter() - start)
        processor.append(time.process_time() - before)
        peak = max(peak, measure.peak_bytes())
    figures = {
        "times_s": times,
        "processor_s": processor,
        "peak_over_matrix": peak / base.nbytes,
    }
    return figures, view


def timed_fits(view, y, settings, repeats):
    """Return the times of the fits of one fold."""
    times, processor = [], []
    for _ in range(repeats):
        before = time.process_time()
        times.append(measure.seconds(lambda: fit_paths(view, y, **settings))[0])
        processor.append(time.process_time() - before)
    return {"times_s": times, "processor_s": processor}


def preparation(p=850_000, n=400, repeats=3):
    """Return seconds of learning and viewing, each recipe over the fits of that fold.

    The fits are those of the engine's job `wide`: 100 halves of the training rows,
    stopped at 60 markers, on the default recipe's view.
    """
    if (free := measure.free_bytes()) is not None and free < 3.2 * n * p * 4:
        return {"skipped": f"{free / 2**30:.1f} GiB free"}
    base, y, labels = cohort(n, p)
    context = known(p, n)
    training = np.flatnonzero(np.arange(n) % 5 != 0)
    subsamples = halves(labels, SUBSAMPLES, among=training)
    settings = {"subsamples": subsamples, "threads": THREADS, **STOPPED}
    small = timed(Recipe(FILLED), base[:500], training, known(500, n))[1]
    fit_paths(small, y, **settings)  # compiles
    found = {}
    for kind, recipes in RECIPES.items():
        if kind == "counts":
            for start in range(0, p, 4096):
                tile = base[start : start + 4096]
                np.rint(np.exp2(tile + 6.0), out=tile)
        for name, steps in recipes.items():
            figures, view = timed(Recipe(steps), base, training, context, repeats)
            found[f"{kind}, {name}"] = figures
            if name == "default":
                fits = timed_fits(view, y, settings, repeats)
                found[f"{kind}, fits"] = fits
            del view
            for clock in ("times_s", "processor_s"):
                figures[f"ratio_to_fits, {clock}"] = min(figures[clock]) / min(
                    fits[clock]
                )
            sys.stderr.write(f"{kind}, {name}: {figures}; fits: {fits}\n")
    return {"sizes": {"n": n, "p": p, "subsamples": SUBSAMPLES}, "recipes": found}


if __name__ == "__main__":
    words = dict(zip(("p", "repeats"), map(int, sys.argv[2:]), strict=False))
    measure.write_json(Path(sys.argv[1]), "preparation", preparation(**words))
