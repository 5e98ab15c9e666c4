"""Everything that a report shows of a run, ready-made."""

from collections.abc import Mapping
from dataclasses import dataclass
from decimal import Decimal

from panelkit.records.accuracy import Comparator
from panelkit.records.findings import Findings, Flow
from panelkit.records.fragility import Aftermath
from panelkit.records.frontier import Choice, Frontier
from panelkit.records.panel_cost import PanelCost
from panelkit.records.record import Record
from panelkit.records.stability import ErrorBound, ShortlistTable

__all__ = ["RESEARCH_USE", "CostOfFolds", "RunSummary"]

RESEARCH_USE = (
    "For research and planning only. No panel proposed here has been clinically "
    "validated; use for patients needs analytical and clinical validation and "
    "licensed practice under local rules."
)


VISIBLE = 0.3
"""Share of the way from no skill to perfection above which a figure that cannot be
told from no skill says that people are few rather than that nothing is there."""


@dataclass(frozen=True, slots=True, eq=False)
class CostOfFolds(Record):
    """What the panels cost that the primary rule chose in the training sets.

    Attributes
    ----------
    median, low, high : Decimal
        Programme cost: median, cheapest, dearest. Of an even number the lower of the
        two in the middle is the median, so that it is the cost of a panel.
    n_priced, n_folds : int
        Training sets whose panel could be priced, and all of them.
    """

    median: Decimal
    low: Decimal
    high: Decimal
    n_priced: int
    n_folds: int


@dataclass(frozen=True, slots=True, eq=False)
class RunSummary(Record):
    """A finished run, for the report and the terminal.

    Attributes
    ----------
    study : str
        Name of the study file.
    outcome : str
        The outcome in words: column, positive against negative class.
    n_samples, n_subjects, n_features : int
        Analysed samples, their subjects, features of the matrix.
    scheme : str
        How accuracy was estimated, in words.
    confidence : float
        Of every interval, for example 0.95.
    preparation : tuple of str
        Steps of the recipe, in words.
    findings : Findings
        What was noticed about the data.
    flow : tuple of Flow
        Participant flow by class.
    bound : ErrorBound
        Of the shortlist.
    shortlist : ShortlistTable
        Features that were picked at least once, or are candidates.
    frontier : Frontier
        Panels with price and accuracy.
    choice : Choice
        Headline and every rule's choice.
    comparators : tuple of Comparator
        What else could be done with the same data.
    costs : tuple of PanelCost
        The primary choice priced on each platform; empty where nothing was priced.
    statement : mapping of str to str
        The study's own texts: intended use and the like.
    provenance : mapping of str to str
        Versions, seed, hashes.
    aftermath : Aftermath
        What the chosen panel loses, gains and depends on.
    metric, metric_words : str
        Code of the metric of every accuracy, and the metric in words.
    no_skill : float
        What the metric is worth where nothing is predicted; 1 is perfect.
    fold_costs : CostOfFolds or None
        Of the panels that the training sets chose; None where nothing was priced.
    """

    study: str
    outcome: str
    n_samples: int
    n_subjects: int
    n_features: int
    scheme: str
    confidence: float
    preparation: tuple[str, ...]
    findings: Findings
    flow: tuple[Flow, ...]
    bound: ErrorBound
    shortlist: ShortlistTable
    frontier: Frontier
    choice: Choice
    comparators: tuple[Comparator, ...]
    costs: tuple[PanelCost, ...]
    statement: Mapping[str, str]
    provenance: Mapping[str, str]
    aftermath: Aftermath
    metric: str
    metric_words: str
    no_skill: float
    fold_costs: CostOfFolds | None = None

    @property
    def doubt(self) -> str:
        """What the headline's interval says against any skill; empty for nothing."""
        headline, floor = self.choice.headline, self.no_skill
        if headline.metric_high < floor:
            return (
                f"The whole interval of the headline lies below {floor:g} (no skill): "
                "what was learnt misleads in new people."
            )
        if not headline.metric_low <= floor <= headline.metric_high:
            return ""
        if headline.metric >= floor + VISIBLE * (1.0 - floor):
            return (
                f"The interval of the headline holds {floor:g} (no skill) because "
                f"there are few people ({self.n_subjects:,}): a figure of "
                f"{headline.metric:.3f} is neither confirmed nor excluded."
            )
        return (
            f"The interval of the headline holds {floor:g} (no skill): these data show "
            "no accuracy."
        )
