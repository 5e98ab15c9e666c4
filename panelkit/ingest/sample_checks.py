"""Samples that lie apart, that repeat others, or that are on another scale."""

from typing import Any

import numpy as np
from numpy.typing import NDArray

from panelkit.ingest.scale import ScaleGuess
from panelkit.ingest.sketch import Sketch, sketch_samples
from panelkit.ingest.survey import evenly_spaced
from panelkit.ingest.wording import counted, figure, quoted
from panelkit.records import Cohort, Finding

__all__ = ["check_samples"]

WHERE = "expression"
LEAST_SAMPLES = 8
"""Fewer samples have no distribution to be judged against."""
LEAST_FEATURES = 20
OUTLYING = 4.0
OUTLYING_RATIO = 1.5
NEAR_COPY = 0.9
NEAR_COPY_FEW = 0.97
FEW_FEATURES = 200
"""With fewer features correlations scatter, and a copy has to be closer."""
NEAR_COPY_SD = 8.0
_TO_SD = 1.4826
_SCALE_FEATURES = 2000
_SCALE_GAP = 4.0
_LINEAR_FROM = 45.0
_NEARLY_ALL = 0.97
_BULK = 0.9
_CENTRED = 0.25
_UNCENTRED = 0.01
"""Shares of negative values; between the two a sample is taken for neither."""


def check_samples(cohort: Cohort, scale: ScaleGuess) -> list[Finding]:
    """Return samples that lie apart, near copies, and mixed scales.

    Parameters
    ----------
    cohort : Cohort
        The cohort.
    scale : ScaleGuess
        Scale of its values.

    Returns
    -------
    list of Finding
        ``scales-mixed``, ``samples-near-copies`` and ``samples-outlying``.
    """
    if cohort.n_samples < LEAST_SAMPLES or scale.kind == "unknown":
        return []
    findings = _mixed_scales(cohort)
    sketch = sketch_samples(cohort.values, scale)
    if sketch.n_features < LEAST_FEATURES:
        return findings
    return [*findings, *_near_copies(cohort, sketch), *_outlying(cohort, sketch)]


def _spread(values: NDArray[np.float64]) -> tuple[float, float]:
    """Return the median and the median absolute deviation as a standard deviation."""
    middle = float(np.median(values))
    return middle, _TO_SD * float(np.median(np.abs(values - middle)))


def _outlying(cohort: Cohort, sketch: Sketch) -> list[Finding]:
    known = np.isfinite(sketch.distance) & (sketch.distance > 0)
    if known.sum() < LEAST_SAMPLES:
        return []
    logs = np.log(np.where(known, sketch.distance, 1.0))
    middle, spread = _spread(logs[known])
    apart = known & (logs - middle > max(OUTLYING * spread, np.log(OUTLYING_RATIO)))
    if not apart.any():
        return []
    order = np.argsort(-logs, kind="stable")
    named = [
        f"{str(cohort.samples[i])!r} {figure(float(np.exp(logs[i] - middle)))} times"
        for i in order
        if apart[i]
    ]
    more = f" and {len(named) - 5} more" if len(named) > 5 else ""
    return [
        Finding(
            code="samples-outlying",
            severity="warning",
            where=WHERE,
            message=f"{counted(len(named), 'sample lies', 'samples lie')} far from the "
            f"median sample, with a distance of {', '.join(named[:5])}{more} the "
            f"median distance (rule: root mean square of robustly standardised values, "
            f"log distance more than {OUTLYING:g} robust standard deviations above "
            f"the median and at least {OUTLYING_RATIO:g} times it)",
            next_step="Look at their quality records; leave them out with keep only "
            "for a reason that does not depend on the outcome.",
        )
    ]


