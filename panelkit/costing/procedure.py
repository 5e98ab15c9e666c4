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
from panelkit.costing.makers import evidence_of, maker_named
from panelkit.costing.tuning import (
    Tuning,
    choose_within_one_se,
    judge,
    tune_ridge,
)
from panelkit.errors import FitError
from panelkit.fits import (
    fit_panels,
    kernel_matrix,
    ridge_predictions,
    standardised,
)
from panelkit.preparation import DesignView, Recipe
from panelkit.records import FoldPlan, RecipeContext, Stability, SubsamplePlan
from panelkit.stability import ShortlistRules, select_markers

__all__ = ["Learnt", "Procedure", "ProcedureData", "Selected", "Split"]

RIDGE_PAIRS = 4  # pairs that tune ridge on all features
RIDGE_PENALTIES = np.logspace(0.5, -3.5, 9)
NOTHING_KNOWN = RecipeContext()


@dataclass(frozen=True, slots=True, eq=False)
class ProcedureData:
    """The data that a procedure works on, shared by all folds.

    Attributes
    ----------
    base : ndarray of shape (n_features, n_samples)
        What the folds share: after the steps that learn nothing.
    y, weights : ndarray of shape (n_samples,)
        Outcome and observation weights.
    subjects : ndarray of shape (n_samples,), int64
        Subject codes.
    barred : ndarray of shape (n_features,), object
        Reason why a feature may not be used, or ``""``.
    always : ndarray of int64
        Features that are candidates whatever happens.
    context : RecipeContext
        What preparation may read beside the values.
    values : ndarray of shape (n_features, n_samples), or None
        As read, for an assay part; None where there is none.
    blocks : ndarray of shape (n_samples,), int64, or None
        What stays together in folds and halves; None for the subjects.
    folds : FoldPlan or None
        The user's own outer folds; None has them drawn.
    """

    base: NDArray[np.floating[Any]]
    y: NDArray[np.float64]
    weights: NDArray[np.float64]
    subjects: NDArray[np.int64]
    barred: NDArray[np.object_]
    always: NDArray[np.int64]
    context: RecipeContext = NOTHING_KNOWN
    values: NDArray[np.floating[Any]] | None = None
    blocks: NDArray[np.int64] | None = None
    folds: FoldPlan | None = None

    @property
    def units(self) -> NDArray[np.int64]:
        """What is drawn as a whole: `blocks`, or the subjects."""
        return self.subjects if self.blocks is None else self.blocks


@dataclass(frozen=True, slots=True, eq=False)
class Split:
    """Rows that teach and rows that are tested, with all that was drawn for them.

    Attributes
    ----------
    training, test : ndarray of int64
        Rows; `test` may be empty.
    pairs : SubsamplePlan
        Complementary pairs of the training rows.
    inner : tuple of Split
        Inner folds of the training rows.
    """

    training: NDArray[np.int64]
    test: NDArray[np.int64]
    pairs: SubsamplePlan
    inner: "tuple[Split, ...]" = ()


@dataclass(frozen=True, slots=True, eq=False)
class Selected:
    """Preparation, stability and panels of some training rows.

    Attributes
    ----------
    view : DesignView
        Preparation learnt on the training rows.
    stability : Stability
        Frequencies, shortlist, candidates.
    panels : list of ndarray of int64
        One a maker and size, makers first.
    """

    view: DesignView
    stability: Stability
    panels: list[NDArray[np.int64]]


