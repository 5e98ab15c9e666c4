"""Scores of samples by a locked panel: one by one, plain numbers in a fixed order.

No array product and no vectorised logarithm is used: how those round depends on the
length of an array, and one sample has to get the same bits as a thousand.
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import InputDataError, name_some
from panelkit.records import AssayStep, Fallback, PanelContent, PanelReference

__all__ = ["Scores", "chance_of", "prepared_sample", "score_samples", "single"]

LEAST_OUTSIDE: Final = 3
"""Values outside the training ranges below which a scale is not called wrong."""
GREY = "grey"


@dataclass(frozen=True, slots=True, eq=False)
class Scores:
    """Scores of samples, without outcomes.

    Attributes
    ----------
    samples : tuple of str
        Ids.
    log_odds, chances : ndarray of shape (n_samples,)
        NaN where no marker was measured.
    contributions : ndarray of shape (n_markers, n_samples)
        What each marker adds to the log-odds; 0 for one that is not there.
    prepared : ndarray of shape (n_markers, n_samples)
        Prepared values, filled ones included; NaN for a marker that is not there.
    intercept : float
        What the contributions are added to.
    calls : tuple of tuple of str
        For each cut-off: ``positive``, ``negative``, ``grey`` or ``""`` of each sample.
    flags : tuple of str
        Of each sample, joined by ``;``.
    missing : str
        The marker that the table does not have, for which the fallback stands; ``""``.
    """

    samples: tuple[str, ...]
    log_odds: NDArray[np.float64]
    chances: NDArray[np.float64]
    contributions: NDArray[np.float64]
    prepared: NDArray[np.float64]
    intercept: float
    calls: tuple[tuple[str, ...], ...]
    flags: tuple[str, ...]
    missing: str

    def columns(self, panel: PanelContent) -> dict[str, Any]:
        """Return the columns of a score file: one value a sample, no outcome."""
        found: dict[str, Any] = {
            "sample": self.samples,
            "log_odds": self.log_odds,
            "chance": self.chances,
        }
        for cut, calls in zip(panel.cutoffs, self.calls, strict=True):
            found[f"call {cut.name}"] = calls
        found["flags"] = self.flags
        found["intercept"] = np.full(len(self.samples), self.intercept)
        for marker, row in zip(panel.markers, self.contributions, strict=True):
            found[f"contribution {marker.feature}"] = row
        found["panel"] = (panel.content_sha256[:16],) * len(self.samples)
        return found


def single(value: float) -> float:
    """Return a measured value in single precision, as every table can hold it."""
    return float(np.float32(value))


def chance_of(log_odds: float) -> float:
    """Return the chance of a log-odds."""
    if log_odds >= 0.0:
        return 1.0 / (1.0 + math.exp(-log_odds))
    odds = math.exp(log_odds)
    return odds / (1.0 + odds)


def prepared_sample(
    steps: Sequence[AssayStep],
    references: Sequence[PanelReference],
    features: Sequence[str],
    measured: Sequence[float],
    where: str,
) -> list[float]:
    """Return the prepared values of one sample, missing ones NaN.

    Parameters
    ----------
    steps : sequence of AssayStep
        Frozen steps.
    references : sequence of PanelReference
        What markers are divided by.
    features : sequence of str
        Markers, then references.
    measured : sequence of float
        In that order; NaN where missing.
    where : str
        Table and sample, for errors.

    Returns
    -------
    list of float
        One a marker, before filling.

    Raises
    ------
    InputDataError
        A value that has no logarithm.
    """
    values = [single(value) for value in measured]
    n_markers = len(features) - len(references)
    for step in steps:
        if step.step in ("log2", "m-values"):
            offset = step.parameters["offset"]
            values = [
                value
                if math.isnan(value)
                else _logarithm(step.step, value, offset, features[k], where)
                for k, value in enumerate(values)
            ]
        elif step.step == "reference-ratio":
            total = 0.0
            for value, reference in zip(values[n_markers:], references, strict=True):
                total += reference.fill if math.isnan(value) else value
            mean = total / len(references)
            values = [value - mean for value in values[:n_markers]]
    return values[:n_markers]


def _logarithm(
    step: str, value: float, offset: float, feature: str, where: str
) -> float:
    above = value + offset
    below = 1.0 if step == "log2" else 1.0 - value + offset
    if above <= 0.0 or below <= 0.0:
        raise InputDataError(
            code="scale-wrong",
            where=f"{where}, marker {feature}",
            what=f"a value of {value:g} cannot be on the scale that the panel was "
            f"learnt on: its preparation takes '{step}'",
            accepted="values as the training samples had them",
            next_step="Give values before any transformation, or lock a panel on data "
            "of this kind",
        )
    return math.log2(above / below) if below != 1.0 else math.log2(above)


def score_samples(
    panel: PanelContent,
    samples: Sequence[str],
    values: NDArray[np.floating[Any]],
    missing: str = "",
    where: str = "table",
) -> Scores:
    """Return the scores of samples.

    Parameters
    ----------
    panel : PanelContent
        From `read_panel`.
    samples : sequence of str
        Ids.
    values : ndarray of shape (n_features, n_samples)
        Measured values in the order of `panel.features`, NaN where missing.
    missing : str
        A marker that the table does not have.
    where : str
        The table, for errors.

    Returns
    -------
    Scores
        A sample's bits depend on no other sample.

    Raises
    ------
    InputDataError
        Values on another scale, or a missing marker without fallback.
    """
    fallback = _fallback(panel, missing, where)
    intercept, weights = _model(panel, fallback)
    n_markers = len(panel.markers)
    shape = (n_markers, len(samples))
    contributions, prepared = np.zeros(shape), np.full(shape, np.nan)
    log_odds, flags = np.full(len(samples), np.nan), []
    for i, name in enumerate(samples):
        measured = [float(value) for value in values[:, i]]
        own = prepared_sample(
            panel.steps, panel.references, panel.features, measured,
            f"{where}, sample {name}",
        )  # fmt: skip
        flags.append(_flags(panel, measured, own, missing))
        total, known = intercept, 0
        for k, marker in enumerate(panel.markers):
            if marker.feature == missing:
                continue
            known += not math.isnan(own[k])
            value = marker.fill if math.isnan(own[k]) else own[k]
            prepared[k, i] = value
            contributions[k, i] = weights[k] * value
            total += weights[k] * value
        if known:
            log_odds[i] = total
    _refuse_other_scale(panel, values, prepared, where)
    chances = np.array([chance_of(v) if v == v else v for v in log_odds.tolist()])
    return Scores(
        samples=tuple(samples),
        log_odds=log_odds,
        chances=chances,
        contributions=contributions,
        prepared=prepared,
        intercept=intercept,
        calls=tuple(
            tuple(
                _call(chance, cut.chance, cut.grey_low, cut.grey_high)
                for chance in chances.tolist()
            )
            for cut in panel.cutoffs
        ),
        flags=tuple(";".join(own) for own in flags),
        missing=missing,
    )


def _model(panel: PanelContent, fallback: Fallback | None) -> tuple[float, list[float]]:
    if fallback is None:
        return panel.intercept, [marker.coefficient for marker in panel.markers]
    return fallback.intercept, [
        fallback.coefficients.get(marker.feature, 0.0) for marker in panel.markers
    ]


def _fallback(panel: PanelContent, missing: str, where: str) -> Fallback | None:
    if not missing:
        return None
    found = [each for each in panel.fallbacks if each.missing == missing]
    if not found:
        raise InputDataError(
            code="marker-missing",
            where=where,
            what=f"there is no marker {missing}",
            accepted="a column for every marker; this panel has no fallback for it",
            next_step="Measure it, or lock a panel without it",
        )
    return found[0]


def _call(chance: float, cut: float, grey_low: float, grey_high: float) -> str:
    if math.isnan(chance):
        return ""
    if grey_low < chance < grey_high:
        return GREY
    return "positive" if chance >= cut else "negative"


def _flags(
    panel: PanelContent, measured: Sequence[float], own: Sequence[float], missing: str
) -> list[str]:
    found = [f"{missing}:fallback"] if missing else []
    for k, marker in enumerate(panel.markers):
        if marker.feature == missing:
            continue
        value = single(measured[k])
        if math.isnan(own[k]):
            found.append(f"{marker.feature}:filled")
        elif value < marker.measured_low:
            found.append(f"{marker.feature}:below-training-range")
        elif value > marker.measured_high:
            found.append(f"{marker.feature}:above-training-range")
    for reference, value in zip(
        panel.references, measured[len(panel.markers) :], strict=True
    ):
        if math.isnan(value):
            found.append(f"{reference.feature}:filled")
    return found


def _refuse_other_scale(
    panel: PanelContent,
    values: NDArray[np.floating[Any]],
    prepared: NDArray[np.float64],
    where: str,
) -> None:
    """Refuse values most of which lie outside the training ranges."""
    there = ~np.isnan(values[: len(panel.markers)]) & ~np.isnan(prepared)
    low = np.array([marker.prepared_low for marker in panel.markers])[:, None]
    high = np.array([marker.prepared_high for marker in panel.markers])[:, None]
    width = high - low
    outside = there & ((prepared < low) | (prepared > high))
    far = there & ((prepared < low - width) | (prepared > high + width))
    n, n_outside = int(there.sum()), int(outside.sum())
    most = n_outside >= LEAST_OUTSIDE and 2 * n_outside > n
    if not most and not (n and 2 * int(far.sum()) > n):
        return
    names = [
        marker.feature
        for marker, row in zip(panel.markers, outside, strict=True)
        if row.any()
    ]
    raise InputDataError(
        code="scale-wrong",
        where=where,
        what=f"{n_outside} of {n} values lie outside the ranges that the panel was "
        f"learnt on: markers {name_some(names)}",
        accepted="values on the scale and in the unit of the training samples",
        next_step="Give values as the training samples had them, before any other "
        "transformation",
    )
