"""On which scale the values seem to be: counts, linear, log2, shares or z-scores."""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from panelkit.ingest.survey import evenly_spaced
from panelkit.ingest.wording import figure, percent
from panelkit.records import Finding, Record

__all__ = ["ScaleGuess", "ScaleKind", "guess_scale", "scale_finding"]

ScaleKind = Literal["counts", "linear", "log2", "beta-values", "z-scores", "unknown"]

_MAX_FEATURES = 5000
"""Features looked at, evenly spaced: the scale shows in far fewer."""

_LOG2_CEILING = 45
"""2 to the 45th exceeds what any assay reports; proteomics in log2 reaches 40."""

_LINEAR_CEILING = float(2**_LOG2_CEILING)

_FLOOR_SHARE = 0.01
"""Whole numbers piled up above zero are a floored intensity, not counts."""

_PILED = 5.0
"""So many times the cells beside it stand at a floor; counts fall off slowly."""

_WHOLE_SHARE = 0.999
"""Counts but for a few cells are counts: the few are named by a finding."""

_TAIL = 0.01
"""Quantiles on either side that hold the bulk: single absurd cells lie outside."""

_ABSURD_RANGES = 10.0
_LEAST_RANGE = 3.0
"""Logarithms and shares that far outside the bulk, in ranges of it, are absurd."""

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
        Of the features looked at: minimum, maximum, low and high (1st and 99th
        percentile of the values other than zero), median, share_whole,
        share_negative, share_zero, share_at_low (cells equal to `low`),
        share_near_low (cells below it or one above), feature_mean (median of
        |feature means|), and feature_sd, feature_sd_low, feature_sd_high (median,
        10th and 90th percentile of the features' standard deviations). Empty without
        values.
    """

    kind: ScaleKind
    evidence: Mapping[str, float]

    @property
    def absurd_below(self) -> float:
        """Smallest value that can be meant on this scale."""
        if self.kind in ("counts", "linear"):
            return -_LINEAR_CEILING
        return self.evidence["low"] - self._reach

    @property
    def absurd_above(self) -> float:
        """Largest value that can be meant on this scale."""
        if self.kind in ("counts", "linear"):
            return _LINEAR_CEILING
        return self.evidence["high"] + self._reach

    @property
    def _reach(self) -> float:
        bulk = self.evidence["high"] - self.evidence["low"]
        return _ABSURD_RANGES * max(bulk, _LEAST_RANGE)


def guess_scale(values: NDArray[np.floating[Any]]) -> ScaleGuess:
    """Return the likely scale of a matrix, told by the bulk of its values.

    Single cells, however absurd, do not change the guess: it rests on quantiles and
    shares, and spreads are taken of values cut off at ten ranges of the bulk.

    Parameters
    ----------
    values : ndarray of shape (n_features, n_samples)
        The expression matrix, feature-major, NaN where missing.

    Returns
    -------
    ScaleGuess
        Kind and evidence.
    """
    block = np.asarray(
        values[evenly_spaced(len(values), _MAX_FEATURES)], dtype=np.float64
    )
    flat = block[np.isfinite(block)]
    if not flat.size:
        return ScaleGuess("unknown", {})
    evidence = _evidence(block, flat)
    return ScaleGuess(_decide(evidence), evidence)


def _evidence(
    block: NDArray[np.float64], flat: NDArray[np.float64]
) -> dict[str, float]:
    # zeros apart: among 99 % zeros they would be all the quantiles show
    bulk = flat[flat != 0.0] if flat.any() else flat
    low, high = np.quantile(bulk, [_TAIL, 1.0 - _TAIL])
    reach = _ABSURD_RANGES * max(high - low, 1.0)
    observed = np.isfinite(block)
    counts = np.maximum(observed.sum(axis=1), 1)
    # squares of an absurd cell would overflow
    filled = np.where(observed, np.clip(block, low - reach, high + reach), 0.0)
    means = filled.sum(axis=1) / counts
    squares = np.where(observed, (filled - means[:, None]) ** 2, 0.0).sum(axis=1)
    several = observed.sum(axis=1) > 1
    spreads = np.sqrt(squares[several] / (counts[several] - 1))
    sd_low, sd, sd_high = (
        np.quantile(spreads, [0.1, 0.5, 0.9]) if spreads.size else (0.0, 0.0, 0.0)
    )
    return {
        "minimum": float(flat.min()),
        "maximum": float(flat.max()),
        "low": float(low),
        "high": float(high),
        "median": float(np.median(flat)),
        "share_whole": float(np.mean(flat == np.rint(flat))),
        "share_negative": float(np.mean(flat < 0)),
        "share_zero": float(np.mean(flat == 0)),
        "share_at_low": float(np.mean(flat == low)),
        "share_near_low": float(np.mean((flat < low) | (flat == low + 1.0))),
        "feature_mean": float(np.median(np.abs(means))),
        "feature_sd": float(sd),
        "feature_sd_low": float(sd_low),
        "feature_sd_high": float(sd_high),
    }


def _decide(evidence: Mapping[str, float]) -> ScaleKind:
    low, high = evidence["low"], evidence["high"]
    if evidence["share_whole"] >= _WHOLE_SHARE and low >= 0:
        piled = max(_FLOOR_SHARE, _PILED * evidence["share_near_low"])
        floored = evidence["share_zero"] == 0 and evidence["share_at_low"] > piled
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
        ": 98 % of the values other than zero lie between "
        f"{figure(figures['low'])} and {figure(figures['high'])} (all "
        f"between {figure(figures['minimum'])} and "
        f"{figure(figures['maximum'])}), "
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
