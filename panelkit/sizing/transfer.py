"""What added error of an assay does to a panel whose weights stay: closed forms."""

import math
from collections.abc import Sequence
from dataclasses import dataclass
from statistics import NormalDist

import numpy as np
from numpy.typing import NDArray

from panelkit.config import SIZING
from panelkit.errors import UsageError, name_some
from panelkit.metrics import cv_from_log2_sd, log2_sd_from_cv
from panelkit.sizing.demands import check_count

__all__ = [
    "AssayError",
    "MarkerLimits",
    "PanelModel",
    "area_with_error",
    "assay_limits",
    "attenuated_area",
    "common_limit",
    "locked_operating_point",
    "refitted_area",
    "replicates_needed",
]

NORMAL = NormalDist()


def attenuated_area(area: float, reliability: float) -> float:
    """Return the area of a score read with a reliability: Phi(sqrt(r) Phi^-1(A)).

    Parameters
    ----------
    area : float
        Without the error.
    reliability : float
        Within-class variance over the same with the error's.

    Returns
    -------
    float
        For scores normal with one variance in both classes and equal errors.

    References
    ----------
    Spearman 1904, Am J Psychol 15:72 (reliability); Pepe 2003, The Statistical
    Evaluation of Medical Tests, section 4.4 (binormal area).
    """
    return NORMAL.cdf(math.sqrt(reliability) * NORMAL.inv_cdf(area))


@dataclass(frozen=True, slots=True, eq=False)
class PanelModel:
    """A panel as the closed forms see it: normal markers, one covariance.

    Attributes
    ----------
    markers : tuple of str
        Names.
    weights : ndarray of shape (n_markers,)
        Of the score, which is their sum with the values.
    differences : ndarray of shape (n_markers,)
        Cases less controls, on the scale of the values.
    covariance : ndarray of shape (n_markers, n_markers)
        Within classes; the discovery platform's own error is in it already.
    """

    markers: tuple[str, ...]
    weights: NDArray[np.float64]
    differences: NDArray[np.float64]
    covariance: NDArray[np.float64]

    @property
    def distance(self) -> float:
        """Difference of the classes' mean scores."""
        return float(self.weights @ self.differences)

    @property
    def variance(self) -> float:
        """Variance of the score within a class."""
        return float(self.weights @ self.covariance @ self.weights)

    @property
    def area(self) -> float:
        """Area under the ROC curve without any further error."""
        return NORMAL.cdf(self.distance / math.sqrt(2.0 * self.variance))

    def scaled_to(self, area: float) -> "PanelModel":
        """Return the panel with differences shrunk by one factor to reach an area.

        Raises
        ------
        UsageError
            The score does not point to the cases, or the area is not above one half.
        """
        if not (0.5 < area < 1.0 and self.distance > 0.0):
            raise UsageError(
                code="panel-area-refused",
                where="area under the ROC curve of the panel",
                what=f"the panel cannot be scaled to it (got {area:g})",
                accepted="an area above 0.5 and below 1, and weights that point to the "
                "cases",
                next_step="Give the panel's honest area",
            )
        factor = NORMAL.inv_cdf(area) * math.sqrt(2.0 * self.variance) / self.distance
        return PanelModel(
            self.markers, self.weights, factor * self.differences, self.covariance
        )

    @classmethod
    def of_effects(
        cls,
        markers: Sequence[str],
        differences: Sequence[float],
        sds: Sequence[float],
        correlation: float = 0.0,
        weights: Sequence[float] | None = None,
    ) -> "PanelModel":
        """Return a panel from each marker's difference and SD.

        Parameters
        ----------
        markers : sequence of str
            Names.
        differences, sds : sequence of float
            Cases less controls, and within-class SD, on one scale.
        correlation : float
            Of any two markers, once each points to the cases.
        weights : sequence of float, optional
            None takes those of the linear discriminant.

        Returns
        -------
        PanelModel
            With its covariance.

        Raises
        ------
        UsageError
            An SD of nothing, a correlation that cannot be, or a panel without markers.
        """
        delta, sd = np.asarray(differences, float), np.asarray(sds, float)
        bad = [m for m, s in zip(markers, sd, strict=True) if not s > 0.0]
        bad += [m for m, d in zip(markers, delta, strict=True) if not np.isfinite(d)]
        if bad or not len(markers):
            raise UsageError(
                code="marker-without-spread",
                where="markers",
                what=f"difference or SD is missing or not above 0 for "
                f"{name_some(bad) if bad else 'a panel without markers'}",
                accepted="a finite difference and an SD above 0 for each marker",
                next_step="Write markers as NAME=DIFFERENCE:SD",
            )
        least = -1.0 / (len(markers) - 1) if len(markers) > 1 else -1.0
        if not least < correlation < 1.0:
            raise UsageError(
                code="correlation-refused",
                where="correlation of the markers",
                what=f"{len(markers)} markers cannot all correlate so (got "
                f"{correlation:g})",
                accepted=f"a number above {least:.3g} and below 1",
                next_step="Correct it, or leave it out",
            )
        sign = np.where(delta < 0.0, -1.0, 1.0)
        shape = correlation * np.outer(sign, sign)
        np.fill_diagonal(shape, 1.0)
        covariance = shape * np.outer(sd, sd)
        own = (
            np.linalg.solve(covariance, delta)
            if weights is None
            else np.asarray(weights, float)
        )
        return cls(tuple(markers), own, delta, covariance)


