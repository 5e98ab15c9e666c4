"""The whole procedure, learnt on some rows and applied to others.

Everything that looks at data is learnt again here from the training rows: fills and
filters, frequencies, candidates, panels, tuning, coefficients. A fold runs it with
its training rows; the printed panels come from running it with all rows.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from panelkit.config import ENGINE
from panelkit.costing.data import ProcedureData, Split
from panelkit.costing.makers import Evidence, maker_named
from panelkit.costing.refits import MarkerValues, TrainingObjective, columns_of, refit
from panelkit.costing.tuning import Tuning, judge, tune_ridge
from panelkit.errors import FitError
from panelkit.fits import fit_paths, kernel_matrix, ridge_predictions
from panelkit.preparation import DesignView, Recipe
from panelkit.records import Stability
from panelkit.stability import ShortlistRules, select_markers

__all__ = ["CandidateFacts", "Learnt", "Procedure", "Selected"]

RIDGE_PAIRS = 4  # pairs that tune ridge on all features
RIDGE_PENALTIES = np.logspace(0.5, -3.5, 9)


@dataclass(frozen=True, slots=True, eq=False)
class Selected:
    """Preparation, stability and panels of some training rows.

    Attributes
    ----------
    view : DesignView
        Preparation learnt on the training rows.
    stability : Stability
        Frequencies, shortlist, candidates.
    evidence : Evidence
        What the makers were given.
    panels : list of ndarray of int64
        One a maker and size, makers first.
    """

    view: DesignView
    stability: Stability
    evidence: Evidence
    panels: list[NDArray[np.int64]]


@dataclass(frozen=True, slots=True, eq=False)
class CandidateFacts:
    """What the makers were given about the candidates: enough to ask them again.

    Attributes
    ----------
    candidates : ndarray of shape (n_candidates,), int64
        Features.
    frequency, t, group_frequency : ndarray of shape (n_candidates,), float64
        As in `Evidence`.
    group : ndarray of shape (n_candidates,), int64
        Companion group.
    """

    candidates: NDArray[np.int64]
    frequency: NDArray[np.float64]
    t: NDArray[np.float64]
    group: NDArray[np.int64]
    group_frequency: NDArray[np.float64]

    @classmethod
    def of(cls, stability: Stability) -> "CandidateFacts":
        """Return the facts of a stability selection."""
        own = stability.candidates
        return cls(
            own,
            stability.frequency[own],
            stability.t[own],
            stability.group[own],
            stability.group_frequency[own],
        )


@dataclass(frozen=True, slots=True, eq=False)
class Learnt:
    """What a procedure learnt from its training rows.

    Attributes
    ----------
    selected : Selected
        Preparation, stability, panels.
    tuning : Tuning
        Judgement of the inner folds.
    penalties : ndarray of shape (n_panels,)
        Ridge penalty of each panel.
    predicted : ndarray of shape (n_panels[, n_classes], n_test)
        Linear predictors of the test rows.
    """

    selected: Selected
    tuning: Tuning
    penalties: NDArray[np.float64]
    predicted: NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Procedure:
    """Recipe, shortlist rules, makers and sizes: what is repeated in every fold.

    Attributes
    ----------
    recipe : Recipe
        Preparation of everything that selects.
    rules : ShortlistRules
        Stability selection and candidates.
    makers : sequence of str
        Names of makers.
    sizes : sequence of int
        Panel sizes, ascending.
    ridge_penalties : sequence of float
        Ridge penalties of the refits, largest first.
    assay : Recipe or None
        Preparation of a panel's markers for its refit and its scores; None takes the
        values that selected them.
    """

    recipe: Recipe
    rules: ShortlistRules
    makers: Sequence[str]
    sizes: Sequence[int]
    ridge_penalties: Sequence[float] = ENGINE.ridge_penalties
    assay: Recipe | None = None

    @property
    def kinds(self) -> list[tuple[str, int]]:
        """Maker and size of each panel, makers first."""
        return [(maker, size) for maker in self.makers for size in self.sizes]

    def learn(self, data: ProcedureData, split: Split, threads: int = 1) -> Learnt:
        """Learn everything from the training rows and predict the test rows.

        Parameters
        ----------
        data : ProcedureData
            Shared data.
        split : Split
            Which rows teach, which are tested; inner folds for tuning.
        threads : int
            Threads of the engine.

        Returns
        -------
        Learnt
            Panels, predictions, and what led to them.

        Raises
        ------
        FitError
            A fit that is not possible or did not converge.
        """
        if len(split.inner) < 2:
            raise FitError(
                code="too-few-inner-folds",
                where="tuning",
                what=f"{len(split.inner)} inner folds",
                accepted="at least 2",
                next_step="Draw inner folds for the training rows",
            )
        # first the inner folds: where a fold has a matrix of its own, one is held
        tuning = self.tune(data, split, threads)
        selected = self.select(data, split, threads)
        penalties = self.penalties(tuning, len(split.inner))
        predicted = self.predict(
            selected.view, data, split, penalties[:, None], selected.panels
        )
        return Learnt(selected, tuning, penalties, predicted[:, 0])

    def select(self, data: ProcedureData, split: Split, threads: int = 1) -> Selected:
        """Learn preparation, stability and panels from the training rows.

        Parameters
        ----------
        data : ProcedureData
            Shared data.
        split : Split
            Its training rows and their pairs.
        threads : int
            Threads of the engine.

        Returns
        -------
        Selected
            Preparation, stability, panels.

        Raises
        ------
        FitError
            A fit that is not possible or did not converge.
        """
        _state, view = self.recipe.prepare(
            data.base, split.training, data.barred, data.context
        )
        stability = select_markers(
            view,
            data.task.outcome(),
            split.training,
            data.subjects,
            data.weights,
            split.pairs,
            self.rules,
            always=data.always,
            threads=threads,
            family=data.task.family,
            allowed=data.allowed,
        )
        facts = CandidateFacts.of(stability)
        evidence = self.evidence(facts, view, data, split.training)
        panels = [
            panel
            for name in self.makers
            for panel in maker_named(name)(evidence, self.sizes)
        ]
        return Selected(view, stability, evidence, panels)

    def evidence(
        self,
        facts: CandidateFacts,
        view: DesignView,
        data: ProcedureData,
        training: NDArray[np.int64],
    ) -> Evidence:
        """Return what makers may know; fits are made when a maker asks for them.

        Parameters
        ----------
        facts : CandidateFacts
            Of the candidates that the training rows gave.
        view : DesignView
            Preparation learnt on them.
        data : ProcedureData
            Shared data.
        training : ndarray of int64
            The training rows.

        Returns
        -------
        Evidence
            For makers.
        """
        objective: list[TrainingObjective] = []

        def spread(values: NDArray[Any], blank: float) -> NDArray[Any]:
            whole = np.full(len(view.included), blank, values.dtype)
            whole[facts.candidates] = values
            return whole

        def judged(panels: Sequence[NDArray[np.int64]]) -> NDArray[np.float64]:
            if not objective:
                candidates = facts.candidates
                markers = self.markers(view, data, training)
                objective.append(TrainingObjective(markers, candidates, data, training))
            return objective[0](panels)

        def entry_order(weights: NDArray[np.float64]) -> NDArray[np.int64]:
            paths = fit_paths(
                view,
                data.task.outcome(),
                subsamples=[training],
                family=data.task.family,
                penalty_floor=self.rules.penalty_floor,
                max_markers=max(self.sizes),
                feature_weights=weights,
                weights=data.weights,
            )
            return paths.entry_order[0]

        return Evidence(
            candidates=facts.candidates,
            frequency=spread(facts.frequency, 0.0),
            t=spread(facts.t, 0.0),
            group=spread(facts.group, -1),
            group_frequency=spread(facts.group_frequency, 0.0),
            price=data.price,
            reliability=data.reliability,
            own=None if data.own is None else data.own[view.included[data.own]],
            objective=judged,
            entry_order=entry_order,
        )

    def tune(self, data: ProcedureData, split: Split, threads: int = 1) -> Tuning:
        """Repeat the selection in the inner folds and judge it there.

        Parameters
        ----------
        data : ProcedureData
            Shared data.
        split : Split
            Its inner folds are used.
        threads : int
            Threads of the engine.

        Returns
        -------
        Tuning
            Best penalties, accuracy of each maker and size.

        Raises
        ------
        FitError
            A fit that is not possible or did not converge.
        """
        shape = (len(self.makers), len(self.sizes))
        grid = np.tile(np.array(self.ridge_penalties), (shape[0] * shape[1], 1))
        predicted = []
        for inner in split.inner:
            found = self.select(data, inner, threads)
            predicted.append(self.predict(found.view, data, inner, grid, found.panels))
        return judge(predicted, data, split.inner, shape)

    def penalties(self, tuning: Tuning, n_folds: int) -> NDArray[np.float64]:
        """Return the ridge penalty of each panel, shape (n_panels,).

        A ridge penalty on the mean loss is 1 / (n * prior variance): it was tuned on
        fewer rows than it is used on.
        """
        grid = np.array(self.ridge_penalties) * (n_folds - 1) / n_folds
        return np.asarray(grid[tuning.best.ravel()], np.float64)

    def predict(
        self,
        view: DesignView,
        data: ProcedureData,
        split: Split,
        penalties: NDArray[np.float64],
        panels: Sequence[NDArray[np.int64]],
    ) -> NDArray[np.float64]:
        """Refit panels on the training rows and predict the test rows.

        Parameters
        ----------
        view : DesignView
            Preparation learnt on the training rows.
        data : ProcedureData
            Shared data.
        split : Split
            Training and test rows.
        penalties : ndarray of shape (n_panels, n_penalties)
            Ridge penalties, largest first.
        panels : sequence of ndarray of int64
            Features of each panel.

        Returns
        -------
        ndarray of shape (n_panels, n_penalties[, n_classes], n_test)
            Linear predictors.

        Raises
        ------
        FitError
            A fit that is not possible or did not converge.
        """
        features = np.unique(np.concatenate([*panels, np.empty(0, np.int64)]))
        markers = self.markers(view, data, split.training)
        return refit(
            columns_of(markers, features, data, split),
            [np.searchsorted(features, panel) for panel in panels],
            data,
            split,
            penalties,
        )

    def markers(
        self, view: DesignView, data: ProcedureData, training: NDArray[np.int64]
    ) -> MarkerValues:
        """Return markers as their panel is fitted and scored with."""
        return MarkerValues(self.assay, view, data, training)

    def ridge_on_all(
        self, data: ProcedureData, split: Split, view: DesignView
    ) -> NDArray[np.float64]:
        """Return predictions of the test rows by ridge on all included features.

        Raises
        ------
        FitError
            No convergence.
        """
        kernel = kernel_matrix(view, split.training, data.weights)
        task = data.task
        best = tune_ridge(
            kernel, task, data.weights, split.pairs, RIDGE_PAIRS, RIDGE_PENALTIES
        )
        # as in `penalties`: fewer rows tuned it
        ratio = len(split.pairs.rows[0]) / len(split.training)
        predicted = ridge_predictions(
            kernel,
            task.outcome(),
            data.weights,
            split.training,
            split.test,
            RIDGE_PENALTIES[best : best + 1] * ratio,
            family=task.family,
        )
        return np.asarray(predicted[0], np.float64)
