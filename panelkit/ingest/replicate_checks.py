"""Technical replicates: kept beside the cohort, and held against their samples."""

from collections.abc import Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from panelkit.ingest.alignment import FeatureMajor
from panelkit.ingest.cells import is_missing
from panelkit.ingest.row_selection import Selection
from panelkit.ingest.scale import ScaleGuess, guess_scale
from panelkit.ingest.sheet import Sheet
from panelkit.ingest.sketch import in_logs
from panelkit.ingest.wording import counted, figure, percent
from panelkit.metrics import (
    coefficient_of_variation,
    limits_of_agreement,
    reliability,
)
from panelkit.records import Cohort, Finding, ReplicateAgreement, Replicates

__all__ = ["check_replicates", "replicate_agreement", "replicates_of"]

SHARE = 0.95
POOR = 0.5
"""Intraclass correlations below are poor (Koo & Li 2016, J Chiropr Med 15:155)."""
_TILE = 4096


def replicates_of(
    sheet: Sheet | None,
    matrix: FeatureMajor,
    selection: Selection,
    column: str | None,
) -> Replicates | None:
    """Return the repeated measurements of the analysed samples.

    Parameters
    ----------
    sheet : Sheet or None
        The sample sheet.
    matrix : FeatureMajor
        All samples of the matrix.
    selection : Selection
        Analysed rows; only rows left out for nothing but being a replicate count, so
        that filtered rows and those set aside stay unread.
    column : str or None
        Column that names the sample of which a row is a replicate.

    Returns
    -------
    Replicates or None
        None without any.
    """
    if sheet is None or column is None:
        return None
    left = {
        item.id for item in selection.dropped if item.reason == "technical replicate"
    }
    place = {name: k for k, name in enumerate(sheet.ids[selection.rows])}
    named = sheet.column(column, "replicate_of")
    pairs = [
        (name, place[of])
        for name, of in zip(sheet.ids, named, strict=True)
        if name in left and not is_missing(of) and of in place
    ]
    if not pairs:
        return None
    position = {name: k for k, name in enumerate(matrix.samples)}
    return Replicates(
        samples=np.array([name for name, _ in pairs], dtype=object),
        of=np.array([of for _, of in pairs], dtype=np.int64),
        values=np.ascontiguousarray(
            matrix.values[:, [position[name] for name, _ in pairs]]
        ),
    )


def replicate_agreement(
    cohort: Cohort, scale: ScaleGuess | None = None
) -> ReplicateAgreement | None:
    """Return how well the replicates of each feature agree.

    Counts are divided by their depth (counts per million) and taken in log2, linear
    values are taken in log2; the coefficient of variation is that of the values
    before logarithms.

    Parameters
    ----------
    cohort : Cohort
        With replicates; otherwise nothing is returned.
    scale : ScaleGuess, optional
        Scale of its values; guessed where it is not given.

    Returns
    -------
    ReplicateAgreement or None
        One entry a feature.

    References
    ----------
    Shrout & Fleiss 1979, Psychological Bulletin 86:420 (ICC(1,1)); Bland & Altman
    1999, Statistical Methods in Medical Research 8:135 (limits of agreement).
    """
    repeated = cohort.replicates
    if repeated is None:
        return None
    scale = guess_scale(cohort.values) if scale is None else scale
    measured, sets = np.unique(repeated.of, return_inverse=True)
    depths: Sequence[NDArray[np.float64] | None] = (None, None)
    if scale.kind == "counts":
        depths = [_depth(cohort.values[:, measured]), _depth(repeated.values)]
    parts = []
    in_log2 = scale.kind in ("counts", "linear", "log2")
    for start in range(0, cohort.n_features, _TILE):
        own = slice(start, start + _TILE)
        first = in_logs(cohort.values[own][:, measured], scale, depths[0])
        again = in_logs(repeated.values[own], scale, depths[1])
        parts.append(_agreement(first, again, sets, in_log2=in_log2))
    joined = {name: np.concatenate([part[name] for part in parts]) for name in parts[0]}
    return ReplicateAgreement(features=cohort.features, in_log2=in_log2, **joined)


def _depth(counts: NDArray[np.floating[Any]]) -> NDArray[np.float64]:
    total = np.nansum(counts, axis=0, dtype=np.float64)
    return np.where(total > 0, total, 1.0) / 1e6


def _agreement(
    first: NDArray[np.float64],
    again: NDArray[np.float64],
    sets: NDArray[np.int64],
    *,
    in_log2: bool,
) -> dict[str, NDArray[Any]]:
    together = np.concatenate([first, again], axis=1)
    codes = np.concatenate([np.arange(first.shape[1]), sets])
    found = reliability(together, codes)
    limits = limits_of_agreement(again, first[:, sets], SHARE)
    return {
        "n_samples": found.n_sets,
        "n_measurements": found.n_measurements,
        "mean": found.mean,
        "icc": found.icc,
        "within_sd": found.within_sd,
        "cv": coefficient_of_variation(found.within_sd, found.mean, in_log2=in_log2),
        "difference": limits.difference,
        "difference_low": limits.low,
        "difference_high": limits.high,
    }


def check_replicates(cohort: Cohort, scale: ScaleGuess) -> list[Finding]:
    """Return how well technical replicates agree.

    Parameters
    ----------
    cohort : Cohort
        With replicates; otherwise nothing is checked.
    scale : ScaleGuess
        Scale of its values.

    Returns
    -------
    list of Finding
        ``replicates-agreement``: a warning where half of the features or more have a
        poor intraclass correlation.
    """
    table = replicate_agreement(cohort, scale)
    if table is None or cohort.replicates is None:
        return []
    known = np.isfinite(table.icc)
    samples = len(np.unique(cohort.replicates.of))
    who = (
        f"{counted(len(cohort.replicates.samples), 'replicate', 'replicates')} of "
        f"{counted(samples, 'sample', 'samples')}"
    )
    if not known.any():
        return [
            Finding(
                code="replicates-agreement",
                severity="info",
                where="samples, replicate_of",
                message=f"{who} are too few to judge the features' reliability",
                next_step="Measure at least two samples twice, better twenty.",
            )
        ]
    low, middle, high = np.quantile(table.icc[known], [0.25, 0.5, 0.75])
    poor = int((table.icc[known] < POOR).sum())
    spread = table.cv[np.isfinite(table.cv)]
    varies = (
        f", median coefficient of variation {percent(float(np.median(spread)))}"
        if len(spread)
        else ""
    )
    half = 0.5 * (table.difference_high - table.difference_low)
    half = half[np.isfinite(half)]
    limits = (
        f", median limits of agreement {figure(float(np.median(half)))} either side of "
        "the mean difference" + (" (log2)" if table.in_log2 else "")
        if len(half)
        else ""
    )
    worse = poor >= 0.5 * known.sum()
    return [
        Finding(
            code="replicates-agreement",
            severity="warning" if worse else "info",
            where="samples, replicate_of",
            message=f"{who}: median intraclass correlation {figure(float(middle))} "
            f"(middle half {figure(float(low))} to {figure(float(high))}), below "
            f"{POOR:g} in {poor:,} of {int(known.sum()):,} features{varies}{limits}",
            next_step="Prefer markers that repeat: features below "
            f"{POOR:g} mostly show the measurement.",
        )
    ]