@dataclass(frozen=True, slots=True)
class AssayError:
    """Error of a new assay beyond that of the discovery platform.

    Attributes
    ----------
    within : tuple of float
        SD of one reading, independent from sample to sample, of each marker.
    between : tuple of float
        SD of a shift that all samples of a plate share, of each marker.
    n_plates : int
        Over which each class is spread evenly.
    """

    within: tuple[float, ...]
    between: tuple[float, ...]
    n_plates: int = SIZING.plates

    @classmethod
    def of_cv(
        cls,
        n_markers: int,
        within: float,
        between: float = 0.0,
        n_plates: int = SIZING.plates,
        replicates: int = 1,
    ) -> "AssayError":
        """Return the same error for every marker, from coefficients of variation.

        Parameters
        ----------
        n_markers : int
            Of the panel.
        within, between : float
            Fractions; only the part within a run shrinks with replicates.
        n_plates, replicates : int
            Plates of the study; readings averaged on the log scale.

        Returns
        -------
        AssayError
            On the log2 scale.
        """
        check_count("number of plates", n_plates)
        own = log2_sd_from_cv(within, replicates)
        shared = log2_sd_from_cv(between)
        return cls((own,) * n_markers, (shared,) * n_markers, n_plates)


def area_with_error(model: PanelModel, error: AssayError) -> float:
    """Return the expected area once the error is added and the weights stay.

    Parameters
    ----------
    model : PanelModel
        The panel.
    error : AssayError
        Within and between plates, markers independent.

    Returns
    -------
    float
        A case and a control on one plate share its shift, which then cancels; of all
        such pairs 1 / n_plates do.

    References
    ----------
    Pepe 2003, The Statistical Evaluation of Medical Tests, section 4.4, for the
    binormal area; the two kinds of pairs are added by their shares.
    """
    squares = model.weights**2
    own = float(squares @ np.square(error.within))
    shared = float(squares @ np.square(error.between))
    same = NORMAL.cdf(model.distance / math.sqrt(2.0 * (model.variance + own)))
    apart = NORMAL.cdf(
        model.distance / math.sqrt(2.0 * (model.variance + own + shared))
    )
    return same / error.n_plates + apart * (1.0 - 1.0 / error.n_plates)


def refitted_area(model: PanelModel, added_sd: Sequence[float]) -> float:
    """Return the area of the best linear score on the new platform.

    Parameters
    ----------
    model : PanelModel
        Differences and covariance.
    added_sd : sequence of float
        Of each marker's added error.

    Returns
    -------
    float
        With d^2 = D' (S + S_e)^-1 D.

    References
    ----------
    Fisher 1936, Ann Eugen 7:179: the linear discriminant.
    """
    total = model.covariance + np.diag(np.square(np.asarray(added_sd, float)))
    squared = float(model.differences @ np.linalg.solve(total, model.differences))
    return NORMAL.cdf(math.sqrt(squared / 2.0))


@dataclass(frozen=True, slots=True)
class MarkerLimits:
    """What one marker's assay has to reach for a stated loss of area.

    Attributes
    ----------
    marker : str
        Its name.
    weight : float
        In the score.
    alone_cv, alone_plate_cv : float
        Largest added CV, a fraction, when this marker alone has it: independent, and
        shared by a plate. Infinite where no error costs so much.
    alone_correlation : float
        Least correlation with the discovery platform within a class, this marker
        alone.
    all_correlation : float
        The same when every marker has the common CV.
    one_class_shift : float
        Largest shift of one class against the other.
    everybody_shift : float
        Largest shift of all samples at the locked cut-off.
    """

    marker: str
    weight: float
    alone_cv: float
    alone_plate_cv: float
    alone_correlation: float
    all_correlation: float
    one_class_shift: float
    everybody_shift: float


def _target(model: PanelModel, loss: float) -> float:
    if not (math.isfinite(loss) and 0.0 < loss < model.area - 0.5):
        raise UsageError(
            code="loss-out-of-range",
            where="loss of area",
            what=f"the panel cannot lose it (got {loss:g} of an area of "
            f"{model.area:.3g})",
            accepted=f"a number above 0 and below {model.area - 0.5:.3g}",
            next_step="State a loss such as 0.02",
        )
    return model.area - loss


def _room(model: PanelModel, target: float) -> float:
    """Return the error variance of the score at which the area falls to a target."""
    if target <= 0.5:
        return math.inf
    needed = model.distance / NORMAL.inv_cdf(target)
    return needed**2 / 2.0 - model.variance


def _plate_target(model: PanelModel, target: float, n_plates: int) -> float:
    """Return the area that pairs on two plates may fall to."""
    if n_plates == 1:
        return 0.0
    return (target - model.area / n_plates) / (1.0 - 1.0 / n_plates)


