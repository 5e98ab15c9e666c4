"""KKT violations and objectives, recomputed in plain NumPy over all features.

One function for everybody: panelkit's paths and the peers' go through the same lines.
"""

from dataclasses import dataclass

import numpy as np

CHUNK = 8192


@dataclass(frozen=True)
class Solution:
    """One refit at one penalty; coefficients belong to standardised columns."""

    eta: np.ndarray  # (n, K) linear predictors
    features: np.ndarray  # (m,) of the non-zero coefficients
    beta: np.ndarray  # (m, K)


def moments(columns):
    """Return means and deviations (divisor n) of columns (features, n), float64."""
    exact = columns.astype(np.float64)
    return exact.mean(axis=1), exact.std(axis=1)


def standardised(base, rows):
    """Return the standardised columns (features, n) of some rows, float64."""
    Z = base[:, rows].astype(np.float64)
    Z -= Z.mean(axis=1, keepdims=True)
    deviation = Z.std(axis=1, keepdims=True)
    Z /= np.where(deviation > 0.0, deviation, 1.0)
    return Z


def solutions_of(paths, base, rows, b):
    """Return the solved part of one refit's path as penalties and solutions."""
    reached = int(np.isfinite(paths.penalties[b]).sum())
    features, values = paths.coefficient_features[b], paths.coefficient_values[b]
    borders = paths.coefficient_borders[b]
    found = []
    for k in range(reached):
        here = slice(borders[k], borders[k + 1])
        value = values[here]
        value = value[:, None] if value.ndim == 1 else value
        columns = base[features[here]][:, rows].astype(np.float64)
        eta = paths.intercepts[b, k] + columns.T @ value
        deviation = moments(columns)[1] if len(columns) else np.ones(0)
        found.append(Solution(eta, features[here], value * deviation[:, None]))
    return paths.penalties[b, :reached], found


def residuals(family, outcome, rows, eta):
    """Return minus the gradient of the mean loss by the linear predictors, (n, K)."""
    n = len(rows)
    if family == "cox":
        return _cox(outcome, rows, eta)[1][:, None]
    y = outcome[rows]
    if family == "gaussian":
        return (y[:, None] - eta) / n
    if family == "binomial":
        return (y[:, None] - 1.0 / (1.0 + np.exp(-eta))) / n
    chance = np.exp(eta - eta.max(axis=1, keepdims=True))
    chance /= chance.sum(axis=1, keepdims=True)
    return (np.eye(eta.shape[1])[y] - chance) / n


def _cox(outcome, rows, eta):
    """Return the mean negative log partial likelihood and its residuals; no ties."""
    time, event = outcome[0][rows], outcome[1][rows]
    n = len(rows)
    order = np.argsort(-time)
    hazard = np.exp(eta[order, 0])
    at_risk = np.cumsum(hazard)
    events = event[order]
    loss = -(events * (eta[order, 0] - np.log(at_risk))).sum() / n
    until = np.cumsum((events / at_risk)[::-1])[::-1]
    r = np.empty(n)
    r[order] = (events - hazard * until) / n
    return loss, r


def objective(family, outcome, rows, penalty, solution):
    """Return the mean loss plus the penalty."""
    eta = solution.eta
    size = penalty * np.linalg.norm(solution.beta, axis=1).sum()
    if family == "cox":
        return _cox(outcome, rows, eta)[0] + size
    y = outcome[rows]
    if family == "gaussian":
        return 0.5 * np.mean((y - eta[:, 0]) ** 2) + size
    if family == "binomial":
        return np.mean(np.logaddexp(0.0, eta[:, 0]) - y * eta[:, 0]) + size
    top = eta.max(axis=1)
    total = np.log(np.exp(eta - top[:, None]).sum(axis=1)) + top
    return np.mean(total - eta[np.arange(len(y)), y]) + size


def violations(base, rows, family, outcome, path, intercept=True):
    """Return the largest KKT violation of each solution relative to its penalty.

    path: penalties and solutions. Over all features of the matrix, and the intercept
    where the solver fits one. Yuan & Lin 2006, JRSS-B 68:49, for several classes.
    """
    penalties, solutions = path
    R = np.stack([residuals(family, outcome, rows, s.eta) for s in solutions])
    n_solutions, n, n_classes = R.shape
    worst = np.zeros(n_solutions)
    if intercept and family != "cox":
        worst = np.abs(R.sum(axis=1)).max(axis=1)
    flat = R.transpose(1, 0, 2).reshape(n, -1)
    for start in range(0, len(base), CHUNK):
        Z = standardised(base[start : start + CHUNK], rows)
        G = (Z @ flat).reshape(len(Z), n_solutions, n_classes)
        size = np.linalg.norm(G, axis=2) - penalties
        for k, solution in enumerate(solutions):
            here = (solution.features >= start) & (solution.features < start + len(Z))
            at = solution.features[here] - start
            beta = solution.beta[here]
            pull = beta / np.linalg.norm(beta, axis=1, keepdims=True)
            size[at, k] = np.linalg.norm(G[at, k] - penalties[k] * pull, axis=1)
        worst = np.maximum(worst, size.max(axis=0))
    return worst / penalties


def certified(paths, base, outcome, subsamples, sample):
    """Return the largest certificate, and the largest violation of some refits."""
    recomputed = 0.0
    for b in sample:
        path = solutions_of(paths, base, subsamples[b], b)
        found = violations(base, subsamples[b], paths.family, outcome, path)
        recomputed = max(recomputed, float(found.max()))
    return {
        "certificate": float(np.nanmax(paths.certificate)),
        "recomputed": recomputed,
        "recomputed_refits": [int(b) for b in sample],
        "markers_a_refit": float(np.mean([len(o) for o in paths.entry_order])),
        "penalties_solved": float(np.isfinite(paths.penalties).sum(axis=1).mean()),
    }
