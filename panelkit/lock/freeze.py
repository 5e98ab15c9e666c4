"""From a chosen panel to a locked one: refit on everybody, shrunk, frozen."""

import hashlib
import json
import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import PanelFileError
from panelkit.fits import fit_panels, standardised
from panelkit.lock.assay_part import FrozenAssay, assay_obstacles, freeze_assay
from panelkit.lock.cutoffs import CutOffRule, Judged, choose_cutoff
from panelkit.lock.panel_file import sealed
from panelkit.lock.scoring import prepared_sample, single
from panelkit.metrics import calibration_in_the_large, recalibration
from panelkit.preparation import Recipe
from panelkit.records import (
    RESEARCH_USE,
    Fallback,
    HonestFigures,
    PanelContent,
    PanelMarker,
    RecipeContext,
    RecipeState,
    TrainingRows,
)

__all__ = [
    "ChosenPanel",
    "OutOfFoldRows",
    "TaughtOn",
    "freeze_panel",
    "id_hash",
    "reasons_against",
    "value_hash",
    "with_cutoffs",
]


@dataclass(frozen=True, slots=True, eq=False)
class TaughtOn:
    """The rows, preparation and origin that all panels of a run share.

    Attributes
    ----------
    values : ndarray of shape (n_features, n_samples)
        As read.
    context : RecipeContext
        Features, samples, roles, analytes.
    units : ndarray of shape (n_features,), object, or None
        Units of the features.
    discovery : Recipe
        Of everything that selects.
    assay : Recipe or None
        None: the discovery part is frozen, if one new sample can do it.
    state : RecipeState
        What the discovery part learnt from all rows.
    outcome, weights : ndarray of shape (n_samples,)
        0 and 1; 1 / samples of the subject.
    subjects : ndarray of shape (n_samples,), int64
        Subject codes.
    subject_ids : ndarray of shape (n_subjects,), object
        Ids of the subjects.
    column, negative, positive : str
        The outcome as the sample sheet writes it.
    design : str
        How people came into the study.
    prevalence : float
        That chances are to be stated for; NaN: the study's own.
    study : str
        Name of the study file.
    record : mapping of str to object
        Content of ``record.json``.
    seed : int
        Root of the draws.
    """

    values: NDArray[np.floating[Any]]
    context: RecipeContext
    units: NDArray[np.object_] | None
    discovery: Recipe
    assay: Recipe | None
    state: RecipeState
    outcome: NDArray[np.float64]
    weights: NDArray[np.float64]
    subjects: NDArray[np.int64]
    subject_ids: NDArray[np.object_]
    column: str
    negative: str
    positive: str
    design: str
    prevalence: float
    study: str
    record: Mapping[str, Any]
    seed: int


@dataclass(frozen=True, slots=True, eq=False)
class ChosenPanel:
    """One panel of a run, and what the run knows of it.

    Attributes
    ----------
    name : str
        ``maker-size``.
    markers : ndarray of int64
        Positions among the features, in the maker's order.
    penalty : float
        Tuned ridge penalty.
    out_of_fold : ndarray of shape (n_repeats, n_samples)
        Log-odds by models that saw neither the sample nor its subject: nested ones
        where a rule chose.
    metric_of : str
        What these predictions are of.
    metric, metric_low, metric_high : float
        Their honest figures.
    losses : mapping of str to tuple of float
        Marker to (metric, loss, low, high) of panels that lost it by role; empty where
        that is not known.
    """

    name: str
    markers: NDArray[np.int64]
    penalty: float
    out_of_fold: NDArray[np.float64]
    metric_of: str
    metric: float
    metric_low: float
    metric_high: float
    losses: Mapping[str, tuple[float, float, float, float]]


def id_hash(name: str) -> str:
    """Return what stands for an id in a panel file."""
    return hashlib.sha256(f"id:{name}".encode()).hexdigest()[:20]


def value_hash(measured: Sequence[float]) -> str:
    """Return what stands for a sample's measured marker values in a panel file."""
    # four digits survive every rounding of a table
    text = json.dumps([f"{single(value):.4g}" for value in measured])
    return hashlib.sha256(text.encode()).hexdigest()[:20]


