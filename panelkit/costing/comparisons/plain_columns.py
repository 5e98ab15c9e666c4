"""Models of columns that are no markers: covariates, nuisance columns, controls."""

import numpy as np
from numpy.typing import NDArray

from panelkit.costing.comparisons.contract import FoldWork, LearntToo
from panelkit.costing.comparisons.halves import tuned_on_halves
from panelkit.costing.data import Split
from panelkit.costing.refits import Columns, columns_of, refit, standardised_columns

__all__ = [
    "CONTROLS",
    "COVARIATES",
    "NUISANCE",
    "WITH_COVARIATES",
    "control_features",
    "covariates_alone",
    "covariates_with_panels",
    "nuisance_alone",
]

COVARIATES = "covariates"
NUISANCE = "nuisance-columns"
CONTROLS = "control-features"
WITH_COVARIATES = "with covariates: "
TUNED_PAIRS = 4


def covariates_alone(work: FoldWork) -> LearntToo:
    """Return predictions from the covariates without any marker."""
    return LearntToo({COVARIATES: _from_columns(work, work.data.covariates)})


def nuisance_alone(work: FoldWork) -> LearntToo:
    """Return predictions from nuisance columns: what handling alone gives away."""
    return LearntToo({NUISANCE: _from_columns(work, work.data.nuisance)})


def control_features(work: FoldWork) -> LearntToo:
    """Return predictions from the control features, which should know nothing."""
    view = work.learnt.selected.view
    values = view.columns(work.data.controls, np.arange(work.data.n_samples))
    return LearntToo({CONTROLS: _from_columns(work, values)})


def covariates_with_panels(work: FoldWork) -> LearntToo:
    """Return predictions of each panel refitted together with the covariates.

    On the same rows and at the panel's own ridge penalty; named by maker and size.
    """
    data, split, learnt = work.data, work.split, work.learnt
    panels = learnt.selected.panels
    features = np.unique(np.concatenate(panels))
    own = work.procedure.markers(learnt.selected.view, data, split.training)
    markers = columns_of(own, features, data, split)
    rows = np.concatenate([split.training, split.test])
    extra = standardised_columns(data.covariates[:, rows], data, split)
    both = Columns(
        np.concatenate([markers.taught, extra.taught]),
        np.concatenate([markers.tested, extra.tested]),
    )
    added = len(features) + np.arange(len(data.covariates))
    predicted = refit(
        both,
        [np.append(np.searchsorted(features, panel), added) for panel in panels],
        data,
        split,
        learnt.penalties[:, None],
    )[:, 0]
    return LearntToo(
        {
            f"{WITH_COVARIATES}{maker}-{size}": predicted[p]
            for p, (maker, size) in enumerate(work.procedure.kinds)
        }
    )


def _from_columns(work: FoldWork, values: NDArray[np.float64]) -> NDArray[np.float64]:
    """Refit all columns together, the ridge penalty tuned on complementary halves."""
    data, split = work.data, work.split
    everything = [np.arange(len(values))]
    best = tuned_on_halves(
        lambda own: _columns(values, work, own),
        everything,
        data,
        split,
        work.procedure.ridge_penalties,
        TUNED_PAIRS,
    )
    columns = _columns(values, work, split)
    predicted = refit(columns, everything, data, split, np.array([[best]]))
    return np.asarray(predicted[0, 0], np.float64)


def _columns(values: NDArray[np.float64], work: FoldWork, split: Split) -> Columns:
    rows = np.concatenate([split.training, split.test])
    return standardised_columns(values[:, rows], work.data, split)
