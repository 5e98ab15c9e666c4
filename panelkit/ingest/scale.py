"""On which scale the values seem to be: counts, linear, log2, shares or z-scores."""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from panelkit.ingest.wording import figure, percent
from panelkit.records import Finding, Record

__all__ = ["ScaleGuess", "ScaleKind", "guess_scale", "scale_finding"]

ScaleKind = Literal["counts", "linear", "log2", "beta-values", "z-scores", "unknown"]

_MAX_FEATURES = 5000
"""Features looked at, evenly spaced: the scale shows in far fewer."""

_LOG2_CEILING = 45.0
"""2 to the 45th exceeds what any assay reports; proteomics in log2 reaches 40."""

_FLOOR_SHARE = 0.01
"""Whole numbers piled up above zero are a floored intensity, not counts."""

_NAMES: dict[ScaleKind, str] = {
    "counts": "counts",
    "linear": "on a linear scale",
    "log2": "on a log scale (taken as log2)",
    "beta-values": "shares between 0 and 1 (beta values)",
    "z-scores": "z-scores of each feature",
    "unknown": "unknown: there are no values",
}


@dataclass(frozen=True, slots=True, eq=False)
class ScaleGuess(Record):
    """The likely scale of a matrix and the figures that speak for it.

    Attributes
    ----------
    kind : {"counts", "linear", "log2", "beta-values", "z-scores", "unknown"}
        The guess.
    evidence : mapping of str to float
        minimum, maximum, median, share_whole, share_negative, share_zero,
        share_at_minimum, feature_mean (median of |feature means|), and feature_sd,
        feature_sd_low, feature_sd_high (median, 10th and 90th percentile of the
        features' standard deviations).
    """

    kind: ScaleKind
    evidence: Mapping[str, float]


def guess_scale(values: NDArray[np.floating[Any]]) -> ScaleGuess:
    """Return the likely scale of a matrix.

    Parameters
    ----------
    values : ndarray of shape (n_features, n_samples)
        The expression matrix, feature-major, NaN where missing.

    Returns
    -------
    ScaleGuess
        Kind and evidence.
    """
    n_features = len(values)
    step = max(1, -(-n_features // _MAX_FEATURES))
    block = np.asarray(values[::step], dtype=np.float64)
    flat = block[np.isfinite(block)]
    if not flat.size:
        return ScaleGuess("unknown", {})
    evidence = _evidence(block, flat)
    return ScaleGuess(_decide(evidence), evidence)


def _evidence(
    block: NDArray[np.float64], flat: NDArray[np.float64]
) -> dict[str, float]:
    observed = np.isfinite(block)
    counts = np.maximum(observed.sum(axis=1), 1)
    filled = np.where(observed, block, 0.0)
    means = filled.sum(axis=1) / counts
    squares = np.where(observed, (block - means[:, None]) ** 2, 0.0).sum(axis=1)
    several = observed.sum(axis=1) > 1
    spreads = np.sqrt(squares[several] / (counts[several] - 1))
    low, middle, high = (
        np.quantile(spreads, [0.1, 0.5, 0.9]) if spreads.size else (0.0, 0.0, 0.0)
    )
    minimum = flat.min()
    return {
        "minimum": float(minimum),
        "maximum": float(flat.max()),
        "median": float(np.median(flat)),
        "share_whole": float(np.mean(flat == np.rint(flat))),
        "share_negative": float(np.mean(flat < 0)),
        "share_zero": float(np.mean(flat == 0)),
        "share_at_minimum": float(np.mean(flat == minimum)),
        "feature_mean": float(np.median(np.abs(means))),
        "feature_sd": float(middle),
        "feature_sd_low": float(low),
        "feature_sd_high": float(high),
    }


def _decide(evidence: Mapping[str, float]) -> ScaleKind:
    low, high = evidence["minimum"], evidence["maximum"]
    if evidence["share_whole"] == 1.0 and low >= 0:
        floored = low > 0 and evidence["share_at_minimum"] > _FLOOR_SHARE
        return "linear" if floored and high > _LOG2_CEILING else "counts"
    if low >= 0 and high <= 1:
        return "beta-values"
    if max(high, -low) > _LOG2_CEILING:
        return "linear"
    # every feature has spread 1; centred log ratios differ from feature to feature
    standardised = (
        evidence["feature_mean"] < 0.15
        and evidence["feature_sd_low"] > 0.7
        and evidence["feature_sd_high"] < 1.3
    )
    if evidence["share_negative"] > 0.25 and standardised:
        return "z-scores"
    return "log2"


def scale_finding(guess: ScaleGuess, where: str) -> Finding:
    """Return the finding that states the scale with its evidence.

    Parameters
    ----------
    guess : ScaleGuess
        What `guess_scale` returned.
    where : str
        The matrix, for the message.

    Returns
    -------
    Finding
        Code ``scale-guess``; a warning for z-scores, which cannot be computed for
        one new sample, and for a matrix without values.
    """
    figures = guess.evidence
    evidence = (
        f": values from {figure(figures['minimum'])} to {figure(figures['maximum'])}, "
        f"median {figure(figures['median'])}, {percent(figures['share_whole'])} whole "
        f"numbers, {percent(figures['share_zero'])} zeros, "
        f"{percent(figures['share_negative'])} negative; median standard deviation of "
        f"a feature {figure(figures['feature_sd'])}"
        if figures
        else ""
    )
    steps: dict[ScaleKind, str] = {
        "z-scores": "Use the values before standardisation where possible: these were "
        "standardised over samples that include the held-out ones.",
        "unknown": "Check the file: every value is missing.",
    }
    return Finding(
        code="scale-guess",
        severity="warning" if guess.kind in steps else "info",
        where=where,
        message=f"the values seem to be {_NAMES[guess.kind]}{evidence}",
        next_step=steps.get(
            guess.kind, "Check that this is so: the preparation steps follow it."
        ),
    )
