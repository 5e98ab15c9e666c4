"""Noise of quantitative PCR and of assays in general: Cq, references, CV, log2 SD."""

import math
from collections.abc import Sequence

from panelkit.errors import UsageError

__all__ = [
    "cq_ratio",
    "cv_from_cq_sd",
    "cv_from_log2_sd",
    "delta_cq_sd",
    "efficiency_from_slope",
    "excess_log2_sd",
    "log2_sd_from_cv",
    "slope_from_efficiency",
]


def efficiency_from_slope(slope: float) -> float:
    """Return the efficiency of amplification from the slope of a standard curve.

    Parameters
    ----------
    slope : float
        Of Cq against log10 quantity, below 0.

    Returns
    -------
    float
        10^(-1/slope) - 1; 1 is a doubling in every cycle.

    Raises
    ------
    UsageError
        The slope does not fall.

    References
    ----------
    Bustin, S. A., et al. (2009). The MIQE guidelines. Clin. Chem. 55, 611-622.
    """
    if not slope < 0:
        raise UsageError(
            code="slope-not-falling",
            where="slope",
            what=f"Cq does not fall with quantity (got {slope:g})",
            accepted="a slope below 0, about -3.32 for a doubling in every cycle",
            next_step="Check the standard curve",
        )
    return float(10 ** (-1 / slope) - 1)


def slope_from_efficiency(efficiency: float) -> float:
    """Return the slope of a standard curve from the efficiency, above 0."""
    return -1 / math.log10(1 + efficiency)


def cv_from_cq_sd(sd: float, efficiency: float = 1.0) -> float:
    """Return the coefficient of variation of a quantity from the SD of its Cq.

    Parameters
    ----------
    sd : float
        Standard deviation in cycles.
    efficiency : float
        Of amplification.

    Returns
    -------
    float
        As a fraction: the variation of a log-normal quantity.

    References
    ----------
    Livak, K. J., Schmittgen, T. D. (2001). Methods 25, 402-408, for the scale; the
    variation of a log-normal quantity is a standard result.
    """
    return math.sqrt(math.expm1((sd * math.log1p(efficiency)) ** 2))


def delta_cq_sd(
    target_sd: float,
    reference_sd: float,
    instability_sd: float,
    n_references: int,
    replicates: int = 1,
) -> float:
    """Return the SD of a Cq less the mean Cq of several references.

    Parameters
    ----------
    target_sd, reference_sd : float
        Of one well, in cycles.
    instability_sd : float
        Biological variation of one reference between samples.
    n_references : int
        At least 1.
    replicates : int
        Wells of each assay.

    Returns
    -------
    float
        sqrt(s_t^2/r + (s_ref^2/r + s_inst^2)/n). The first references pay most.

    References
    ----------
    Vandesompele, J., et al. (2002). Genome Biol. 3, research0034: several references;
    the variance is that of a difference of independent means.
    """
    references = reference_sd**2 / replicates + instability_sd**2
    return math.sqrt(target_sd**2 / replicates + references / n_references)


def cq_ratio(
    target: tuple[float, float],
    references: Sequence[tuple[float, float]],
    target_efficiency: float = 1.0,
    reference_efficiencies: Sequence[float] | None = None,
) -> float:
    """Return the efficiency-corrected ratio of a sample to a calibrator.

    Parameters
    ----------
    target : tuple of (float, float)
        Cq of the sample and of the calibrator.
    references : sequence of tuple of (float, float)
        The same of every reference.
    target_efficiency : float
        Of the target.
    reference_efficiencies : sequence of float, optional
        Of the references; 1 each when left out.

    Returns
    -------
    float
        Quantity of the target over the geometric mean of those of the references.

    References
    ----------
    Pfaffl, M. W. (2001). Nucleic Acids Res. 29, e45, eq. 1; Vandesompele, J., et al.
    (2002). Genome Biol. 3, research0034, for the geometric mean.
    """
    powers = reference_efficiencies or [1.0] * len(references)
    log_target = (target[1] - target[0]) * math.log1p(target_efficiency)
    logs = [
        (calibrator - sample) * math.log1p(power)
        for (sample, calibrator), power in zip(references, powers, strict=True)
    ]
    return math.exp(log_target - sum(logs) / len(logs))


def log2_sd_from_cv(cv: float, replicates: int = 1) -> float:
    """Return the SD on the log2 scale of an assay with a coefficient of variation.

    Parameters
    ----------
    cv : float
        As a fraction.
    replicates : int
        Readings averaged on the log scale.

    Returns
    -------
    float
        sqrt(ln(1 + CV^2)) / ln 2 of one reading, over the root of the replicates.
    """
    return math.sqrt(math.log1p(cv**2)) / math.log(2) / math.sqrt(replicates)


def cv_from_log2_sd(sd: float) -> float:
    """Return the coefficient of variation, a fraction, from the SD of log2 readings."""
    variance = (sd * math.log(2)) ** 2
    return math.sqrt(math.expm1(variance)) if variance < 700 else math.inf


def excess_log2_sd(new_sd: float, discovery_sd: float) -> float:
    """Return the noise to add to discovery data, which hold their own already."""
    return math.sqrt(max(0.0, new_sd**2 - discovery_sd**2))