def freeze_panel(
    panel: ChosenPanel,
    taught: TaughtOn,
    cutoffs: Sequence[CutOffRule],
    draws: np.random.Generator,
    assay_cv: float = 0.0,
) -> PanelContent:
    """Return the locked panel.

    The panel is refitted on all rows with its tuned ridge penalty; its log-odds are
    multiplied by the out-of-fold calibration slope where that is below 1, and the
    intercept is set so that the chances are right on average.

    Parameters
    ----------
    panel : ChosenPanel
        What is locked.
    taught : TaughtOn
        What it is refitted on.
    cutoffs : sequence of CutOffRule
        Chosen on the recalibrated out-of-fold chances.
    draws : numpy.random.Generator
        For the bootstrap of the cut-offs.
    assay_cv : float
        Coefficient of variation of the new assay beyond that of the training data, a
        share; widens the grey zone. Needs a logarithm among the steps.

    Returns
    -------
    PanelContent
        Sealed.

    Raises
    ------
    StudyFileError
        The preparation needs features beside the panel's.
    PanelFileError
        The out-of-fold predictions show no accuracy to be locked.
    UsageError
        A cut-off that the number of people cannot support.

    References
    ----------
    van Houwelingen & le Cessie 1990, Stat Med 9:1303 (shrinkage by the calibration
    slope of cross-validated predictions); Anderson 1972, Biometrika 59:19 (intercept
    of case-control data for another prevalence).
    """
    slope = _slope(panel.out_of_fold, taught.outcome, taught.weights)
    if slope <= 0.0:
        raise PanelFileError(
            code="panel-without-accuracy",
            where=f"panel {panel.name}",
            what=_WRONG_WAY.format(slope),
            accepted="a panel whose out-of-fold predictions follow the outcome",
            next_step="Lock another panel, or gather more people",
        )
    frozen = freeze_assay(
        taught.discovery,
        taught.assay,
        taught.state,
        taught.values,
        panel.markers,
        taught.context,
    )
    # NaN: separated, or constant
    shrinkage = 1.0 if math.isnan(slope) else min(slope, 1.0)
    model = _Model(panel, taught, frozen, shrinkage)
    content = _content(panel, taught, model, slope)
    seen = OutOfFoldRows(
        panel.out_of_fold, taught.outcome, taught.weights, taught.subjects
    )
    return with_cutoffs(content, seen, cutoffs, draws, assay_cv=assay_cv)


@dataclass(frozen=True, slots=True, eq=False)
class OutOfFoldRows:
    """Out-of-fold predictions with the outcomes of the rows.

    Attributes
    ----------
    log_odds : ndarray of shape (n_repeats, n_samples)
        NaN for samples that were never tested.
    outcome, weights : ndarray of shape (n_samples,)
        0 and 1; 1 / samples of the subject.
    subjects : ndarray of shape (n_samples,), int64
        Codes.
    """

    log_odds: NDArray[np.float64]
    outcome: NDArray[np.float64]
    weights: NDArray[np.float64]
    subjects: NDArray[np.int64]


def with_cutoffs(
    content: PanelContent,
    seen: OutOfFoldRows,
    cutoffs: Sequence[CutOffRule],
    draws: np.random.Generator,
    *,
    prevalence: float = float("nan"),
    assay_cv: float = 0.0,
) -> PanelContent:
    """Return a locked panel with cut-offs on its recalibrated out-of-fold chances.

    Parameters
    ----------
    content : PanelContent
        The panel; cut-offs that it has are replaced.
    seen : OutOfFoldRows
        What it is recalibrated on.
    cutoffs : sequence of CutOffRule
        May be empty.
    draws : numpy.random.Generator
        For the bootstrap.
    prevalence : float
        For predictive values; NaN: the panel's own, if stated.
    assay_cv : float
        As for `freeze_panel`.

    Returns
    -------
    PanelContent
        Sealed.

    Raises
    ------
    UsageError
        A cut-off that the number of people cannot support.
    """
    tested = ~np.isnan(seen.log_odds).any(axis=0)
    log_odds = content.honest.shrinkage * seen.log_odds[:, tested]
    y, weights = seen.outcome[tested], seen.weights[tested]
    repeats = len(log_odds)
    centre, _se = calibration_in_the_large(
        log_odds.ravel(), np.tile(y, repeats), np.tile(weights, repeats)
    )
    share = content.training.prevalence
    own = content.prevalence if math.isnan(prevalence) else prevalence
    offset = _offset(content.design, content.prevalence, share)
    judged = Judged(
        log_odds + centre + offset,
        y,
        weights,
        seen.subjects[tested],
        own,
        _assay_deviation(content, assay_cv),
        draws,
    )
    found = tuple(choose_cutoff(rule, judged) for rule in cutoffs)
    return sealed(replace(content, cutoffs=found))


def reasons_against(panel: ChosenPanel, taught: TaughtOn) -> tuple[str, ...]:
    """Return why a panel cannot be locked.

    Parameters
    ----------
    panel : ChosenPanel
        What would be locked.
    taught : TaughtOn
        What it would be refitted on.

    Returns
    -------
    tuple of str
        Empty for a panel that can be.
    """
    found = list(
        assay_obstacles(
            taught.discovery, taught.assay, taught.state, panel.markers, taught.context
        )
    )
    slope = _slope(panel.out_of_fold, taught.outcome, taught.weights)
    if slope <= 0.0:
        found.append(_WRONG_WAY.format(slope))
    return tuple(found)


