"""Data and oracles that the tests of the fits share.

The reference solver is plain NumPy, slow, and shares no line with the kernels.
"""

from dataclasses import dataclass, fields

import numpy as np
import pytest


@dataclass(frozen=True)
class Eight:
    """Eight rows, four columns; solutions in tests/reference/eight_rows.csv."""

    X: np.ndarray
    gaussian: np.ndarray
    binomial: np.ndarray


@pytest.fixture
def eight():
    X = [
        [1, 0, 2, -1],
        [2, 1, 0, 1],
        [-1, 3, 1, 0],
        [0, 2, -2, 2],
        [3, -1, 1, 1],
        [-2, 1, 0, -2],
        [1, -2, 3, 0],
        [0, -1, -1, 3],
    ]
    return Eight(
        X=np.array(X, float),
        gaussian=np.array([2, 3, 1, 0, 6, -3, 4, 1], float),
        binomial=np.array([1, 1, 0, 1, 1, 0, 0, 0], float),
    )


@dataclass(frozen=True)
class Problem:
    """One penalised fit, written as its objective says and nothing faster."""

    X: np.ndarray
    y: np.ndarray
    family: str = "binomial"
    weights: np.ndarray | None = None
    feature_weights: np.ndarray | None = None
    mixing: float = 1.0
    standardise: bool = True

    def columns(self):
        """Return standardised columns, mean, deviation, row shares, feature weights."""
        n, p = self.X.shape
        share = np.ones(n) if self.weights is None else np.asarray(self.weights, float)
        share = share / share.sum()
        mean = share @ self.X
        deviation = np.sqrt(share @ (self.X - mean) ** 2)
        constant = deviation < 1e-12
        if not self.standardise:
            deviation = np.ones(p)
        Z = (self.X - mean) / np.where(constant, 1.0, deviation)
        Z[:, constant] = 0.0
        v = np.ones(p) if self.feature_weights is None else self.feature_weights
        return Z, mean, np.where(constant, 1.0, deviation), share, np.asarray(v, float)

    def expected(self, eta):
        return eta if self.family == "gaussian" else 1.0 / (1.0 + np.exp(-eta))

    def loss(self, eta, share):
        if self.family == "gaussian":
            return 0.5 * share @ (self.y - eta) ** 2
        return share @ (np.logaddexp(0.0, eta) - self.y * eta)

    def objective(self, intercept, coef, penalty):
        """Return the objective of coefficients on the original scale."""
        _, _, deviation, share, v = self.columns()
        b = coef * deviation
        used = b != 0.0
        size = self.mixing * np.abs(b) + 0.5 * (1.0 - self.mixing) * b**2
        return (
            self.loss(intercept + self.X @ coef, share)
            + penalty * (v[used] * size[used]).sum()
        )

    def violation(self, intercept, coef, penalty):
        """Return the largest KKT violation over all columns, relative to the penalty.

        Tibshirani et al. 2012, JRSS-B 74:245, eq. (2), with a ridge part.
        """
        Z, _, deviation, share, v = self.columns()
        b = coef * deviation
        residual = share * (self.y - self.expected(intercept + self.X @ coef))
        gradient = Z.T @ residual
        worst = abs(residual.sum())
        for j, g in enumerate(gradient):
            if np.isinf(v[j]):
                assert b[j] == 0.0
                continue
            l1 = penalty * self.mixing * v[j]
            l2 = penalty * (1.0 - self.mixing) * v[j]
            if b[j] != 0.0:
                worst = max(worst, abs(g - l2 * b[j] - l1 * np.sign(b[j])))
            elif v[j] > 0.0:  # an absent free column: none is expected
                worst = max(worst, (abs(g) - l1) / v[j])
            else:
                worst = max(worst, abs(g))
        return worst / (penalty * self.mixing)

    def solve(self, penalty, accuracy=1e-11):
        """Return intercept and coefficients by accelerated proximal gradient steps.

        Beck & Teboulle 2009, SIAM J Imaging Sci 2:183, restarted where the
        objective rises (O'Donoghue & Candes 2015).
        """
        Z, mean, deviation, share, v = self.columns()
        keep = np.isfinite(v)
        A = np.column_stack([np.ones(len(Z)), Z[:, keep]])
        l1 = np.concatenate([[0.0], penalty * self.mixing * v[keep]])
        l2 = np.concatenate([[0.0], penalty * (1.0 - self.mixing) * v[keep]])
        root = np.sqrt(share)[:, None] * A
        curvature = 1.0 if self.family == "gaussian" else 0.25
        step = 1.0 / (curvature * np.linalg.norm(root, 2) ** 2 + l2.max())
        b = ahead = np.zeros(A.shape[1])
        momentum = 1.0
        for _ in range(200_000):
            residual = share * (self.y - self.expected(A @ ahead))
            moved = ahead + step * (A.T @ residual - l2 * ahead)
            new = np.sign(moved) * np.maximum(np.abs(moved) - step * l1, 0.0)
            if np.abs(new - ahead).max() <= accuracy * step:
                b = new
                break
            if (ahead - new) @ (new - b) > 0.0:
                momentum = 1.0
            grown = 0.5 * (1.0 + np.sqrt(1.0 + 4.0 * momentum**2))
            ahead = new + (momentum - 1.0) / grown * (new - b)
            b, momentum = new, grown
        else:
            raise AssertionError("the reference solver did not converge")
        coef = np.zeros(len(v))
        coef[keep] = b[1:] / deviation[keep]
        return b[0] - coef @ mean, coef


@pytest.fixture
def problem():
    return Problem


def _bits(paths):
    """Return every number of a PathSet as bytes, per field."""
    found = {}
    for field in fields(paths):
        value = getattr(paths, field.name)
        parts = value if isinstance(value, tuple) else (value,)
        found[field.name] = [
            (part.dtype.str, part.shape, part.tobytes())
            if isinstance(part, np.ndarray)
            else part
            for part in parts
        ]
    return found


@pytest.fixture
def bits():
    return _bits


@pytest.fixture
def draw_cohort():
    """Return a function that draws a matrix, an outcome and halves."""

    def draw(seed, n, p, n_subsamples=0, family="binomial", signals=5):
        generator = np.random.default_rng(seed)
        X = generator.normal(size=(n, p)) * generator.uniform(0.2, 5.0, p)
        X += generator.normal(size=p) * 3.0
        score = ((X - X.mean(0)) / X.std(0))[:, :signals].sum(axis=1)
        y = score + generator.normal(size=n) * 1.5
        if family == "binomial":
            y = (y > np.median(y)).astype(float)
        classes = (
            [np.flatnonzero(y == value) for value in (0.0, 1.0)]
            if family == "binomial"
            else [np.arange(n)]
        )
        halves = []
        for _ in range(n_subsamples):
            parts = [generator.permutation(c)[: len(c) // 2] for c in classes]
            halves.append(np.sort(np.concatenate(parts)))
        return X, y, halves

    return draw
