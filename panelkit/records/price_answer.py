"""What `panelkit price` answers: scenarios, what they assume, what is between them."""

from dataclasses import dataclass, field
from decimal import Decimal
from fractions import Fraction

from panelkit.records.cost_answers import (
    BreakEven,
    Driver,
    PriceQuestion,
    Spares,
    SplitCost,
    Stair,
    StepDown,
)
from panelkit.records.findings import Findings
from panelkit.records.panel_cost import PanelCost
from panelkit.records.record import Record

__all__ = [
    "Assumption",
    "CostSheet",
    "PriceAnswer",
    "ScenarioAnswer",
    "SheetAssay",
    "Variation",
]


@dataclass(frozen=True, slots=True)
class Assumption:
    """One value that a price rests on.

    Attributes
    ----------
    key, value : str
        What, and how much.
    source : str
        ``given``, ``file``, ``preset of NAME``, ``default`` or ``assumed``.
    """

    key: str
    value: str
    source: str


@dataclass(frozen=True, slots=True)
class SheetAssay:
    """One assay of a spreadsheet.

    Attributes
    ----------
    name, role : str
        Which assay.
    pool : int
        Its pool, from 1; 0 for a reference that is in every pool.
    dev : Decimal or None
        None where no quote is at hand.
    test, pack_price : Decimal or None
        Price of a reaction, of a pack.
    pack : int or None
        Reactions of a pack.
    tiers : tuple of (int, Decimal)
        Quantity and price.
    incremental : bool
        Whether tiers price the reactions inside them only.
    fail_rate : Decimal
        Chance that it forces a repeat.
    slots : int
        Of its pool.
    """

    name: str
    role: str
    pool: int
    dev: Decimal | None
    test: Decimal | None
    pack: int | None
    pack_price: Decimal | None
    tiers: tuple[tuple[int, Decimal], ...]
    incremental: bool
    fail_rate: Decimal
    slots: int


@dataclass(frozen=True, slots=True, eq=False)
class CostSheet(Record):
    """All that a spreadsheet with live formulas needs of one priced panel.

    Attributes
    ----------
    name : str
        Of the scenario.
    cost : PanelCost
        What was computed: the sheet has to come to the same total.
    digits : int
        Of the minor unit.
    inputs : tuple of (str, Decimal or int or str)
        Keys of the programme and of the platform, with their values.
    position_tiers : tuple of (int, Decimal)
        Slots and price of a position; one entry for a single price.
    groups : tuple of int
        Pools in each group of runs.
    assays : tuple of SheetAssay
        Of the panel as it is run.
    """

    name: str
    cost: PanelCost
    digits: int
    inputs: tuple[tuple[str, Decimal | int | str], ...]
    position_tiers: tuple[tuple[int, Decimal], ...]
    groups: tuple[int, ...]
    assays: tuple[SheetAssay, ...]


@dataclass(frozen=True, slots=True, eq=False)
class ScenarioAnswer(Record):
    """One panel, priced.

    Attributes
    ----------
    name : {"A", "B"}
        Which scenario.
    markers : tuple of str
        The panel.
    costs : tuple of PanelCost
        On every platform that can run it, cheapest first.
    refusals : tuple of (str, str)
        Platforms that cannot, each with the reason.
    split : SplitCost or None
        The cheapest way to use several platforms; None unless it was asked for.
    stairs : tuple of Stair
        Cost against size, on the cheapest platform.
    step_down : StepDown or None
        The next step down there.
    drivers : tuple of Driver
        What leaving each marker out saves there.
    assumptions : tuple of Assumption
        All that the price rests on.
    sheet : CostSheet
        For a spreadsheet.
    """

    name: str
    markers: tuple[str, ...]
    costs: tuple[PanelCost, ...]
    refusals: tuple[tuple[str, str], ...]
    split: SplitCost | None
    stairs: tuple[Stair, ...]
    step_down: StepDown | None
    drivers: tuple[Driver, ...]
    assumptions: tuple[Assumption, ...]
    sheet: CostSheet

    @property
    def cost(self) -> PanelCost:
        """On the cheapest platform."""
        return self.costs[0]


@dataclass(frozen=True, slots=True)
class Variation:
    """One value of a key that is varied.

    Attributes
    ----------
    scenario : {"A", "B"}
        Which scenario.
    key, value : str
        What was set to what.
    platform : str
        The cheapest; empty where none can run the panel.
    total, cost_per_result : Decimal or None
        There.
    runs : int
        There.
    fill : Fraction
        Share of the paid positions that are used.
    groups : int
        Runs over which a sample is spread.
    """

    scenario: str
    key: str
    value: str
    platform: str
    total: Decimal | None
    cost_per_result: Decimal | None
    runs: int
    fill: Fraction
    groups: int


@dataclass(frozen=True, slots=True, eq=False)
class PriceAnswer(Record):
    """Everything that `panelkit price` was asked.

    Attributes
    ----------
    currency : str
        ISO 4217 code.
    samples, horizon_months : int
        Of scenario A.
    scenarios : tuple of ScenarioAnswer
        A and, where asked for, B.
    saved : tuple of (str, Decimal)
        A less B: by line, total, per year, per result; empty without B.
    ranking : str
        One sentence: which is cheaper, or that a quote is needed; empty without B.
    break_even : BreakEven or None
        Over the number of samples.
    payback : int or None
        Months; None where not asked for, or never.
    change_cost : Decimal or None
        One-off cost of going from A to B.
    questions : tuple of PriceQuestion
        Quotes that are missing, those that decide most first.
    variations : tuple of Variation
        In the order asked.
    spares : Spares or None
        For scenario A.
    findings : Findings
        What was noticed.
    """

    currency: str
    samples: int
    horizon_months: int
    scenarios: tuple[ScenarioAnswer, ...]
    saved: tuple[tuple[str, Decimal], ...] = ()
    ranking: str = ""
    break_even: BreakEven | None = None
    payback: int | None = None
    change_cost: Decimal | None = None
    questions: tuple[PriceQuestion, ...] = ()
    variations: tuple[Variation, ...] = ()
    spares: Spares | None = None
    findings: Findings = field(default_factory=Findings)
