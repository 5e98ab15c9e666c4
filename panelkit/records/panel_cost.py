"""What one panel costs on one platform."""

from dataclasses import dataclass, field
from decimal import Decimal
from fractions import Fraction
from typing import TYPE_CHECKING

from panelkit.records.findings import Findings
from panelkit.records.record import Record, frame

if TYPE_CHECKING:
    import pandas as pd

__all__ = ["CostLine", "PanelCost"]


@dataclass(frozen=True, slots=True)
class CostLine:
    """One line of a panel's cost.

    Attributes
    ----------
    name : str
        What is paid for.
    amount : Decimal
        Rounded to the minor unit of the currency.
    amount_high : Decimal
        The same with every missing price at the highest quote; equal to `amount`
        unless prices are missing and bounds were asked for.
    """

    name: str
    amount: Decimal
    amount_high: Decimal


@dataclass(frozen=True, slots=True, eq=False)
class PanelCost(Record):
    """What one panel costs on one platform over a programme.

    Figures without ``_high`` hold every missing price at the platform's lowest
    quote (`missing_price` = bound) or its median quote (impute). With bounds the
    layout (groups, runs, positions) is that of `total`; `total_high` may use another.

    Attributes
    ----------
    currency : str
        ISO 4217 code of every amount.
    platform : str
        Name of the platform; ``""`` when the rows named none.
    lines : tuple of CostLine
        They add up to the totals.
    total, total_high : Decimal
        Programme cost; an interval only where prices are missing.
    cost_per_result, cost_per_result_high : Decimal
        Total by expected results, rounded to the minor unit.
    one_off, recurring : Decimal
        Set-up with development, and the rest; they add up to `total`.
    per_year : Decimal
        `recurring` for twelve months.
    samples_run : int
        Samples run, repeats included.
    results : Fraction
        Results expected.
    pools : int
        Pools of one sample.
    groups : tuple of int
        Pools in each of the runs over which one sample is spread.
    samples_per_run : tuple of int
        Samples that fit in one run of each group.
    runs : int
        Runs over the programme.
    positions_per_run : int
        Usable positions of one run.
    filled_positions, control_positions : int
        Positions used over the programme; controls are part of the first.
    preparations : int
        Preparations of one sample; 0 when one feeds any number of positions.
    missing_quotes : tuple of str
        Assays without a complete quote, in file order.
    findings : Findings
        What was noticed about this panel's assays.
    """

    currency: str
    platform: str
    lines: tuple[CostLine, ...]
    total: Decimal
    total_high: Decimal
    cost_per_result: Decimal
    cost_per_result_high: Decimal
    one_off: Decimal
    recurring: Decimal
    per_year: Decimal
    samples_run: int
    results: Fraction
    pools: int
    groups: tuple[int, ...]
    samples_per_run: tuple[int, ...]
    runs: int
    positions_per_run: int
    filled_positions: int
    control_positions: int
    preparations: int
    missing_quotes: tuple[str, ...] = ()
    findings: Findings = field(default_factory=Findings)

    @property
    def fill(self) -> Fraction:
        """Share of the positions paid for that are used."""
        return Fraction(self.filled_positions, self.runs * self.positions_per_run)

    def to_frame(self) -> "pd.DataFrame":
        """Return one row a line: line, amount, amount_high, currency."""
        return frame(
            {
                "line": [line.name for line in self.lines],
                "amount": [line.amount for line in self.lines],
                "amount_high": [line.amount_high for line in self.lines],
                "currency": [self.currency] * len(self.lines),
            }
        )
