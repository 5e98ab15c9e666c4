"""Panels with their price and honest accuracy, and the choice among them."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from decimal import Decimal
from typing import TYPE_CHECKING

from panelkit.records.record import Record, frame

if TYPE_CHECKING:
    import pandas as pd

__all__ = ["Choice", "Frontier", "FrontierRow", "Headline", "RuleChoice"]


@dataclass(frozen=True, slots=True)
class FrontierRow:
    """One panel size of one maker (a row of `frontier.csv`).

    Attributes
    ----------
    panel : str
        Name of the panel, ``maker-size``.
    maker : str
        Procedure that proposed it.
    size : int
        Markers asked for.
    markers : tuple of str
        The panel learnt on all analysed samples.
    metric_of : str
        Always ``"procedure"``: the figure belongs to the maker at this size; the
        accuracy of the printed panel is unknown until new people are measured.
    metric, metric_low, metric_high : float
        The outcome's metric within test folds, with its interval.
    metric_se_naive, metric_se_corrected : float
        Standard errors of the mean over folds.
    slope : float
        Out-of-fold calibration slope, mean over repeats.
    cost_total, cost_per_result : Decimal or None
        None where nothing was priced; in the programme's currency.
    cost_total_high : Decimal or None
        Upper end where a price is missing, else as `cost_total`.
    platform : str
        Platform of the cost.
    on_frontier : bool
        No other row costs at most as much (or reads as few markers where nothing is
        priced) and is at least as accurate, with one of the two better.
    chosen_by : str
        Rules that choose this row, joined by ``;``.
    """

    panel: str
    maker: str
    size: int
    markers: tuple[str, ...]
    metric_of: str
    metric: float
    metric_low: float
    metric_high: float
    metric_se_naive: float
    metric_se_corrected: float
    slope: float
    cost_total: Decimal | None
    cost_per_result: Decimal | None
    cost_total_high: Decimal | None
    platform: str
    on_frontier: bool
    chosen_by: str = ""


@dataclass(frozen=True, slots=True, eq=False)
class Frontier(Record):
    """All rows, in order of maker and size."""

    rows: tuple[FrontierRow, ...]

    def to_frame(self) -> "pd.DataFrame":
        """Return one row a panel; markers joined by ``;``."""
        names = [name for name in FrontierRow.__slots__]
        table: dict[str, list[object]] = {
            name: [getattr(row, name) for row in self.rows] for name in names
        }
        table["markers"] = [";".join(row.markers) for row in self.rows]
        return frame(table)


@dataclass(frozen=True, slots=True)
class RuleChoice:
    """What one rule chose.

    Attributes
    ----------
    rule : str
        Name of the rule.
    primary : bool
        The rule that the headline follows; whether the study declared it is said there.
    panel : str
        The row of the frontier; empty where no row meets the rule.
    figures : mapping of str to float
        The figures that decided.
    sentence : str
        The choice in words.
    markers : tuple of str
        The panel learnt on all analysed samples; empty where no row meets the rule.
    platform : str
        Platform of the cost, the cheapest that can run the panel.
    currency : str
        Code of the programme's currency; empty where nothing was priced.
    cost_total, cost_per_result : Decimal or None
        None where nothing was priced or no row meets the rule.
    """

    rule: str
    primary: bool
    panel: str
    figures: Mapping[str, float]
    sentence: str
    markers: tuple[str, ...] = ()
    platform: str = ""
    currency: str = ""
    cost_total: Decimal | None = None
    cost_per_result: Decimal | None = None


@dataclass(frozen=True, slots=True)
class Headline:
    """The run's main figure and what it is the accuracy of.

    Attributes
    ----------
    metric_of : str
        What the figure belongs to, in words.
    metric, metric_low, metric_high : float
        The outcome's metric, nested, with its interval.
    declared : bool
        Whether the primary rule was written in the study file.
    sentence : str
        For the first screen.
    """

    metric_of: str
    metric: float
    metric_low: float
    metric_high: float
    declared: bool
    sentence: str


@dataclass(frozen=True, slots=True)
class Choice:
    """The headline and every rule's choice, the primary first."""

    headline: Headline
    rules: Sequence[RuleChoice]
