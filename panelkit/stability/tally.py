"""From picks to frequencies: intervals, signs, convergence."""

from typing import Final

import numpy as np
from numpy.typing import NDArray

from panelkit.config import SHORTLIST
from panelkit.errors import StudyFileError
from panelkit.records import Convergence, PathSet, Stability

__all__ = [
    "frequency_intervals",
    "pairs_needed",
    "positive_share",
    "record_convergence",
]

Z_95: Final = 1.959963984540054


def frequency_intervals(
    picked: NDArray[np.bool_],
) -> tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]:
    """Return frequencies and Wilson-type intervals with pairs as units.

    The variance of a pair average gives the effective number of independent draws, at
    least one and at most two a pair.

    Parameters
    ----------
    picked : ndarray of shape (2 * n_pairs, n_features), bool
        Rows 2b and 2b + 1 are a pair.

    Returns
    -------
    frequency, low, high : ndarray of shape (n_features,)
        What more subsamples of the same people could change, at 95 %; not what other
        people would show.

    References
    ----------
    Wilson 1927, JASA 22:209.
    """
    n_pairs = len(picked) // 2
    frequency = picked.mean(axis=0)
    pairs = 0.5 * (picked[0::2].astype(np.int8) + picked[1::2])
    spread = pairs.var(axis=0, ddof=1) if n_pairs > 1 else np.zeros(len(frequency))
    single = frequency * (1.0 - frequency)
    with np.errstate(invalid="ignore", divide="ignore"):
        draws = np.where(spread > 0.0, single / spread, 1.0)
    n = n_pairs * np.clip(draws, 1.0, 2.0)
    z2 = Z_95**2
    centre = (frequency + z2 / (2.0 * n)) / (1.0 + z2 / n)
    half = Z_95 * np.sqrt(single / n + z2 / (4.0 * n**2)) / (1.0 + z2 / n)
    low = np.minimum(np.clip(centre - half, 0.0, 1.0), frequency)
    high = np.maximum(np.clip(centre + half, 0.0, 1.0), frequency)
    return frequency, low, high


def positive_share(paths: PathSet) -> NDArray[np.float64]:
    """Return the share of picks with a positive coefficient at the last penalty.

    Parameters
    ----------
    paths : PathSet
        Of one linear predictor or of several classes.

    Returns
    -------
    ndarray of shape (n_features,)
        NaN where never picked, and for several classes.
    """
    if paths.classes:
        return np.full(paths.n_features, np.nan)
    positive = np.zeros(paths.n_features)
    negative = np.zeros(paths.n_features)
    last = np.zeros(paths.n_features)
    for features, values, picks in zip(
        paths.coefficient_features,
        paths.coefficient_values,
        paths.entry_order,
        strict=True,
    ):
        last[picks] = 0.0
        last[features] = values  # a feature's last stored value decides
        positive[picks] += last[picks] > 0
        negative[picks] += last[picks] < 0
    with np.errstate(invalid="ignore"):
        return positive / (positive + negative)


def pairs_needed(threshold: float, precision: float = SHORTLIST.precision) -> int:
    """Return how many pairs bring a frequency at the threshold to a precision.

    The number is known before any fit, so that the subsamples can be fixed before the
    bound is quoted: adding subsamples until a shortlist pleases voids it.

    Parameters
    ----------
    threshold : float
        Selection frequency from which a feature is shortlisted.
    precision : float
        Half width of the 95 % interval.

    Returns
    -------
    int
        z^2 t (1 - t) / precision^2 rounded up: pairs whose halves always agree, the
        least favourable case.

    Raises
    ------
    StudyFileError
        A precision outside 0 to 1.
    """
    if not 0.0 < precision < 1.0:
        raise StudyFileError(
            code="precision-out-of-range",
            where="[shortlist] precision",
            what=f"no half width of a share (got {precision:g})",
            accepted="above 0 and below 1",
            next_step="Use 0.05 to 0.15",
        )
    spread = threshold * (1.0 - threshold)
    return max(2, int(np.ceil(Z_95**2 * spread / precision**2 - 1e-9)))


def record_convergence(
    stability: Stability,
    precision: float = SHORTLIST.precision,
    n_followed: int = 12,
    n_checkpoints: int = 25,
) -> Convergence:
    """Return how the frequencies settled as pairs were added.

    Parameters
    ----------
    stability : Stability
        Of all pairs.
    precision : float
        Half width from which subsamples count as enough.
    n_followed : int
        Most frequent features whose running frequency is kept.
    n_checkpoints : int
        Numbers of pairs at which it is read.

    Returns
    -------
    Convergence
        Running frequencies, which features the threshold leaves undecided, and how
        many pairs the precision asks for.

    Raises
    ------
    StudyFileError
        A precision outside 0 to 1.
    """
    bound = stability.bound
    picked = stability.picked
    n_pairs = len(picked) // 2
    order = np.argsort(-stability.frequency, kind="stable")
    followed = order[:n_followed]
    followed = followed[stability.frequency[followed] > 0.0]
    checkpoints = np.unique(
        np.linspace(1, n_pairs, min(n_checkpoints, n_pairs)).round().astype(np.int64)
    )
    running = np.cumsum(picked[:, followed], axis=0)[2 * checkpoints - 1]
    listed = np.cumsum(picked, axis=0, dtype=np.int32)[2 * checkpoints - 1]
    sizes = (listed >= bound.threshold * 2 * checkpoints[:, None] - 1e-9).sum(axis=1)
    undecided = np.flatnonzero(
        (stability.low < bound.threshold) & (stability.high >= bound.threshold)
    )
    undecided = undecided[np.argsort(-stability.frequency[undecided], kind="stable")]
    near = undecided if len(undecided) else order[:1]
    half = 0.5 * (stability.high - stability.low)[near]
    return Convergence(
        pairs=checkpoints,
        features=followed,
        frequency=running / (2.0 * checkpoints[:, None]),
        shortlist_size=sizes.astype(np.int64),
        undecided=undecided,
        threshold=bound.threshold,
        half_width=float(half.max()),
        precision=precision,
        pairs_needed=pairs_needed(bound.threshold, precision),
    )