_WRONG_WAY = (
    "out-of-fold predictions point the wrong way (calibration slope {:.2f}): there is "
    "no accuracy to be locked"
)


def _offset(design: str, prevalence: float, share: float) -> float:
    """Return what moves log-odds from the study's share of cases to a prevalence."""
    if design == "cohort" or math.isnan(prevalence):
        return 0.0
    return math.log(prevalence / (1.0 - prevalence)) - math.log(share / (1.0 - share))


def _slope(
    out_of_fold: NDArray[np.float64],
    outcome: NDArray[np.float64],
    weights: NDArray[np.float64],
) -> float:
    """Return the calibration slope of out-of-fold predictions, repeats together."""
    tested = ~np.isnan(out_of_fold).any(axis=0)
    repeats = len(out_of_fold)
    return recalibration(
        out_of_fold[:, tested].ravel(),
        np.tile(outcome[tested], repeats),
        np.tile(weights[tested], repeats),
    ).slope


class _Model:
    """Coefficients of a panel, whole and without each marker."""

    def __init__(
        self,
        panel: ChosenPanel,
        taught: TaughtOn,
        frozen: FrozenAssay,
        shrinkage: float,
    ) -> None:
        self.frozen = frozen
        self.shrinkage = shrinkage
        self._taught, self._penalty = taught, panel.penalty
        everything = np.concatenate([panel.markers, frozen.reference_rows])
        self.measured = np.array(taught.values[everything], np.float64)
        self.raw = _prepared(frozen, self.measured)
        fill = frozen.fill[:, None]
        self.prepared = np.where(np.isnan(self.raw), fill, self.raw)
        share = float(np.average(taught.outcome, weights=taught.weights))
        self.offset = _offset(taught.design, taught.prevalence, share)
        self.intercept, self.coefficients = self.fitted(list(range(len(panel.markers))))
        self.score = self.intercept + _dot(self.coefficients, self.prepared)

    def fitted(self, members: list[int]) -> tuple[float, NDArray[np.float64]]:
        """Return intercept and coefficients on the prepared scale."""
        taught = self._taught
        n = len(taught.outcome)
        Z, _mean, deviation = standardised(
            self.prepared[members], np.arange(n), taught.weights
        )
        fit = fit_panels(
            Z,
            [np.arange(len(members))],
            taught.outcome,
            taught.weights,
            np.array([self._penalty]),
            family="binomial",
        )
        own = fit.coefs[0, 0, 1 : len(members) + 1]
        flat = ~(np.abs(Z).max(axis=1) > 0.0)
        coefficients = np.where(flat, 0.0, self.shrinkage * own / deviation)
        linear = _dot(coefficients, self.prepared[members])
        centre, _se = calibration_in_the_large(linear, taught.outcome, taught.weights)
        return centre + self.offset, coefficients


