"""Detection capability: limits of blank, detection and quantitation, digital PCR."""

import math
from collections.abc import Sequence
from dataclasses import dataclass

from scipy import stats

from panelkit.errors import UsageError

__all__ = [
    "DigitalCopies",
    "copies_for_detection",
    "digital_copies",
    "limit_of_blank",
    "limit_of_blank_by_rank",
    "limit_of_detection",
    "limit_of_quantitation",
    "percentile_multiplier",
    "pooled_sd",
]

ONE_SIDED_95 = float(stats.norm.ppf(0.95))


def percentile_multiplier(
    n_results: int, n_samples: int, z: float = ONE_SIDED_95
) -> float:
    """Return the multiplier of an SD that estimates the 95th percentile.

    Parameters
    ----------
    n_results : int
        All results.
    n_samples : int
        Samples that they were measured in.
    z : float
        Normal quantile.

    Returns
    -------
    float
        z / (1 - 1/(4 (n - k))): the SD of n results in k samples is a little low.

    Raises
    ------
    UsageError
        There are no more results than samples.

    References
    ----------
    CLSI EP17-A2 (2012), section 5; the formula is stated here from memory.
    """
    if n_results <= n_samples:
        raise UsageError(
            code="replicates-missing",
            where="n_results and n_samples",
            what=f"{n_results} results in {n_samples} samples leave no repeats",
            accepted="more results than samples",
            next_step="Measure samples more than once",
        )
    return z / (1 - 1 / (4 * (n_results - n_samples)))


def limit_of_blank(mean: float, sd: float, n_results: int, n_samples: int) -> float:
    """Return the limit of blank from the mean and SD of blanks (CLSI EP17)."""
    return mean + percentile_multiplier(n_results, n_samples) * sd


def limit_of_blank_by_rank(blanks: Sequence[float]) -> float:
    """Return the limit of blank of skewed blanks: rank 0.5 + 0.95 n, interpolated.

    Parameters
    ----------
    blanks : sequence of float
        All results, in any order; at least 10.

    Returns
    -------
    float
        For 60 results the mean of the 57th and 58th.

    Raises
    ------
    UsageError
        There are too few results for that rank.

    References
    ----------
    CLSI EP17-A2 (2012), non-parametric option; stated here from memory.
    """
    ordered = sorted(blanks)
    rank = 0.5 + 0.95 * len(ordered)
    below = math.floor(rank)
    if below + 1 > len(ordered):
        raise UsageError(
            code="blanks-too-few",
            where="blanks",
            what=f"rank {rank:g} lies beyond the results (got {len(ordered)})",
            accepted="at least 10 blanks; 60 are usual",
            next_step="Measure more blanks",
        )
    share = rank - below
    return (1 - share) * ordered[below - 1] + share * ordered[below]


def pooled_sd(sds: Sequence[float], counts: Sequence[int]) -> float:
    """Return the pooled SD of several samples: variances are pooled, not SDs."""
    weights = [count - 1 for count in counts]
    squares = sum(w * sd**2 for w, sd in zip(weights, sds, strict=True))
    return math.sqrt(squares / sum(weights))


def limit_of_detection(
    blank_limit: float, sd_low: float, n_results: int, n_samples: int
) -> float:
    """Return the limit of detection from the pooled SD of low samples (CLSI EP17)."""
    return blank_limit + percentile_multiplier(n_results, n_samples) * sd_low


def limit_of_quantitation(
    goal_cv: float, proportional_cv: float, constant_sd: float
) -> float:
    """Return the lowest level that meets a goal for imprecision.

    Parameters
    ----------
    goal_cv : float
        As a fraction; always print it with the result.
    proportional_cv, constant_sd : float
        Of the precision profile CV^2 = proportional^2 + (constant / level)^2.

    Returns
    -------
    float
        The level; infinite where the proportional part alone misses the goal.
    """
    room = goal_cv**2 - proportional_cv**2
    return constant_sd / math.sqrt(room) if room > 0 else math.inf


def copies_for_detection(probability: float = 0.95) -> float:
    """Return the mean copies of a reaction that is positive with a probability.

    Parameters
    ----------
    probability : float
        Below 1.

    Returns
    -------
    float
        -ln(1 - probability), by the Poisson distribution; 3.00 for 95 %.
    """
    return -math.log1p(-probability)


@dataclass(frozen=True, slots=True)
class DigitalCopies:
    """What digital PCR counted.

    Attributes
    ----------
    copies_per_partition : float
        The Poisson mean.
    per_microlitre : float
        Copies in a microlitre of reaction.
    relative_se : float
        Of both, from partitioning alone.
    """

    copies_per_partition: float
    per_microlitre: float
    relative_se: float


def digital_copies(positive: int, partitions: int, nanolitres: float) -> DigitalCopies:
    """Return the concentration that positive partitions show.

    Parameters
    ----------
    positive, partitions : int
        Merged over replicate wells first; at least one negative, at least one
        positive.
    nanolitres : float
        Volume of one partition.

    Returns
    -------
    DigitalCopies
        lambda = -ln(1 - positive/partitions), relative SE
        sqrt((e^lambda - 1)/n)/lambda.

    Raises
    ------
    UsageError
        No partition, or every one, is positive.

    References
    ----------
    Dube, S., Qin, J., Ramakrishnan, R. (2008). PLoS ONE 3, e2876.
    """
    if not 0 < positive < partitions:
        raise UsageError(
            code="partitions-alike",
            where="positive and partitions",
            what=f"the share of positive partitions says no concentration "
            f"(got {positive} of {partitions})",
            accepted="some positive and some negative partitions",
            next_step="Dilute a saturated sample, or load more of an empty one",
        )
    mean = -math.log1p(-positive / partitions)
    return DigitalCopies(
        copies_per_partition=mean,
        per_microlitre=1000 * mean / nanolitres,
        relative_se=math.sqrt(math.expm1(mean) / partitions) / mean,
    )