@dataclass(frozen=True, slots=True, eq=False)
class Learnt:
    """What a procedure learnt from its training rows.

    Attributes
    ----------
    selected : Selected
        Preparation, stability, panels.
    tuning : Tuning
        Judgement of the inner folds.
    chosen : tuple of int
        Maker and size position that the primary rule takes.
    penalties : ndarray of shape (n_panels,)
        Ridge penalty of each panel.
    log_odds : ndarray of shape (n_panels, n_test)
        Predictions for the test rows.
    """

    selected: Selected
    tuning: Tuning
    chosen: tuple[int, int]
    penalties: NDArray[np.float64]
    log_odds: NDArray[np.float64]


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
        n_folds = len(split.inner)
        # A ridge penalty on the mean loss is 1 / (n * prior variance): it was tuned on
        # fewer rows than it is used on.
        grid = np.array(self.ridge_penalties) * (n_folds - 1) / n_folds
        penalties = grid[tuning.best.ravel()]
        return Learnt(
            selected=selected,
            tuning=tuning,
            chosen=self.choose(tuning, n_folds),
            penalties=penalties,
            log_odds=self.predict(selected, data, split, penalties[:, None])[:, 0],
        )

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
            data.y,
            split.training,
            data.subjects,
            data.weights,
            split.pairs,
            self.rules,
            always=data.always,
            threads=threads,
        )
        evidence = evidence_of(stability)
        panels = [
            maker_named(name)(evidence, size)
            for name in self.makers
            for size in self.sizes
        ]
        return Selected(view, stability, panels)

    def choose(self, tuning: Tuning, n_folds: int) -> tuple[int, int]:
        """Return maker and size position that the primary rule takes.

        Parameters
        ----------
        tuning : Tuning
            Judgement of inner folds.
        n_folds : int
            Their number.

        Returns
        -------
        maker, size : int
            Positions.
        """
        return choose_within_one_se(tuning.area, 1.0 / (n_folds - 1))

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
        log_odds = [
            self.predict(self.select(data, inner, threads), data, inner, grid)
            for inner in split.inner
        ]
        return judge(
            log_odds,
            [data.y[inner.test] for inner in split.inner],
            [data.weights[inner.test] for inner in split.inner],
            shape,
        )

    def ridge_on_all(
        self, data: ProcedureData, split: Split, view: DesignView
    ) -> NDArray[np.float64]:
        """Return log-odds of the test rows by ridge on all included features.

        Raises
        ------
        FitError
            No convergence.
        """
        kernel = kernel_matrix(view, split.training, data.weights)
        best = tune_ridge(
            kernel, data.y, data.weights, split.pairs, RIDGE_PAIRS, RIDGE_PENALTIES
        )
        # as in `learn`: fewer rows tuned it
        ratio = len(split.pairs.rows[0]) / len(split.training)
        predicted = ridge_predictions(
            kernel,
            data.y,
            data.weights,
            split.training,
            split.test,
            RIDGE_PENALTIES[best : best + 1] * ratio,
        )
        log_odds: NDArray[np.float64] = predicted[0]
        return log_odds

    def predict(
        self,
        selected: Selected,
        data: ProcedureData,
        split: Split,
        penalties: NDArray[np.float64],
    ) -> NDArray[np.float64]:
        """Refit each panel on the training rows and score the test rows.

        Parameters
        ----------
        selected : Selected
            Panels, and the values that selected them.
        data : ProcedureData
            Shared data.
        split : Split
            Its rows.
        penalties : ndarray of shape (n_panels, n_penalties)
            Ridge penalties of each panel.

        Returns
        -------
        ndarray of shape (n_panels, n_penalties, n_test)
            Log-odds.

        Raises
        ------
        FitError
            A refit that did not converge.
        """
        training, test = split.training, split.test
        panels = selected.panels
        features = np.unique(np.concatenate(panels))
        rows = np.concatenate([training, test])
        n = len(training)
        Z, _mean, _deviation = standardised(
            self.marker_values(selected.view, data, training, features, rows),
            np.arange(n),
            data.weights[training],
        )
        taught, tested = Z[:, :n].copy(), Z[:, n:].copy()
        log_odds = np.empty((len(panels), penalties.shape[1], len(test)))
        for p, panel in enumerate(panels):
            fits = fit_panels(
                taught,
                [np.searchsorted(features, panel)],
                data.y[training],
                data.weights[training],
                penalties[p],
            )
            log_odds[p] = fits.linear_predictors(tested)[0]
        return log_odds

    def marker_values(
        self,
        view: DesignView,
        data: ProcedureData,
        training: NDArray[np.int64],
        features: NDArray[np.int64],
        rows: NDArray[np.int64],
    ) -> NDArray[np.float64]:
        """Return markers as their panel is fitted and scored with.

        Parameters
        ----------
        view : DesignView
            What selected them.
        data : ProcedureData
            Shared data.
        training : ndarray of int64
            Rows that teach the assay part.
        features, rows : ndarray of int64
            Markers, ascending, and samples.

        Returns
        -------
        ndarray of shape (n_chosen, n_rows), float64
            By the assay part, from the markers and the references alone; else as the
            view has them.
        """
        if self.assay is None or data.values is None:
            return view.columns(features, rows)
        references = self.assay.reference_candidates(data.context)
        measured = np.union1d(features, references)
        _state, alone = self.assay.prepare(
            self.assay.base(data.values[measured]),
            training,
            np.full(len(measured), "", object),
            data.context.among(measured),
        )
        return alone.columns(np.searchsorted(measured, features), rows)
