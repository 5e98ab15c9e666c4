"""What one panel costs on one platform."""

from dataclasses import dataclass, field
from decimal import Decimal
from fractions import Fraction
from typing import TYPE_CHECKING, Final

from panelkit.records.findings import Findings
from panelkit.records.record import Record, frame

if TYPE_CHECKING:
    import pandas as pd

__all__ = ["LINE_WORDS", "CostLine", "KitPurchase", "PanelCost"]

LINE_WORDS: Final = {
    "collection": "collection of samples",
    "setup": "set-up",
    "development": "development of assays",
    "runs": "runs",
    "samples": "work on each sample",
    "positions": "filled positions",
    "assays": "reagents of assays",
    "lots": "changes of lot",
    "kits": "kits",
}
"""The lines of a cost in words for people."""


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


@dataclass(frozen=True, slots=True)
class KitPurchase:
    """A kit that is bought for a panel.

    Attributes
    ----------
    kit : str
        Its id.
    units : int
        How many.
    once, cost : Decimal
        Onboarding, and the whole price with it, each rounded to the minor unit.
    covers : tuple of str
        Markers of the panel that it measures.
    unwanted : tuple of str
        What else it measures.
    """

    kit: str
    units: int
    once: Decimal
    cost: Decimal
    covers: tuple[str, ...]
    unwanted: tuple[str, ...]


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
        Set-up with development and onboarding of kits, and the rest; they add up to
        `total`.
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
    assays : tuple of str
        Assays run one by one or in pools, markers before references.
    reactions : tuple of int
        Reactions bought of each of them over the programme, all lots.
    pool_of : tuple of int
        The pool of each of them, from 0; -1 for a reference that is in every pool.
    fullest_pool : int
        Slots of the fullest pool, references in every pool included.
    lots : int
        Reagent lots over the programme.
    kits : tuple of KitPurchase
        Kits that are bought; their markers need no assay of their own.
    proved : bool
        Whether no other choice of kits is cheaper; always true without kits.
    bound : Decimal or None
        What no choice of kits can cost less than, where that is not proved.
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
    assays: tuple[str, ...] = ()
    reactions: tuple[int, ...] = ()
    pool_of: tuple[int, ...] = ()
    fullest_pool: int = 0
    lots: int = 1
    kits: tuple[KitPurchase, ...] = ()
    proved: bool = True
    bound: Decimal | None = None
    findings: Findings = field(default_factory=Findings)

    @property
    def unwanted(self) -> tuple[str, ...]:
        """What kits measure beside the panel, by kit."""
        return tuple(name for kit in self.kits for name in kit.unwanted)

    def line(self, name: str) -> Decimal:
        """Return the amount of one line, 0 where there is none."""
        return next(
            (each.amount for each in self.lines if each.name == name), Decimal(0)
        )

    @property
    def fill(self) -> Fraction:
        """Share of the positions paid for that are used; 0 where only kits are run."""
        if not self.runs:
            return Fraction(0)
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
