"""Error of assays: from a coefficient of variation to the log2 scale and back."""

import math

from panelkit.errors import UsageError

__all__ = ["cv_to_log2_sd", "log2_sd_to_cv"]


def cv_to_log2_sd(cv: float, replicates: int = 1) -> float:
    """Return the SD on the log2 scale of a log-normal quantity.

    Parameters
    ----------
    cv : float
        Coefficient of variation on the linear scale, as a fraction.
    replicates : int
        Readings averaged on the log scale.

    Returns
    -------
    float
        sqrt(ln(1 + CV^2)) / ln 2, over the root of the replicates.

    Raises
    ------
    UsageError
        A negative variation, or no reading.

    References
    ----------
    Limpert, Stahel & Abbt 2001, BioScience 51:341: moments of the log-normal.
    """
    if not (cv >= 0.0 and math.isfinite(cv)) or replicates < 1:
        raise UsageError(
            code="variation-refused",
            where="coefficient of variation",
            what=f"this is no spread of readings (got {cv:g} with {replicates} "
            "replicates)",
            accepted="a fraction of at least 0 and at least one replicate",
            next_step="Give 20 % as 0.2",
        )
    return math.sqrt(math.log1p(cv**2) / replicates) / math.log(2.0)


def log2_sd_to_cv(sd: float) -> float:
    """Return the coefficient of variation, a fraction, from the SD of log2 readings."""
    variance = (sd * math.log(2.0)) ** 2
    return math.sqrt(math.expm1(variance)) if variance < 700.0 else math.inf
