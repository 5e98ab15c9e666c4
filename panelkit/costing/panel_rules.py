"""Rules of choice among panels with a cost, a size and an accuracy (sections 3b, 3f).

Accuracies are compared after rounding to four decimals, so that two machines agree.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from decimal import Decimal
from itertools import pairwise

from scipy import stats

__all__ = [
    "PanelFigures",
    "best_within_budget",
    "cheapest_first",
    "cost_accuracy_front",
    "not_worse",
    "price_of_accuracy",
    "within_one_se",
]

PLACES = 4


@dataclass(frozen=True, slots=True)
class PanelFigures:
    """One candidate panel.

    Attributes
    ----------
    name : str
        Of the panel; the last to break a tie.
    size : int
        Assays.
    total : Decimal
        Programme cost.
    area : float
        Accuracy.
    se : float
        Its standard error over folds.
    difference, difference_se : float
        Paired difference to a reference panel, with its corrected standard error.
    """

    name: str
    size: int
    total: Decimal
    area: float
    se: float = 0.0
    difference: float = 0.0
    difference_se: float = 0.0

    @property
    def rounded(self) -> float:
        """The accuracy as it is compared."""
        return round(self.area, PLACES)


def cheapest_first(panels: Sequence[PanelFigures]) -> tuple[PanelFigures, ...]:
    """Return panels by cost, then size, then accuracy from the top, then name."""
    return tuple(sorted(panels, key=lambda p: (p.total, p.size, -p.rounded, p.name)))


def cost_accuracy_front(panels: Sequence[PanelFigures]) -> tuple[PanelFigures, ...]:
    """Return the panels that no other beats in cost and accuracy, cheapest first."""
    front: list[PanelFigures] = []
    for panel in sorted(panels, key=lambda p: (p.total, -p.rounded, p.size, p.name)):
        if not front or panel.rounded > front[-1].rounded:
            front.append(panel)
    return tuple(front)


def price_of_accuracy(front: Sequence[PanelFigures]) -> tuple[Decimal, ...]:
    """Return the cost of 0.01 of accuracy between neighbours of a front.

    Parameters
    ----------
    front : sequence of PanelFigures
        Cheapest first.

    Returns
    -------
    tuple of Decimal
        One fewer than there are panels. Steps of cost make it jump.
    """
    gains = [
        (b.total - a.total, Decimal(str(b.rounded)) - Decimal(str(a.rounded)))
        for a, b in pairwise(front)
    ]
    return tuple(cost / (100 * gain) for cost, gain in gains)


def best_within_budget(
    panels: Sequence[PanelFigures], budget: Decimal
) -> PanelFigures | None:
    """Return the most accurate panel that a budget pays for, None where there is none.

    Equals go to the cheaper, then to the smaller, then to the first name.
    """
    able = [panel for panel in panels if panel.total <= budget]
    return min(able, key=lambda p: (-p.rounded, p.total, p.size, p.name), default=None)


def within_one_se(panels: Sequence[PanelFigures]) -> tuple[PanelFigures, ...]:
    """Return the panels within one standard error of the best, in the order given.

    References
    ----------
    Breiman, L., et al. (1984). Classification and Regression Trees, section 3.4.3. A
    convention: it is no evidence that the panels are equivalent.
    """
    best = max(panels, key=lambda p: (p.rounded, -p.total, -p.size))
    floor = round(best.area - best.se, PLACES)
    return tuple(p for p in panels if p.rounded >= floor or p is best)


def not_worse(
    panels: Sequence[PanelFigures], margin: float, df: int, confidence: float = 0.95
) -> tuple[PanelFigures, ...]:
    """Return the panels that are not worse than the reference by a margin.

    Parameters
    ----------
    panels : sequence of PanelFigures
        With their paired difference to the reference.
    margin : float
        Accepted loss, chosen beforehand.
    df : int
        Degrees of freedom: differences less one.
    confidence : float
        One-sided.

    Returns
    -------
    tuple of PanelFigures
        Those whose lower limit lies above the negative margin, in the order given.

    References
    ----------
    Nadeau, C., Bengio, Y. (2003). Machine Learning 52, 239-281, for the corrected
    standard error that this needs.
    """
    factor = float(stats.t.ppf(confidence, df))
    return tuple(p for p in panels if p.difference - factor * p.difference_se > -margin)
