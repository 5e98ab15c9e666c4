"""The benchmark jobs; each runs in a process of its own: `jobs.py NAME FILE`."""

import os
import statistics
import subprocess
import sys
import tempfile
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

import measure
import numpy as np
from accuracy import certified, objective, solutions_of
from check_jobs import checks
from designs import cohort, halves
from peers import GOAL, Draw, choose
from threadpoolctl import threadpool_limits

from panelkit.fits import engine, fit_paths
from panelkit.fits.product import TILE

THREADS = 2
SUBSAMPLES = 100
SAMPLE = (0, 1, 2)  # refits that peers solve and whose violations are recomputed
TO_A_TENTH = {"n_penalties": 40, "penalty_floor": 0.1}
STOPPED = {**TO_A_TENTH, "max_markers": 60}
DEEP = {"n_penalties": 100, "penalty_floor": 0.01}
FAMILIES = ("binomial", "gaussian", "cox", "multinomial")


def against_peers(options, libraries, repeats=6):
    """Return times of 100 refits, and of peers on some draws, extrapolated to 100."""
    base, y, labels = cohort(200, 20_000)
    subsamples = halves(labels, SUBSAMPLES)

    def fit(matrix=base, threads=THREADS):
        return fit_paths(matrix.T, y, subsamples=subsamples, threads=threads, **options)

    paths = fit()
    peak = measure.peak_bytes()
    double = base.astype(np.float64)
    fit(double)
    draws = {}
    for b in SAMPLE:
        penalties, _ = solutions_of(paths, base, subsamples[b], b)
        draws[b] = Draw(base, y, subsamples[b], penalties)
    tasks = {
        "panelkit": lambda turn: fit(),
        "panelkit, one thread": lambda turn: fit(threads=1),
        "panelkit, float64": lambda turn: fit(double),
    }
    chosen, agreement = {}, {}
    for library in libraries:
        found = {b: choose(library, draw) for b, draw in draws.items()}
        chosen[library] = {b: entry for b, (_, entry, _) in found.items()}
        agreement[library] = max(
            _objective_gap(paths, draws[b], subsamples[b], b, answer)
            for b, (_, _, answer) in found.items()
        )

        def run(turn, found=found):
            b = SAMPLE[turn % len(SAMPLE)]
            peer, entry, _ = found[b]
            draws[b].run(peer, entry["tolerance"])

        few = len(SAMPLE) if library == "liblinear" else repeats
        tasks[library] = measure.rounds(few)(run)
    times, processor = measure.alternate(tasks, repeats)
    ratios, processor_ratios = {}, {}
    for library in libraries:
        for ours in list(tasks)[:3]:
            pair = f"{library} / {ours}"
            ratios[pair] = _ratio_for_all(times, library, ours)
            processor_ratios[pair] = _ratio_for_all(processor, library, ours)
    return {
        "sizes": {"n": 200, "p": 20_000, "subsamples": SUBSAMPLES, **options},
        "peer_draws": len(SAMPLE),
        "times_s": times,
        "median_s": measure.medians(times),
        "processor_s": processor,
        "median_processor_s": measure.medians(processor),
        "ratio_for_100_refits": ratios,
        "ratio_of_processor_times": processor_ratios,
        "peer_settings": chosen,
        "objective_gap": agreement,
        "kkt": certified(paths, base, y, subsamples, SAMPLE),
        "peak_bytes": peak,
    }


def _ratio_for_all(times, library, ours):
    peer = [SUBSAMPLES * each for each in times[library]]
    return measure.paired_ratio(peer, times[ours])


def _objective_gap(paths, draw, rows, b, answer):
    """Return how far the peer's objective is above ours at worst, relative."""
    penalties, ours = solutions_of(paths, draw.base, rows, b)
    theirs = draw.solutions(answer)[1]
    gaps = []
    for penalty, own, other in zip(penalties, ours, theirs, strict=True):
        a = objective("binomial", draw.outcome, rows, penalty, own)
        c = objective("binomial", draw.outcome, rows, penalty, other)
        gaps.append((c - a) / a)
    return float(max(gaps, key=abs))


