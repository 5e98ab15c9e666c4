"""Cohorts with known signals, and a selection that runs in milliseconds."""

from dataclasses import dataclass

import numpy as np
import pytest

from panelkit.fits import ArraySource
from panelkit.stability import ShortlistRules, draw_pairs, select_markers


@dataclass
class Drawn:
    X: np.ndarray
    y: np.ndarray
    plan: object

    def select(self, X=None, always=None, threads=1, **rules):
        n = len(self.y)
        source = (
            X if hasattr(X, "included") else ArraySource(self.X if X is None else X)
        )
        return select_markers(
            source,
            self.y,
            np.arange(n),
            np.arange(n),
            np.ones(n),
            self.plan,
            ShortlistRules(**rules),
            always=always,
            threads=threads,
        )


@pytest.fixture
def draw():
    """Return a function that draws n samples, p features, the first ones signals."""

    def drawn(seed, n, p, signals=0, difference=1.5, n_pairs=20):
        generator = np.random.default_rng(seed)
        y = np.arange(n) % 2 * 1.0
        X = generator.normal(size=(n, p))
        X[:, :signals] += difference * y[:, None]
        rows = np.arange(n)
        return Drawn(X, y, draw_pairs(rows, rows, y, n_pairs, generator))

    return drawn
