"""Everything that a report shows of a run, ready-made."""

from collections.abc import Mapping
from dataclasses import dataclass

from panelkit.records.accuracy import Comparator
from panelkit.records.findings import Findings, Flow
from panelkit.records.frontier import Choice, Frontier
from panelkit.records.panel_cost import PanelCost
from panelkit.records.record import Record
from panelkit.records.stability import ErrorBound, ShortlistTable

__all__ = ["RESEARCH_USE", "RunSummary"]

RESEARCH_USE = (
    "For research and planning only. No panel proposed here has been clinically "
    "validated; use for patients needs analytical and clinical validation and "
    "licensed practice under local rules."
)


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