def _near_copies(cohort: Cohort, sketch: Sketch) -> list[Finding]:
    first, second = np.triu_indices(cohort.n_samples, 1)
    correlation = sketch.correlation[first, second]
    known = np.isfinite(correlation)
    if not known.any():
        return []
    # Fisher's z makes the spread of correlations alike near 0 and near 1
    z = np.arctanh(np.clip(correlation, -1.0 + 1e-9, 1.0 - 1e-9))
    middle, spread = _spread(z[known])
    other = cohort.design.subject[first] != cohort.design.subject[second]
    least = NEAR_COPY if sketch.n_features >= FEW_FEATURES else NEAR_COPY_FEW
    with np.errstate(invalid="ignore"):
        alike = (
            known
            & other
            & (correlation >= least)
            & (z - middle > NEAR_COPY_SD * spread)
        )
    hits = np.flatnonzero(alike)
    if not len(hits):
        return []
    hits = hits[np.argsort(-correlation[hits], kind="stable")]
    named = [
        f"{str(cohort.samples[first[k]])!r} and {str(cohort.samples[second[k]])!r} "
        f"({figure(float(correlation[k]))})"
        for k in hits
    ]
    low, high = np.quantile(correlation[known], [0.25, 0.75])
    more = f" and {len(named) - 5} more" if len(named) > 5 else ""
    subjects = cohort.design.n_subjects < cohort.n_samples
    return [
        Finding(
            code="samples-near-copies",
            severity="warning",
            where=WHERE,
            message=f"{counted(len(named), 'pair', 'pairs')} of samples "
            + ("of different subjects " if subjects else "")
            + f"look like the same specimen: {'; '.join(named[:5])}{more} (correlation "
            f"of robustly standardised values; half of all pairs lie between "
            f"{figure(float(low))} and {figure(float(high))}, and these are more than "
            f"{NEAR_COPY_SD:g} robust standard deviations of Fisher's z above)",
            next_step="Check for a specimen that was measured or entered twice; name "
            "the subject column, or replicate_of, if they belong together.",
        )
    ]


def _mixed_scales(cohort: Cohort) -> list[Finding]:
    """Return the samples whose values are on another scale than those of the most."""
    kinds = _kinds(cohort.values[evenly_spaced(cohort.n_features, _SCALE_FEATURES)])
    known = kinds != ""
    names, counts = np.unique(kinds[known], return_counts=True)
    if len(names) < 2:
        return []
    usual = names[np.argmax(counts)]
    others = known & (kinds != usual)
    told = ", ".join(
        f"{int((kinds == name).sum())} {name} ({quoted(cohort.samples[kinds == name])})"
        for name in names
        if name != usual
    )
    return [
        Finding(
            code="scales-mixed",
            severity="stop",
            where=WHERE,
            message=f"{counted(int(others.sum()), 'sample is', 'samples are')} on "
            f"another scale than the rest: {int(counts.max())} {usual}, {told}",
            next_step="Bring all samples to one scale before they are joined.",
        )
    ]


def _kinds(block: NDArray[np.floating[Any]]) -> NDArray[np.object_]:
    """Return one word for the scale of each sample, nothing for a doubtful one.

    Linear against log values needs a gap: the smallest 90th percentile of the former
    has to be four times the largest of the latter.
    """
    n_samples = block.shape[1]
    kinds = np.full(n_samples, "", dtype=object)
    high = np.zeros(n_samples)
    for sample in range(n_samples):
        values = np.asarray(block[:, sample], dtype=np.float64)
        values = values[np.isfinite(values)]
        if len(values) < LEAST_FEATURES or not values.any():
            continue
        high[sample] = np.quantile(np.abs(values), _BULK)
        kinds[sample] = _kind(values, float(high[sample]))
    large, small = kinds == "linear", kinds == "in logarithms"
    if (
        large.any()
        and small.any()
        and high[large].min() < _SCALE_GAP * high[small].max()
    ):
        kinds[large | small] = "in logarithms"
    return kinds


def _kind(values: NDArray[np.float64], high: float) -> str:
    # shares, not extremes: one absurd cell is no other scale
    if np.mean((values == np.rint(values)) & (values >= 0)) > _NEARLY_ALL:
        return "whole numbers"
    if np.mean((values >= 0) & (values <= 1)) > _NEARLY_ALL:
        return "between 0 and 1"
    if high > _LINEAR_FROM:
        return "linear"
    negative = float(np.mean(values < 0))
    if negative > _CENTRED:
        return "centred at zero"
    return "in logarithms" if negative < _UNCENTRED else ""
