"""How many low-chance features are shortlisted, against the bounds: a simulation.

Run from anywhere: ``python tests/reference/make_shortlist_error_control.py``. It writes
`shortlist_error_control.csv` and `.png` beside it; `.md` says what they show. Seeds are
stored in the code, so that the numbers come back.

A feature's chance is estimated on data sets of its own; those whose chance is at most
the average are counted in other data sets. In the global null every feature has the
average chance by symmetry, so all are counted.
"""

import csv
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from panelkit.fits import ArraySource
from panelkit.stability import (
    ShortlistRules,
    draw_pairs,
    r_concave_bound,
    select_markers,
    unimodal_bound,
    worst_case_bound,
)

HERE = Path(__file__).parent
THRESHOLDS = (0.55, 0.6, 0.65, 0.7, 0.75, 0.8, 0.9)
N_PAIRS = 25
COLUMNS = (
    "kind", "n", "p", "q", "threshold", "data_sets", "low_chance_features",
    "mean_low_chance", "standard_error", "mean_shortlist", "realised_q",
    "worst_case", "unimodal", "r_concave",
)  # fmt: skip


@dataclass(frozen=True)
class Setting:
    """One way of drawing data sets."""

    kind: str  # noise, planted, twins
    n: int
    p: int
    q: int


SETTINGS = (
    Setting("noise", 40, 100, 8),
    Setting("noise", 60, 200, 10),
    Setting("noise", 60, 500, 20),
    Setting("noise", 100, 1000, 20),
    Setting("planted", 40, 100, 8),
    Setting("planted", 60, 200, 10),
    Setting("planted", 60, 500, 20),
    Setting("planted", 100, 1000, 20),
    Setting("twins", 60, 200, 10),
    Setting("twins", 100, 1000, 20),
)
SIGNALS, DIFFERENCE, BLOCK = 4, 1.4, 4


def drawn(setting, seed):
    """Return X and y of one data set."""
    draws = np.random.default_rng([seed, setting.n, setting.p])
    y = np.arange(setting.n) % 2 * 1.0
    X = draws.normal(size=(setting.n, setting.p))
    if setting.kind == "twins":  # blocks of four that share a factor, r = 0.9
        shared = np.repeat(draws.normal(size=(setting.n, setting.p // BLOCK)), BLOCK, 1)
        X = np.sqrt(0.9) * shared + np.sqrt(0.1) * X
        X[:, : SIGNALS * BLOCK] += DIFFERENCE * y[:, None]
    elif setting.kind == "planted":
        X[:, :SIGNALS] += DIFFERENCE * y[:, None]
    return X, y


def frequencies(setting, seeds):
    """Return frequencies (data sets, features) and the mean number picked."""
    found, realised = [], []
    for seed in seeds:
        X, y = drawn(setting, seed)
        rows = np.arange(setting.n)
        plan = draw_pairs(rows, rows, y, N_PAIRS, np.random.default_rng([seed, 7]))
        stability = select_markers(
            ArraySource(X), y, rows, rows, np.ones(setting.n), plan,
            ShortlistRules(markers_per_subsample=setting.q, threshold=0.75),
        )  # fmt: skip
        found.append(stability.frequency)
        realised.append(stability.bound.realised)
    return np.array(found), float(np.mean(realised))


def judged(setting, n_estimate, n_judge):
    """Return one row a threshold: how many low-chance features are shortlisted."""
    low = np.ones(setting.p, bool)
    if setting.kind != "noise":
        chance = frequencies(setting, range(10_000, 10_000 + n_estimate))[0].mean(
            axis=0
        )
        low = chance <= chance.mean()
    frequency, realised = frequencies(setting, range(n_judge))
    rows = []
    for threshold in THRESHOLDS:
        reached = frequency >= threshold - 1e-12
        counts = reached[:, low].sum(axis=1)
        at = (realised, threshold, setting.p)
        rows.append(
            {
                "kind": setting.kind,
                "n": setting.n,
                "p": setting.p,
                "q": setting.q,
                "threshold": threshold,
                "data_sets": n_judge,
                "low_chance_features": int(low.sum()),
                "mean_low_chance": float(counts.mean()),
                "standard_error": float(counts.std(ddof=1) / np.sqrt(n_judge)),
                "mean_shortlist": float(reached.sum(axis=1).mean()),
                "realised_q": realised,
                "worst_case": worst_case_bound(*at),
                "unimodal": unimodal_bound(*at, N_PAIRS),
                "r_concave": r_concave_bound(*at, N_PAIRS)
                if threshold >= 0.6
                else float("nan"),
            }
        )
    return rows


def draw(rows, path):
    """Draw what was found against the bounds, a panel a setting."""
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    settings = list(dict.fromkeys((r["kind"], r["n"], r["p"], r["q"]) for r in rows))
    n_columns = 4
    n_rows = -(-len(settings) // n_columns)
    figure = Figure(figsize=(12, 2.9 * n_rows), layout="constrained")
    FigureCanvasAgg(figure)
    axes = figure.subplots(n_rows, n_columns, squeeze=False).ravel()
    looks = (
        ("worst_case", "worst case", "#20262d", "-"),
        ("unimodal", "unimodal", "#14606a", "--"),
        ("r_concave", "r-concave", "#74468f", ":"),
    )
    floor = 1e-3
    for axis, key in zip(axes, settings, strict=False):
        own = [r for r in rows if (r["kind"], r["n"], r["p"], r["q"]) == key]
        x = [r["threshold"] for r in own]
        for name, label, colour, line in looks:
            axis.plot(x, [r[name] for r in own], line, color=colour, label=label)
        mean = np.array([r["mean_low_chance"] for r in own])
        error = np.array([2 * r["standard_error"] for r in own])
        shown = np.maximum(mean, floor)
        low = np.maximum(shown - error, floor)
        axis.errorbar(
            x, shown, [shown - low, error], fmt="o", color="#c9822b", markersize=4,
            label="found (2 standard errors)",
        )  # fmt: skip
        axis.set_yscale("log")
        axis.set_ylim(floor * 0.8, 60)
        kind, n, p, q = key
        axis.set_title(f"{kind}: n {n}, p {p}, q {q}", fontsize=9)
        axis.set_xlabel("threshold", fontsize=8)
        axis.tick_params(labelsize=8)
    for axis in axes[len(settings) :]:
        axis.set_axis_off()
    handles, labels = axes[0].get_legend_handles_labels()
    figure.legend(handles, labels, loc="outside lower center", ncols=4, frameon=False)
    figure.supylabel("low-chance features in the shortlist, mean", fontsize=9)
    figure.savefig(path, dpi=80, metadata={"Software": None})


def main(n_estimate=100, n_judge=200):
    """Write the table and the picture."""
    rows = [row for s in SETTINGS for row in judged(s, n_estimate, n_judge)]
    with (HERE / "shortlist_error_control.csv").open("w", newline="") as file:
        writer = csv.DictWriter(file, COLUMNS, lineterminator="\n")
        writer.writeheader()
        writer.writerows(
            {k: round(v, 6) if isinstance(v, float) else v for k, v in row.items()}
            for row in rows
        )
    draw(rows, HERE / "shortlist_error_control.png")


if __name__ == "__main__":
    main()
