"""What is predicted, and how predictions of it are judged.

The procedure, the makers and the comparators know no kind of outcome: they ask a task
for the family of the fits, for a loss to tune by and for a metric to be judged by.
"""

from abc import ABC, abstractmethod
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, Literal, Protocol

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import minimize

from panelkit.fits import Family, fit_panels
from panelkit.metrics import (
    CrossValidated,
    areas,
    auc,
    calibration_slope,
    concordance,
    cross_validate,
    cross_validated_auc,
    hand_till,
    linear_slope,
    log_loss,
    log_loss_of_classes,
    r_squared,
    softmax,
)
from panelkit.records import FoldPlan

__all__ = [
    "BinaryTask",
    "ClassesTask",
    "NumberTask",
    "SurvivalTask",
    "Task",
]

Scale = Literal["log-odds", "plain"]
FLAT = 1e-8  # predictions that vary less than this have no slope


class Task(Protocol):
    """An outcome with its family, its loss and its metric.

    Predictions are linear predictors: log-odds, log chances of each class, values, or
    log hazard ratios, of shape (n_rows,) or (n_classes, n_rows).
    """

    @property
    def family(self) -> Family:
        """Family of the fits."""
        ...

    @property
    def metric(self) -> str:
        """Code of the metric."""
        ...

    @property
    def metric_words(self) -> str:
        """The metric in words."""
        ...

    @property
    def no_skill(self) -> float:
        """What the metric is worth where nothing is predicted."""
        ...

    @property
    def predictors(self) -> tuple[int, ...]:
        """Leading axes of a prediction: (), or (n_classes,)."""
        ...

    @property
    def strata(self) -> NDArray[np.int64]:
        """Labels of shape (n_samples,) that folds and halves keep in proportion."""
        ...

    def outcome(self, rows: NDArray[np.int64] | None = None) -> Any:
        """Return the outcome of some rows (None: of all) as the fits take it."""
        ...

    def loss(
        self,
        predicted: NDArray[np.float64],
        rows: NDArray[np.int64],
        weights: NDArray[np.float64],
    ) -> float:
        """Return the loss on test rows, by which penalties are tuned."""
        ...

    def losses(
        self,
        predicted: NDArray[np.float64],
        rows: NDArray[np.int64],
        weights: NDArray[np.float64],
    ) -> NDArray[np.float64]:
        """Return the loss of many predictions, (n_panels[, n_classes], n_rows)."""
        ...

    def score(
        self,
        predicted: NDArray[np.float64],
        training: NDArray[np.int64],
        rows: NDArray[np.int64],
        weights: NDArray[np.float64],
    ) -> float:
        """Return the metric on test rows, higher better; NaN where undefined."""
        ...

    def all_scores(
        self,
        predicted: NDArray[np.float64],
        training: NDArray[np.int64],
        rows: NDArray[np.int64],
        weights: NDArray[np.float64],
    ) -> NDArray[np.float64]:
        """Return the metric of many predictions, (n_panels[, n_classes], n_rows)."""
        ...

    def cross_validated(
        self,
        predicted: NDArray[np.float64],
        folds: FoldPlan,
        subjects: NDArray[np.int64],
        weights: NDArray[np.float64],
        confidence: float,
    ) -> CrossValidated:
        """Return the metric within test folds with its interval.

        Parameters
        ----------
        predicted : ndarray of shape (n_repeats[, n_classes], n_samples)
            Out-of-fold predictions.
        folds : FoldPlan
            Who was tested when.
        subjects, weights : ndarray of shape (n_samples,)
            Subject codes and observation weights.
        confidence : float
            For example 0.95.
        """
        ...

    def slope(
        self, predicted: NDArray[np.float64], weights: NDArray[np.float64]
    ) -> float:
        """Return the calibration slope of one repeat's predictions; NaN if none."""
        ...

    def scores(self, predicted: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return predictions as people read them: chances, values, log hazards."""
        ...

    def columns(self) -> Mapping[str, NDArray[Any]]:
        """Return the outcome as columns of `predictions.csv`."""
        ...


class _OneByOne:
    """What holds of every task: many predictions are judged one by one."""

    __slots__ = ()

    def losses(
        self: Task,
        predicted: NDArray[np.float64],
        rows: NDArray[np.int64],
        weights: NDArray[np.float64],
    ) -> NDArray[np.float64]:
        """Return the loss of many predictions."""
        return np.array([self.loss(one, rows, weights) for one in predicted])

    def all_scores(
        self: Task,
        predicted: NDArray[np.float64],
        training: NDArray[np.int64],
        rows: NDArray[np.int64],
        weights: NDArray[np.float64],
    ) -> NDArray[np.float64]:
        """Return the metric of many predictions."""
        return np.array([self.score(one, training, rows, weights) for one in predicted])


class _JudgedByFold(_OneByOne, ABC):
    """A task whose metric comes with each row's influence on it."""

    __slots__ = ()

    scale: Scale

    @abstractmethod
    def judged(
        self,
        predicted: NDArray[np.float64],
        training: NDArray[np.int64],
        rows: NDArray[np.int64],
        weights: NDArray[np.float64],
    ) -> tuple[float, NDArray[np.float64]]:
        """Return the metric on test rows, and each row's influence."""

    def can_judge(self, rows: NDArray[np.int64]) -> bool:
        """Return whether the metric is defined on test rows."""
        return True

    def score(
        self,
        predicted: NDArray[np.float64],
        training: NDArray[np.int64],
        rows: NDArray[np.int64],
        weights: NDArray[np.float64],
    ) -> float:
        """Return the metric on test rows.

        Raises
        ------
        FitError
            Where the metric is not defined.
        """
        return self.judged(predicted, training, rows, weights)[0]

    def cross_validated(
        self,
        predicted: NDArray[np.float64],
        folds: FoldPlan,
        subjects: NDArray[np.int64],
        weights: NDArray[np.float64],
        confidence: float,
    ) -> CrossValidated:
        """Return the metric within test folds; see `cross_validate`."""

        def measure(
            repeat: int, test: NDArray[np.int64]
        ) -> tuple[float, NDArray[np.float64]] | None:
            if not self.can_judge(test):
                return None
            fold = int(folds.test_fold[repeat, test[0]])
            training = folds.split(repeat, fold)[0]
            return self.judged(predicted[repeat][..., test], training, test, weights)

        return cross_validate(
            measure, folds.test_fold, subjects, confidence, self.scale
        )


@dataclass(frozen=True, slots=True, eq=False)
class BinaryTask(_OneByOne):
    """Two classes.

    Attributes
    ----------
    y : ndarray of shape (n_samples,), float64
        1.0 for the positive class, else 0.0.
    """

    y: NDArray[np.float64]

    family: Family = "binomial"
    metric: str = "auc"
    metric_words: str = "area under the ROC curve"
    no_skill: float = 0.5
    predictors: tuple[int, ...] = ()

    @property
    def strata(self) -> NDArray[np.int64]:
        """The class."""
        return self.y.astype(np.int64)

    def outcome(self, rows: NDArray[np.int64] | None = None) -> Any:
        """Return 0 and 1."""
        return self.y if rows is None else self.y[rows]

    def loss(
        self,
        predicted: NDArray[np.float64],
        rows: NDArray[np.int64],
        weights: NDArray[np.float64],
    ) -> float:
        """Return the log loss."""
        return log_loss(predicted, self.y[rows], weights[rows])

    def losses(
        self,
        predicted: NDArray[np.float64],
        rows: NDArray[np.int64],
        weights: NDArray[np.float64],
    ) -> NDArray[np.float64]:
        """Return the loss of many predictions."""
        loss = np.logaddexp(0.0, predicted) - self.y[rows] * predicted
        return np.asarray(np.average(loss, axis=-1, weights=weights[rows]), np.float64)

    def score(
        self,
        predicted: NDArray[np.float64],
        training: NDArray[np.int64],
        rows: NDArray[np.int64],
        weights: NDArray[np.float64],
    ) -> float:
        """Return the area under the ROC curve.

        Raises
        ------
        FitError
            One class only.
        """
        return auc(predicted, self.y[rows], weights[rows])

    def all_scores(
        self,
        predicted: NDArray[np.float64],
        training: NDArray[np.int64],
        rows: NDArray[np.int64],
        weights: NDArray[np.float64],
    ) -> NDArray[np.float64]:
        """Return the metric of many predictions."""
        return areas(predicted, self.y[rows], weights[rows])

    def cross_validated(
        self,
        predicted: NDArray[np.float64],
        folds: FoldPlan,
        subjects: NDArray[np.int64],
        weights: NDArray[np.float64],
        confidence: float,
    ) -> CrossValidated:
        """Return the area within test folds; see `cross_validated_auc`."""
        return cross_validated_auc(
            predicted, self.y, folds.test_fold, subjects, weights, confidence
        )

    def slope(
        self, predicted: NDArray[np.float64], weights: NDArray[np.float64]
    ) -> float:
        """Return the slope of a logistic regression on the log-odds."""
        return calibration_slope(predicted, self.y, weights)

    def scores(self, predicted: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return chances of the positive class."""
        return 1.0 / (1.0 + np.exp(-predicted))

    def columns(self) -> Mapping[str, NDArray[Any]]:
        """Return ``outcome``, 0 and 1."""
        return {"outcome": self.y.astype(np.int64)}


@dataclass(frozen=True, slots=True, eq=False)
class ClassesTask(_JudgedByFold):
    """Three or more classes.

    Attributes
    ----------
    y : ndarray of shape (n_samples,), int64
        Class numbers from 0.
    names : tuple of str
        The classes.
    """

    y: NDArray[np.int64]
    names: tuple[str, ...]

    family: Family = "multinomial"
    metric: str = "hand-till"
    metric_words: str = "mean area under the ROC curve over pairs of classes"
    no_skill: float = 0.5
    scale: Scale = "log-odds"

    @property
    def predictors(self) -> tuple[int, ...]:
        """One predictor a class."""
        return (len(self.names),)

    @property
    def strata(self) -> NDArray[np.int64]:
        """The class."""
        return self.y

    def outcome(self, rows: NDArray[np.int64] | None = None) -> Any:
        """Return class numbers."""
        return self.y if rows is None else self.y[rows]

    def loss(
        self,
        predicted: NDArray[np.float64],
        rows: NDArray[np.int64],
        weights: NDArray[np.float64],
    ) -> float:
        """Return the log loss."""
        return log_loss_of_classes(predicted, self.y[rows], weights[rows])

    def judged(
        self,
        predicted: NDArray[np.float64],
        training: NDArray[np.int64],
        rows: NDArray[np.int64],
        weights: NDArray[np.float64],
    ) -> tuple[float, NDArray[np.float64]]:
        """Return the mean area over pairs of classes, and each row's influence.

        Raises
        ------
        FitError
            One class only.
        """
        return hand_till(softmax(predicted), self.y[rows], weights[rows])

    def can_judge(self, rows: NDArray[np.int64]) -> bool:
        """Return whether two classes are there."""
        return len(np.unique(self.y[rows])) > 1

    def slope(
        self, predicted: NDArray[np.float64], weights: NDArray[np.float64]
    ) -> float:
        """Return the slope, common to all classes, that fits the outcomes best.

        Each class has an intercept of its own.
        """
        centred = predicted - predicted.mean(axis=0)
        if not centred.std() > FLAT:
            return float("nan")
        share = weights / weights.sum()
        own = np.eye(len(self.names))[self.y].T

        def loss(at: NDArray[np.float64]) -> tuple[float, NDArray[np.float64]]:
            eta = at[1:, None] + at[0] * centred
            miss = share * (softmax(eta) - own)
            step = np.concatenate([[(miss * centred).sum()], miss.sum(axis=1)])
            return log_loss_of_classes(eta, self.y, share), step

        start = np.concatenate([[1.0], np.zeros(len(self.names))])
        found = minimize(loss, start, jac=True, method="BFGS")
        slope = float(found.x[0])
        return slope if abs(slope) < 1e3 else float("nan")

    def scores(self, predicted: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return chances of each class."""
        if predicted.ndim == 2:
            return softmax(predicted)
        return np.array([softmax(one) for one in predicted])

    def columns(self) -> Mapping[str, NDArray[Any]]:
        """Return ``outcome``, the class's name."""
        return {"outcome": np.array(self.names, object)[self.y]}


@dataclass(frozen=True, slots=True, eq=False)
class NumberTask(_JudgedByFold):
    """A measured number.

    Attributes
    ----------
    y : ndarray of shape (n_samples,), float64
        The values.
    """

    y: NDArray[np.float64]

    family: Family = "gaussian"
    metric: str = "r-squared"
    metric_words: str = "share of variance explained (R squared)"
    no_skill: float = 0.0
    scale: Scale = "plain"
    predictors: tuple[int, ...] = ()

    @property
    def strata(self) -> NDArray[np.int64]:
        """Whether the value is above the median."""
        return np.asarray(self.y > np.median(self.y), np.int64)

    def outcome(self, rows: NDArray[np.int64] | None = None) -> Any:
        """Return the values."""
        return self.y if rows is None else self.y[rows]

    def loss(
        self,
        predicted: NDArray[np.float64],
        rows: NDArray[np.int64],
        weights: NDArray[np.float64],
    ) -> float:
        """Return the mean squared error."""
        return float(np.average((self.y[rows] - predicted) ** 2, weights=weights[rows]))

    def losses(
        self,
        predicted: NDArray[np.float64],
        rows: NDArray[np.int64],
        weights: NDArray[np.float64],
    ) -> NDArray[np.float64]:
        """Return the loss of many predictions."""
        square = (self.y[rows] - predicted) ** 2
        return np.asarray(
            np.average(square, axis=-1, weights=weights[rows]), np.float64
        )

    def judged(
        self,
        predicted: NDArray[np.float64],
        training: NDArray[np.int64],
        rows: NDArray[np.int64],
        weights: NDArray[np.float64],
    ) -> tuple[float, NDArray[np.float64]]:
        """Return R squared against the training rows' mean, and influences."""
        centre = float(np.average(self.y[training], weights=weights[training]))
        return r_squared(predicted, self.y[rows], centre, weights[rows])

    def slope(
        self, predicted: NDArray[np.float64], weights: NDArray[np.float64]
    ) -> float:
        """Return the slope of measured on predicted values."""
        return linear_slope(predicted, self.y, weights)

    def scores(self, predicted: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return predicted values."""
        return predicted

    def columns(self) -> Mapping[str, NDArray[Any]]:
        """Return ``outcome``, the value."""
        return {"outcome": self.y}


@dataclass(frozen=True, slots=True, eq=False)
class SurvivalTask(_JudgedByFold):
    """A time that may be censored.

    Attributes
    ----------
    time, event : ndarray of shape (n_samples,), float64
        Follow-up; 1.0 where the event happened, 0.0 where censored.
    """

    time: NDArray[np.float64]
    event: NDArray[np.float64]

    family: Family = "cox"
    metric: str = "concordance"
    metric_words: str = "concordance"
    no_skill: float = 0.5
    scale: Scale = "log-odds"
    predictors: tuple[int, ...] = ()

    @property
    def strata(self) -> NDArray[np.int64]:
        """Whether the event happened."""
        return self.event.astype(np.int64)

    def outcome(self, rows: NDArray[np.int64] | None = None) -> Any:
        """Return (time, event)."""
        here = slice(None) if rows is None else rows
        return self.time[here], self.event[here]

    def loss(
        self,
        predicted: NDArray[np.float64],
        rows: NDArray[np.int64],
        weights: NDArray[np.float64],
    ) -> float:
        """Return minus the log partial likelihood of the test rows, an event.

        References
        ----------
        Verweij & van Houwelingen 1993, Stat Med 12:2305.
        """
        time, event, share = self.time[rows], self.event[rows], weights[rows]
        at_risk = time[None, :] >= time[:, None]
        top = float(predicted.max())
        total = (at_risk * share * np.exp(predicted - top)).sum(axis=1)
        mass = share * event
        if not mass.sum() > 0.0:
            return 0.0
        return float((mass * (top + np.log(total) - predicted)).sum() / mass.sum())

    def judged(
        self,
        predicted: NDArray[np.float64],
        training: NDArray[np.int64],
        rows: NDArray[np.int64],
        weights: NDArray[np.float64],
    ) -> tuple[float, NDArray[np.float64]]:
        """Return Harrell's concordance, and each row's influence.

        Raises
        ------
        FitError
            No pair can be compared.
        """
        return concordance(predicted, self.time[rows], self.event[rows], weights[rows])

    def can_judge(self, rows: NDArray[np.int64]) -> bool:
        """Return whether an event is there."""
        return bool(self.event[rows].any())

    def slope(
        self, predicted: NDArray[np.float64], weights: NDArray[np.float64]
    ) -> float:
        """Return the coefficient of a Cox regression on the log hazard ratio."""
        spread = float(predicted.std())
        if not spread > FLAT:
            return float("nan")
        column = ((predicted - predicted.mean()) / spread)[None, :]
        fit = fit_panels(
            column,
            [np.array([0])],
            self.outcome(),
            weights,
            np.array([1e-9]),  # so small that it is no penalty
            family="cox",
        )
        return float(fit.coefs[0, 0, 1]) / spread

    def scores(self, predicted: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return log hazard ratios."""
        return predicted

    def columns(self) -> Mapping[str, NDArray[Any]]:
        """Return ``outcome``, the time, and ``event``."""
        return {"outcome": self.time, "event": self.event.astype(np.int64)}
