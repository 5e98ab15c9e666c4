"""Where markers lie on new people, against where they were learnt."""

from math import sqrt
from statistics import NormalDist

import numpy as np
from numpy.typing import NDArray

from panelkit.lock.scoring import Scores
from panelkit.records import MarkerShift, PanelContent

__all__ = ["marker_shifts"]

NOTHING = float("nan")


def marker_shifts(
    panel: PanelContent,
    scores: Scores,
    outcome: NDArray[np.float64],
    confidence: float,
) -> list[MarkerShift]:
    """Return how far each marker lies from its training values, class by class.

    The mean over both classes is compared, so that another share of cases is no shift.

    Parameters
    ----------
    panel : PanelContent
        Its training means.
    scores : Scores
        Prepared values of the new samples.
    outcome : ndarray of shape (n_samples,)
        0 and 1.
    confidence : float
        Of the intervals, samples independent, training means included.

    Returns
    -------
    list of MarkerShift
        NaN for a marker that was not measured.
    """
    z = NormalDist().inv_cdf(0.5 + 0.5 * confidence)
    taught = panel.training
    n_taught = (taught.subjects - taught.cases, taught.cases)
    found = []
    for k, marker in enumerate(panel.markers):
        row = scores.prepared[k]
        parts = [row[(outcome == c) & ~np.isnan(row)] for c in (0.0, 1.0)]
        old = marker.class_means
        if min(len(part) for part in parts) < 2:
            found.append(MarkerShift(marker.feature, *[NOTHING] * 9))
            continue
        means = [float(part.mean()) for part in parts]
        new_errors = [float(part.var(ddof=1)) / len(part) for part in parts]
        old_errors = [marker.class_deviation**2 / n for n in n_taught]
        shift = 0.5 * (means[0] - old[0] + means[1] - old[1])
        half = z * 0.5 * sqrt(sum(new_errors) + sum(old_errors))
        gap, gap_half = means[1] - means[0], z * sqrt(sum(new_errors))
        spread = sqrt(
            sum(float(((p - p.mean()) ** 2).sum()) for p in parts)
            / (len(parts[0]) + len(parts[1]) - 2)
        )
        inside = np.concatenate(parts)
        outside = (inside < marker.prepared_low) | (inside > marker.prepared_high)
        found.append(
            MarkerShift(
                marker.feature,
                shift,
                shift - half,
                shift + half,
                spread / marker.class_deviation if marker.class_deviation else NOTHING,
                old[1] - old[0],
                gap,
                gap - gap_half,
                gap + gap_half,
                float(outside.mean()),
            )
        )
    return found
