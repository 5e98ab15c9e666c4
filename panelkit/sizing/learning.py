"""How accuracy would go on with more people: an inverse power of their number."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from panelkit.config import SIZING
from panelkit.errors import UsageError
from panelkit.records import LearningPoint
from panelkit.sizing.demands import LARGEST

__all__ = ["LearningFit", "fit_learning_curve"]

LEAST_POINTS = 3
STEEPEST = 2.0
RATES = np.linspace(0.05, STEEPEST, 118)


@dataclass(frozen=True, slots=True, eq=False)
class LearningFit:
    """An inverse-power curve through the points of a learning curve.

    Attributes
    ----------
    plateau : float
        Metric that the curve goes to.
    distance, rate : float
        metric(n) = plateau - distance n^-rate.
    draws : ndarray of shape (n_draws, 3)
        The same three for points drawn anew within their standard errors.
    at_edge : bool
        Whether plateau or rate is at the edge of what was allowed, so that the points
        do not determine the curve.
    """

    plateau: float
    distance: float
    rate: float
    draws: NDArray[np.float64]
    at_edge: bool

    def metric(self, n_people: float) -> float:
        """Return the metric expected with so many training subjects."""
        return float(self.plateau - self.distance * n_people**-self.rate)

    def interval(
        self, n_people: float, confidence: float = SIZING.confidence
    ) -> tuple[float, float]:
        """Return the quantiles of the redrawn curves at a number of subjects."""
        values = self.draws[:, 0] - self.draws[:, 1] * n_people ** -self.draws[:, 2]
        tail = 0.5 - 0.5 * confidence
        low, high = np.quantile(values, [tail, 1.0 - tail])
        return float(low), float(high)

    def people_for(self, metric: float) -> float:
        """Return the training subjects for a metric; infinite where it is not met."""
        if metric >= self.plateau:
            return float("inf")
        if self.distance <= 0.0:
            return 0.0
        log_n = np.log(self.distance / (self.plateau - metric)) / self.rate
        return float(np.exp(log_n)) if log_n < np.log(LARGEST) else float("inf")


def fit_learning_curve(
    points: Sequence[LearningPoint],
    generator: np.random.Generator,
    best: float = 1.0,
    n_draws: int = SIZING.chance_draws,
) -> LearningFit:
    """Return the inverse-power curve of a nested metric against training subjects.

    Parameters
    ----------
    points : sequence of LearningPoint
        At least three, of different numbers of subjects.
    generator : numpy.random.Generator
        For drawing points anew.
    best : float
        Largest value that the metric can have.
    n_draws : int
        Curves for the interval.

    Returns
    -------
    LearningFit
        Least squares weighted by the points' standard errors; the plateau is at most
        `best`, the distance at least 0, the rate between 0.05 and 2. Errors of the
        points are drawn independently, although their training sets overlap.

    Raises
    ------
    UsageError
        Fewer than three usable points.

    References
    ----------
    Mukherjee et al. 2003, J Comput Biol 10:119; Figueroa et al. 2012, BMC Med Inform
    Decis Mak 12:8.
    """
    usable = [p for p in points if np.isfinite(p.metric) and np.isfinite(p.n_subjects)]
    people = np.array([p.n_subjects for p in usable])
    if len(np.unique(people)) < LEAST_POINTS:
        raise UsageError(
            code="learning-curve-short",
            where="learning curve",
            what=f"{len(np.unique(people))} numbers of people do not make a curve of "
            "three parameters",
            accepted=f"at least {LEAST_POINTS} of them",
            next_step="Run the study with [accuracy] learning_curve = true and more "
            "people",
        )
    metric = np.array([p.metric for p in usable])
    se = np.array([p.metric_se_corrected for p in usable])
    known = np.isfinite(se) & (se > 0.0)
    se = np.where(known, se, np.max(se[known], initial=0.05))
    fit = _least_squares(people, metric, se, best)
    shaken = metric + se * generator.normal(size=(n_draws, len(metric)))
    draws = np.array([_least_squares(people, each, se, best) for each in shaken])
    edge = fit[0] >= best - 1e-9 or fit[2] <= RATES[0] or fit[2] >= STEEPEST
    return LearningFit(*fit, draws, bool(edge or fit[1] <= 0.0))


def _least_squares(
    people: NDArray[np.float64],
    metric: NDArray[np.float64],
    se: NDArray[np.float64],
    best: float,
) -> tuple[float, float, float]:
    """Return plateau, distance and rate: for each rate the rest is linear.

    A grid over the rate with the exact solution of the other two under their bounds
    finds the global optimum, which a general search from a start may miss.
    """
    weight = 1.0 / se**2
    weight = weight / weight.sum()
    found = (np.inf, 0.0, 0.0, 1.0)
    for rate in RATES:
        power = people**-rate
        mean_p, mean_m = weight @ power, weight @ metric
        spread = weight @ (power - mean_p) ** 2
        distance = -(weight @ ((power - mean_p) * (metric - mean_m))) / spread
        distance = max(0.0, distance)
        plateau = mean_m + distance * mean_p
        if plateau > best:
            plateau = best
            distance = max(
                0.0, float(weight @ (power * (best - metric)) / (weight @ power**2))
            )
        loss = float(weight @ (metric - plateau + distance * power) ** 2)
        if loss < found[0] - 1e-18:
            found = (loss, float(plateau), float(distance), float(rate))
    return found[1:]
