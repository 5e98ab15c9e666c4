"""Small drawn cohorts, and the splits drawn for them before anything is fitted."""

import dataclasses
from dataclasses import dataclass

import numpy as np
import pytest

from panelkit.costing import BinaryTask, ProcedureData, Split, draw_folds
from panelkit.stability import draw_pairs


@dataclass
class Cohort:
    """Data, and the splits drawn for it before anything is fitted."""

    base: np.ndarray  # features by samples
    y: np.ndarray
    subjects: np.ndarray
    weights: np.ndarray

    @classmethod
    def drawn(cls, seed, n, p, signals=0, rows_per_subject=1, missing=0.0):
        draws = np.random.default_rng(seed)
        n_rows = n * rows_per_subject
        subjects = np.repeat(np.arange(n), rows_per_subject)
        y = (subjects % 2).astype(float)
        base = draws.normal(size=(p, n_rows))
        base[:signals] += 1.5 * y
        base[draws.random(base.shape) < missing] = np.nan
        return cls(base, y, subjects, np.full(n_rows, 1.0 / rows_per_subject))

    def data(self, base=None, **changes):
        p = len(self.base)
        return dataclasses.replace(
            ProcedureData(
                base=self.base if base is None else base,
                task=BinaryTask(self.y),
                weights=self.weights,
                subjects=self.subjects,
                barred=np.full(p, "", object),
                always=np.empty(0, np.int64),
            ),
            **changes,
        )

    def folds(self, n_folds, seed=0):
        generators = [np.random.default_rng([seed, 1])]
        return draw_folds(self.subjects, self.y, n_folds, generators)

    def split(self, training, test, seed=0, n_inner=3, n_pairs=5):
        pairs = draw_pairs(
            training, self.subjects, self.y, n_pairs, np.random.default_rng([seed, 2])
        )
        inner = []
        if n_inner:
            plan = draw_folds(
                self.subjects[training],
                self.y[training],
                n_inner,
                [np.random.default_rng([seed, 3])],
            )
            for fold in range(n_inner):
                teach, judge = (training[rows] for rows in plan.split(0, fold))
                inner.append(self.split(teach, judge, seed, 0, n_pairs))
        return Split(training, test, pairs, tuple(inner))


@pytest.fixture(scope="session")
def drawn_cohort():
    """Draw a cohort: seed, subjects, features; see `Cohort.drawn`."""
    return Cohort.drawn