def binomial_stop():
    """Return job a."""
    return against_peers(STOPPED, ("celer", "skglm", "liblinear"))


def binomial_whole():
    """Return job b, to 0.1."""
    return against_peers(TO_A_TENTH, ("celer", "skglm"))


def binomial_deep():
    """Return job b, 100 penalties to 0.01."""
    return against_peers(DEEP, ("celer", "skglm"), repeats=6)


def families():
    """Return job c: the families' times over the binomial time of the same round."""
    tasks, kkt = {}, {}
    for family in FAMILIES:
        base, outcome, labels = cohort(200, 20_000, family)
        subsamples = halves(labels, SUBSAMPLES)

        def run(turn, base=base, outcome=outcome, subsamples=subsamples, family=family):
            return fit_paths(
                base.T,
                outcome,
                subsamples=subsamples,
                family=family,
                threads=THREADS,
                **STOPPED,
            )

        kkt[family] = certified(run(0), base, outcome, subsamples, SAMPLE)
        tasks[family] = run
    times, processor = measure.alternate(tasks, 7)
    return {
        "sizes": {"n": 200, "p": 20_000, "subsamples": SUBSAMPLES, **STOPPED},
        "times_s": times,
        "median_s": measure.medians(times),
        "processor_s": processor,
        "median_processor_s": measure.medians(processor),
        "ratio_to_binomial": _to_binomial(times),
        "ratio_of_processor_times": _to_binomial(processor),
        "kkt": kkt,
    }


def _to_binomial(times):
    return {
        family: measure.paired_ratio(times[family], times["binomial"])
        for family in FAMILIES
    }


class _Passes:
    """Counts the passes of the engine, their living refits and their time."""

    def __init__(self):
        self.original = engine._Lockstep._pass
        self.living, self.times = [], []

    def __enter__(self):
        def counted(lockstep, live, mapper):
            taken, _ = measure.seconds(lambda: self.original(lockstep, live, mapper))
            self.living.append(len(live))
            self.times.append(taken)

        engine._Lockstep._pass = counted
        return self

    def __exit__(self, *_):
        engine._Lockstep._pass = self.original


def _bare_product(base, n_refits):
    """Return what multiplies residuals by the matrix, tile by tile, and no more."""
    generator = np.random.default_rng(0)
    R = generator.normal(size=(n_refits, base.shape[1])).astype(np.float32)
    room = [np.empty((TILE, n_refits), np.float32) for _ in range(THREADS)]

    def strip(worker):
        for start in range(worker * TILE, len(base), THREADS * TILE):
            tile = base[start : start + TILE]
            np.matmul(tile, R.T, out=room[worker][: len(tile)])

    def product(turn=0):
        with threadpool_limits(1, "blas"), ThreadPoolExecutor(THREADS) as pool:
            list(pool.map(strip, range(THREADS)))

    return product


