"""From a verification plan to the development cost of one marker."""

from dataclasses import dataclass
from fractions import Fraction

from panelkit.config import PlatformSection
from panelkit.costing.geometry import ceil_ratio
from panelkit.errors import UsageError

__all__ = ["VerificationPlan", "development_cost"]


@dataclass(frozen=True, slots=True)
class VerificationPlan:
    """Results that the verification of one assay takes.

    Attributes
    ----------
    precision, blanks, low_samples, linearity, comparison : int
        Results of each study.
    days : int
        Working days.
    """

    precision: int = 0
    blanks: int = 0
    low_samples: int = 0
    linearity: int = 0
    comparison: int = 0
    days: int = 0

    @property
    def results(self) -> int:
        """All results."""
        return (
            self.precision
            + self.blanks
            + self.low_samples
            + self.linearity
            + self.comparison
        )


def development_cost(
    plan: VerificationPlan,
    platform: PlatformSection,
    test: Fraction,
    *,
    day_cost: Fraction = Fraction(0),
    design: Fraction = Fraction(0),
) -> Fraction:
    """Return what designing and verifying one assay costs.

    Parameters
    ----------
    plan : VerificationPlan
        How many results, and how many days.
    platform : PlatformSection
        Gives replicates, positions, dead volume, and prices of positions and runs.
    test : Fraction
        Reagent price of one reaction.
    day_cost : Fraction
        Labour, for each day.
    design : Fraction
        Design and synthesis.

    Returns
    -------
    Fraction
        Reagents and positions with dead volume, runs, labour and design: a value for
        the column ``dev``.

    Raises
    ------
    UsageError
        The platform's price of a position is in tiers.
    """
    if isinstance(platform.position_cost, tuple):
        raise UsageError(
            code="position-price-in-tiers",
            where="platform, key 'position_cost'",
            what="one assay alone has no pool whose tier would count (got tiers)",
            accepted="one price of a position",
            next_step="Pass the platform with the price of the lowest tier",
        )
    positions = plan.results * platform.replicates
    each = test + Fraction(platform.position_cost)
    reagents = positions * (1 + Fraction(platform.overage)) * each
    runs = ceil_ratio(positions, platform.positions) * Fraction(platform.run_cost)
    return reagents + runs + plan.days * day_cost + design
