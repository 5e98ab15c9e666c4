"""Answers to a planner's questions: steps, drivers, break-even, spares, splits."""

from dataclasses import dataclass
from decimal import Decimal
from fractions import Fraction

from panelkit.records.panel_cost import PanelCost
from panelkit.records.record import Record

__all__ = [
    "BreakEven",
    "Crossing",
    "Driver",
    "PriceQuestion",
    "Spares",
    "SplitCost",
    "Stair",
    "StepDown",
]


@dataclass(frozen=True, slots=True)
class Stair:
    """One panel size of a staircase of cost against size.

    Attributes
    ----------
    size : int
        Markers, the first so many of an order.
    marker : str
        The marker that this size adds.
    total, cost_per_result : Decimal or None
        None where such a panel cannot be run.
    marginal : Decimal or None
        What the last marker adds to the total (F15).
    step : str
        What becomes more with it, such as ``"a pool"``; empty where nothing does.
    """

    size: int
    marker: str
    total: Decimal | None
    cost_per_result: Decimal | None
    marginal: Decimal | None
    step: str


@dataclass(frozen=True, slots=True)
class Driver:
    """What one marker has to do with the cost of a panel.

    Attributes
    ----------
    marker : str
        Its id.
    saving : Decimal or None
        What leaving it out saves (F16); savings are no shares and do not add up.
    own_one_off, own_reagent : Decimal or None
        What is paid for this marker alone; None where a quote is missing.
    by_kit : str
        The kits that measure it; empty where it has an assay of its own.
    """

    marker: str
    saving: Decimal | None
    own_one_off: Decimal | None
    own_reagent: Decimal | None
    by_kit: str


@dataclass(frozen=True, slots=True)
class StepDown:
    """The next step down: how many markers to leave out until something is saved.

    Attributes
    ----------
    remove : int
        Markers to leave out.
    markers : tuple of str
        Which, the last of the order.
    saves : str
        What becomes fewer, such as ``"1 pool"``.
    saving : Decimal
        Of the total.
    """

    remove: int
    markers: tuple[str, ...]
    saves: str
    saving: Decimal


@dataclass(frozen=True, slots=True)
class Crossing:
    """A number of samples from which another scenario is the cheaper one.

    Attributes
    ----------
    samples : int
        The first of them.
    cheaper : {"A", "B"}
        Which one.
    difference : Decimal
        Total of A less total of B there.
    """

    samples: int
    cheaper: str
    difference: Decimal


@dataclass(frozen=True, slots=True, eq=False)
class BreakEven(Record):
    """From which number of samples B is cheaper than A (F18).

    Attributes
    ----------
    first : int or None
        The first number at which B is cheaper; None up to `largest`.
    crossings : tuple of Crossing
        Every change of the cheaper one, by number of samples.
    stays_from : int or None
        From where B stays cheaper up to `largest`; None where it does not.
    largest : int
        The largest number of samples that was looked at.
    samples : tuple of int
        The numbers that were priced: all near a crossing, some elsewhere.
    total_a, total_b : tuple of Decimal
        At each of them.
    """

    first: int | None
    crossings: tuple[Crossing, ...]
    stays_from: int | None
    largest: int
    samples: tuple[int, ...]
    total_a: tuple[Decimal, ...]
    total_b: tuple[Decimal, ...]


@dataclass(frozen=True, slots=True)
class PriceQuestion:
    """What the price of one marker without a quote would have to be (F19).

    Attributes
    ----------
    marker, platform : str
        Whose quote is missing.
    break_even : Decimal or None
        Price of one reaction below which this panel is cheaper than the other, with
        up to four digits more than the minor unit; None where no price decides.
    verdict : str
        One sentence.
    """

    marker: str
    platform: str
    break_even: Decimal | None
    verdict: str


@dataclass(frozen=True, slots=True, eq=False)
class SplitCost(Record):
    """One panel on several platforms.

    Attributes
    ----------
    parts : tuple of PanelCost
        Of the platforms that are used; collection is counted in the first alone.
    markers : tuple of tuple of str
        The markers of each.
    total, total_high : Decimal
        Sums over the parts.
    results : Fraction
        Expected results: a result needs all parts, which fail independently.
    cost_per_result : Decimal
        Total by results.
    proved : bool
        Whether every way to split was looked at.
    """

    parts: tuple[PanelCost, ...]
    markers: tuple[tuple[str, ...], ...]
    total: Decimal
    total_high: Decimal
    results: Fraction
    cost_per_result: Decimal
    proved: bool


@dataclass(frozen=True, slots=True, eq=False)
class Spares(Record):
    """How many assays to order so that enough of them work.

    Attributes
    ----------
    wanted : int
        How many must work.
    probability : float
        With which.
    order : int
        How many to order, the panel's own included.
    spares : tuple of str
        Which stand-ins to order beside the panel.
    reached : float
        Probability that enough work.
    reached_without : float
        The same without spares.
    spend : Decimal or None
        Development of all that is ordered at once; None where a quote is missing.
    spend_one_by_one : Decimal or None
        Expected development when a spare is ordered only once one is needed.
    proved : bool
        Whether no cheaper set of spares reaches the probability.
    enough : bool
        Whether the probability can be reached with the stand-ins there are.
    """

    wanted: int
    probability: float
    order: int
    spares: tuple[str, ...]
    reached: float
    reached_without: float
    spend: Decimal | None
    spend_one_by_one: Decimal | None
    proved: bool
    enough: bool