def wide():
    """Return job d: 400 x 850,000 against as many bare products of its shape."""
    n, p = 400, 850_000
    needed = int(1.8 * n * p * 4)
    if (free := measure.free_bytes()) is not None and free < needed:
        return {"skipped": f"{free / 2**30:.1f} GiB free, {needed / 2**30:.1f} needed"}
    small, y, labels = cohort(60, 500)
    fit_paths(small.T, y, subsamples=halves(labels, 4), **STOPPED)  # compiles
    idle = measure.peak_bytes()
    base, y, labels = cohort(n, p)
    subsamples = halves(labels, SUBSAMPLES)
    product = _bare_product(base, SUBSAMPLES)
    product()
    passes = []
    kept = []

    def fit(turn):
        with _Passes() as counted:
            kept[:] = [
                fit_paths(base.T, y, subsamples=subsamples, threads=THREADS, **STOPPED)
            ]
        passes.append(counted)

    measure.forget_peak()
    times, processor = measure.alternate({"product": product, "panelkit": fit}, 4)
    peak = measure.peak_bytes()
    count = [len(each.times) for each in passes]
    return {
        "sizes": {"n": n, "p": p, "subsamples": SUBSAMPLES, **STOPPED},
        "times_s": times,
        "median_s": measure.medians(times),
        "processor_s": processor,
        "median_processor_s": measure.medians(processor),
        "passes": count,
        "living_a_pass": passes[0].living,
        "pass_times_s": [each.times for each in passes],
        "share_in_passes": statistics.median(
            sum(each.times) / whole
            for each, whole in zip(passes, times["panelkit"], strict=True)
        ),
        "ratio_to_products": _to_products(times, count),
        "ratio_of_processor_times": _to_products(processor, count),
        "idle_bytes": idle,
        "peak_bytes": peak,
        "peak_over_matrix": peak / base.nbytes,
        "kkt": certified(kept[0], base, y, subsamples, SAMPLE[:1]),
    }


def _to_products(times, count):
    per_round = zip(times["panelkit"], count, times["product"], strict=True)
    return statistics.median(fit / (passes * one) for fit, passes, one in per_round)


def one_path():
    """Return job e: one deep path of 200 x 30,000."""
    base, y, _ = cohort(200, 30_000)
    everyone = [np.arange(200)]

    def fit(matrix=base, threads=THREADS):
        return fit_paths(matrix.T, y, threads=threads, **DEEP)

    paths = fit()
    peak = measure.peak_bytes()
    double = base.astype(np.float64)
    fit(double)
    tasks = {
        "panelkit": lambda turn: fit(),
        "panelkit, one thread": lambda turn: fit(threads=1),
        "panelkit, float64": lambda turn: fit(double),
    }
    times, processor = measure.alternate(tasks, 9)
    return {
        "sizes": {"n": 200, "p": 30_000, "subsamples": 1, **DEEP},
        "times_s": times,
        "median_s": measure.medians(times),
        "processor_s": processor,
        "median_processor_s": measure.medians(processor),
        "kkt": certified(paths, base, y, everyone, [0]),
        "peak_bytes": peak,
    }


def folds():
    """Return job f: five times five folds, 100 subsamples each, a block a fold."""
    n, p = 79, 12_625
    base, y, labels = cohort(n, p)
    generator = np.random.default_rng(1)
    training = []
    for _ in range(5):
        fold = np.empty(n, int)
        for value in np.unique(labels):
            members = generator.permutation(np.flatnonzero(labels == value))
            fold[members] = np.arange(len(members)) % 5
        training += [np.flatnonzero(fold != k) for k in range(5)]
    blocks = [
        halves(labels, SUBSAMPLES, seed=number, among=rows)
        for number, rows in enumerate(training)
    ]

    def fit(block):
        return fit_paths(base.T, y, subsamples=block, threads=THREADS, **STOPPED)

    fit(blocks[0])
    measure.forget_peak()
    times, processor = measure.alternate(
        {"panelkit": lambda turn: [*map(fit, blocks)]}, 5
    )
    peak = measure.peak_bytes()
    kkt = [certified(fit(b), base, y, b, [0]) for b in blocks[::8]]
    return {
        "sizes": {"n": n, "p": p, "folds": 25, "subsamples": SUBSAMPLES, **STOPPED},
        "times_s": times,
        "median_s": measure.medians(times),
        "processor_s": processor,
        "median_processor_s": measure.medians(processor),
        "peak_bytes": peak,
        "kkt": {f"fold {8 * number}": found for number, found in enumerate(kkt)},
    }