def _dot(
    coefficients: NDArray[np.float64], values: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Return a weighted sum of rows; no matrix product, whose bits vary."""
    return np.asarray((coefficients[:, None] * values).sum(axis=0), np.float64)


def _prepared(
    frozen: FrozenAssay, measured: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Return the training values as new samples will be prepared."""
    columns = [
        prepared_sample(
            frozen.steps, frozen.references, frozen.features, row, "training data"
        )
        for row in measured.T.tolist()
    ]
    return np.array(columns, np.float64).T.reshape(len(frozen.fill), -1)


def _assay_deviation(content: PanelContent, cv: float) -> float:
    """Return the standard deviation of the log-odds from added assay error.

    References
    ----------
    The logarithm of a lognormal error of coefficient of variation c has variance
    ln(1 + c squared); Aitchison & Brown 1957, The Lognormal Distribution.
    """
    deviation = math.sqrt(math.log1p(cv * cv)) / math.log(2.0)
    total = math.fsum(marker.coefficient**2 for marker in content.markers)
    return deviation * math.sqrt(total)


def _content(
    panel: ChosenPanel, taught: TaughtOn, model: _Model, slope: float
) -> PanelContent:
    w = taught.weights
    score_mean = float(np.average(model.score, weights=w))
    share = float(np.average(taught.outcome, weights=w))
    return PanelContent(
        panel_format=1,
        content_sha256="",
        name=panel.name,
        study=taught.study,
        outcome=taught.column,
        negative=taught.negative,
        positive=taught.positive,
        design=taught.design,
        prevalence=taught.prevalence,
        steps=model.frozen.steps,
        references=model.frozen.references,
        markers=_markers(panel, taught, model),
        intercept=model.intercept,
        cutoffs=(),
        fallbacks=_fallbacks(panel, taught, model),
        ridge_penalty=panel.penalty,
        honest=HonestFigures(
            panel.metric_of,
            panel.metric,
            panel.metric_low,
            panel.metric_high,
            slope,
            model.shrinkage,
            f"The refit's log-odds were multiplied by {model.shrinkage:.3g}: the "
            "calibration slope of out-of-fold predictions "
            + (
                "could not be estimated."
                if math.isnan(slope)
                else f"is {slope:.3g}."
                + (" They are never stretched." if slope > 1.0 else "")
            ),
        ),
        training=TrainingRows(
            samples=len(w),
            subjects=len(np.unique(taught.subjects)),
            cases=len(np.unique(taught.subjects[taught.outcome == 1.0])),
            prevalence=share,
            score_mean=score_mean,
            score_deviation=float(
                np.sqrt(np.average((model.score - score_mean) ** 2, weights=w))
            ),
            ids=_ids(taught),
            values=tuple(value_hash(row) for row in model.measured.T.tolist()),
            sha256=dict(taught.record["inputs"]),
        ),
        record_sha256=_record_hash(taught.record),
        seed=taught.seed,
        versions={"panelkit": taught.record["panelkit"], **taught.record["versions"]},
        parent=None,
        cautions=_cautions(taught),
    )


def _record_hash(record: Mapping[str, Any]) -> str:
    text = json.dumps(record, sort_keys=True, separators=(",", ":"))
    return hashlib.sha256(text.encode()).hexdigest()


def _ids(taught: TaughtOn) -> tuple[str, ...]:
    samples = () if taught.context.samples is None else taught.context.samples
    names = {str(name) for name in (*samples, *taught.subject_ids)}
    return tuple(sorted(id_hash(name) for name in names))


def _markers(
    panel: ChosenPanel, taught: TaughtOn, model: _Model
) -> tuple[PanelMarker, ...]:
    context, w = taught.context, taught.weights
    case = taught.outcome == 1.0
    found = []
    for k, j in enumerate(panel.markers.tolist()):
        measured = model.measured[k][~np.isnan(model.measured[k])]
        own, there = model.prepared[k], model.raw[k][~np.isnan(model.raw[k])]
        mean = float(np.average(own, weights=w))
        means = [float(np.average(own[c], weights=w[c])) for c in (~case, case)]
        inside = own - np.where(case, means[1], means[0])
        found.append(
            PanelMarker(
                feature=context.name(j),
                analyte="" if context.analyte is None else str(context.analyte[j]),
                unit="" if taught.units is None else str(taught.units[j]),
                coefficient=float(model.coefficients[k]),
                fill=float(model.frozen.fill[k]),
                measured_low=single(measured.min()),
                measured_high=single(measured.max()),
                prepared_low=float(there.min()),
                prepared_high=float(there.max()),
                prepared_mean=mean,
                prepared_deviation=float(
                    np.sqrt(np.average((own - mean) ** 2, weights=w))
                ),
                class_means=(means[0], means[1]),
                class_deviation=float(np.sqrt(np.average(inside**2, weights=w))),
            )
        )
    return tuple(found)


def _fallbacks(
    panel: ChosenPanel, taught: TaughtOn, model: _Model
) -> tuple[Fallback, ...]:
    names = [taught.context.name(j) for j in panel.markers.tolist()]
    if len(names) < 2:
        return ()
    found = []
    for k, name in enumerate(names):
        if name not in panel.losses:
            continue
        rest = [each for each in range(len(names)) if each != k]
        intercept, coefficients = model.fitted(rest)
        metric, loss, low, high = panel.losses[name]
        found.append(
            Fallback(
                missing=name,
                intercept=intercept,
                coefficients={
                    names[each]: float(c)
                    for each, c in zip(rest, coefficients, strict=True)
                },
                metric=metric,
                loss=loss,
                loss_low=low,
                loss_high=high,
                sentence=f"Without {name} the other markers are refitted; panels that "
                f"lost the marker in its role reach {metric:.3g} out of fold, "
                f"{loss:.3g} less.",
            )
        )
    return tuple(found)


def _cautions(taught: TaughtOn) -> tuple[str, ...]:
    found = [
        RESEARCH_USE,
        "The hash notices accidents, not forgery.",
        "Accuracy is that of the procedure; this very panel's is unknown until new "
        "people are measured.",
    ]
    if taught.design != "cohort":
        found.append(
            f"The study is {taught.design}: chances are stated for a prevalence of "
            f"{taught.prevalence:g}."
            if not math.isnan(taught.prevalence)
            else f"The study is {taught.design} and states no prevalence: chances are "
            "those of the study's own mix, not of people to be tested."
        )
    return tuple(found)