def common_limit(
    model: PanelModel, loss: float, n_plates: int = SIZING.plates
) -> tuple[float, float]:
    """Return the largest added SD of every marker at once.

    Parameters
    ----------
    model : PanelModel
        The panel.
    loss : float
        Of area.
    n_plates : int
        Over which each class is spread evenly.

    Returns
    -------
    independent, shared : float
        On the scale of the values; infinite where no error costs so much.

    Raises
    ------
    UsageError
        A loss that the panel cannot have.
    """
    check_count("number of plates", n_plates)
    target = _target(model, loss)
    total = float(np.square(model.weights).sum())
    own = _room(model, target)
    shared = _room(model, _plate_target(model, target, n_plates))
    return math.sqrt(own / total), math.sqrt(shared / total)


def assay_limits(
    model: PanelModel,
    loss: float,
    n_plates: int = SIZING.plates,
    specificity: float = SIZING.cut_off_specificity,
    point_loss: float = SIZING.point_loss,
) -> tuple[MarkerLimits, ...]:
    """Return what each marker's assay has to reach.

    Parameters
    ----------
    model : PanelModel
        The panel, on the log2 scale.
    loss : float
        Of area.
    n_plates : int
        Over which each class is spread evenly.
    specificity : float
        At the locked cut-off.
    point_loss : float
        Largest loss of sensitivity or specificity there, for the shift of everybody.

    Returns
    -------
    tuple of MarkerLimits
        In the order of the panel.

    Raises
    ------
    UsageError
        A loss that the panel cannot have.
    """
    target = _target(model, loss)
    common = common_limit(model, loss, n_plates)[0]
    own = _room(model, target)
    shared = _room(model, _plate_target(model, target, n_plates))
    step = model.distance - NORMAL.inv_cdf(target) * math.sqrt(2.0 * model.variance)
    everybody = _largest_shift(model, specificity, point_loss)
    found = []
    for j, marker in enumerate(model.markers):
        weight = abs(float(model.weights[j]))
        sd = math.sqrt(float(model.covariance[j, j]))
        free = weight == 0.0
        own_sd = math.inf if free else math.sqrt(own) / weight
        plate_sd = math.inf if free else math.sqrt(shared) / weight
        found.append(
            MarkerLimits(
                marker,
                float(model.weights[j]),
                cv_from_log2_sd(own_sd),
                cv_from_log2_sd(plate_sd),
                1.0 / math.sqrt(1.0 + (own_sd / sd) ** 2),
                1.0 / math.sqrt(1.0 + (common / sd) ** 2),
                math.inf if free else step / weight,
                math.inf if free else everybody / weight,
            )
        )
    return tuple(found)


def _largest_shift(model: PanelModel, specificity: float, point_loss: float) -> float:
    """Return the shift of the score at which one of the two figures falls too far."""
    sd = math.sqrt(model.variance)
    cut = NORMAL.inv_cdf(specificity)
    sensitivity = 1.0 - NORMAL.cdf(cut - model.distance / sd)
    up = cut - NORMAL.inv_cdf(max(specificity - point_loss, 1e-12))
    down = NORMAL.inv_cdf(sensitivity) - NORMAL.inv_cdf(
        max(sensitivity - point_loss, 1e-12)
    )
    return sd * min(up, down)


def locked_operating_point(
    model: PanelModel, specificity: float, added_variance: float, shift: float
) -> tuple[float, float]:
    """Return sensitivity and specificity at a cut-off that was locked before.

    Parameters
    ----------
    model : PanelModel
        The panel.
    specificity : float
        At the cut-off, without error.
    added_variance : float
        Of the score.
    shift : float
        Of the score, in everybody.

    Returns
    -------
    sensitivity, specificity : float
        After error and shift.
    """
    sd = math.sqrt(model.variance)
    cut = NORMAL.inv_cdf(specificity) * sd
    spread = math.sqrt(model.variance + added_variance)
    return (
        1.0 - NORMAL.cdf((cut - model.distance - shift) / spread),
        NORMAL.cdf((cut - shift) / spread),
    )


def replicates_needed(
    model: PanelModel,
    loss: float,
    within: float,
    between: float = 0.0,
    n_plates: int = SIZING.plates,
    most: int = 100,
) -> int | None:
    """Return how many replicates keep the loss of area, or None.

    Parameters
    ----------
    model : PanelModel
        The panel, on the log2 scale.
    loss : float
        Largest loss of area.
    within, between : float
        Added CV as a fraction; only the part within a run shrinks.
    n_plates : int
        Over which each class is spread evenly.
    most : int
        Replicates that are tried.

    Returns
    -------
    int or None
        The smallest number; None where even `most` do not suffice.

    Raises
    ------
    UsageError
        A loss that the panel cannot have.
    """
    target = _target(model, loss)
    n = len(model.markers)
    for replicates in range(1, most + 1):
        error = AssayError.of_cv(n, within, between, n_plates, replicates)
        if area_with_error(model, error) >= target:
            return replicates
    return None