FIRST_FITS = """
import sys, time
start = time.perf_counter()
import numpy as np
from panelkit.fits import fit_paths
print("import", time.perf_counter() - start, time.process_time())
draws = np.random.default_rng(0)
X = draws.normal(size=(300, 40)).astype(np.float32).T
y = np.tile([0, 1, 2, 3], 10)
outcomes = {
    "gaussian": y.astype(float), "binomial": y % 2.0, "multinomial": y,
    "cox": (draws.exponential(size=40), np.ones(40)),
}
halves = [np.arange(0, 20), np.arange(20, 40)]
for family in sys.argv[1:]:
    start, processor = time.perf_counter(), time.process_time()
    fit_paths(X, outcomes[family], family=family, subsamples=halves, n_penalties=5)
    print(family, time.perf_counter() - start, time.process_time() - processor)
"""


def _first_fits(cache, asked):
    environment = {**os.environ, "XDG_CACHE_HOME": cache}
    ran = subprocess.run(
        [sys.executable, "-c", FIRST_FITS, *asked],
        env=environment,
        capture_output=True,
        text=True,
        check=True,
    )
    lines = [line.split() for line in ran.stdout.splitlines()]
    return {name: (float(taken), float(used)) for name, taken, used in lines}


def compilation():
    """Return job g: first fits with an empty cache, then with the filled one."""
    found = {}
    for asked in [(family,) for family in FAMILIES] + [FAMILIES]:
        cold, warm = [], []
        for _ in range(3):
            with tempfile.TemporaryDirectory() as cache:
                cold.append(_first_fits(cache, asked))
                warm.append(_first_fits(cache, asked))
        found[" ".join(asked)] = {"cold": cold, "warm": warm}
    return {
        "sizes": {"n": 40, "p": 300, "subsamples": 2, "n_penalties": 5},
        "times_s": found,
        "median_s": _first_fit_medians(found, 0),
        "median_processor_s": _first_fit_medians(found, 1),
    }


def _first_fit_medians(found, which):
    return {
        f"{name}, {state}": statistics.median(
            sum(run[family][which] for family in name.split()) for run in runs
        )
        for name, states in found.items()
        for state, runs in states.items()
    }


BASELINE = {"n": 200, "p": 20_000, "subsamples": 100, "penalties": 40}
GRIDS = {
    "n": (100, 200, 400, 800),
    "p": (5_000, 20_000, 80_000),
    "subsamples": (25, 100, 400),
    "penalties": (20, 40, 80, 160),
}


def growth():
    """Return job h: one size at a time, the others as in job b."""
    tasks, kkt = {}, {}
    for axis, grid in GRIDS.items():
        for value in grid:
            sizes = {**BASELINE, axis: value}
            base, y, labels = cohort(sizes["n"], sizes["p"])
            subsamples = halves(labels, sizes["subsamples"])

            def run(turn, base=base, y=y, subsamples=subsamples, sizes=sizes):
                return fit_paths(
                    base.T,
                    y,
                    subsamples=subsamples,
                    n_penalties=sizes["penalties"],
                    penalty_floor=0.1,
                    threads=THREADS,
                )

            name = f"{axis}={value}"
            kkt[name] = certified(run(0), base, y, subsamples, [0])
            tasks[name] = run
    times, processor = measure.alternate(tasks, 3)
    medians, typical = measure.medians(times), measure.medians(processor)
    exponent = {}
    for axis, grid in GRIDS.items():
        found = [typical[f"{axis}={value}"] for value in grid]
        slope = np.polyfit(np.log(grid), np.log(found), 1)[0]
        exponent[axis] = float(slope)
    return {
        "sizes": {**BASELINE, "penalty_floor": 0.1, "grids": GRIDS},
        "times_s": times,
        "median_s": medians,
        "processor_s": processor,
        "median_processor_s": measure.medians(processor),
        "exponent": exponent,
        "kkt": kkt,
    }


JOBS = {
    job.__name__: job
    for job in (
        binomial_stop,
        binomial_whole,
        binomial_deep,
        families,
        wide,
        one_path,
        folds,
        compilation,
        growth,
        checks,
    )
}

if __name__ == "__main__":
    name, path = sys.argv[1:]
    results = JOBS[name]()
    measure.write_json(Path(path), name, {"goal": GOAL, **results})
