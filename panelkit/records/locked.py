"""A locked panel: all that is needed to score one new sample, and nothing to learn."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Literal

__all__ = [
    "AssayStep",
    "CutOff",
    "Fallback",
    "HonestFigures",
    "PanelContent",
    "PanelMarker",
    "PanelReference",
    "Parent",
    "TrainingRows",
]


@dataclass(frozen=True, slots=True)
class PanelMarker:
    """One marker of a locked panel.

    Attributes
    ----------
    feature : str
        Id, as tables of samples must write it.
    analyte : str
        What it measures; empty where the study does not say.
    unit : str
        Unit of the measured values; empty where the study does not say.
    coefficient : float
        Change of the log-odds for one unit of the prepared value.
    fill : float
        Prepared value that stands for a missing cell.
    measured_low, measured_high : float
        Range of the measured values on the training rows.
    prepared_low, prepared_high : float
        Range of the prepared values on the training rows.
    prepared_mean, prepared_deviation : float
        Weighted mean and standard deviation on the training rows.
    class_means : tuple of float
        Means of the negative and of the positive class.
    class_deviation : float
        Standard deviation within the classes.
    """

    feature: str
    analyte: str
    unit: str
    coefficient: float
    fill: float
    measured_low: float
    measured_high: float
    prepared_low: float
    prepared_high: float
    prepared_mean: float
    prepared_deviation: float
    class_means: tuple[float, float]
    class_deviation: float


@dataclass(frozen=True, slots=True)
class PanelReference:
    """A reference assay that markers are divided by.

    Attributes
    ----------
    feature : str
        Id, as tables of samples must write it.
    fill : float
        Value, on the scale of the step, that stands for a missing cell.
    """

    feature: str
    fill: float


@dataclass(frozen=True, slots=True)
class AssayStep:
    """One step of the frozen preparation, done on one sample by itself.

    Attributes
    ----------
    step : str
        ``log2``, ``m-values``, ``reference-ratio``, or the fill.
    words : str
        What it does.
    parameters : mapping of str to float
        Frozen numbers of the step.
    """

    step: str
    words: str
    parameters: Mapping[str, float]


@dataclass(frozen=True, slots=True)
class CutOff:
    """A score from which a result is called positive.

    Attributes
    ----------
    name : str
        As it was asked for, for example ``sensitivity=0.9``.
    chance : float
        Positive from this recalibrated chance on.
    log_odds : float
        The same on the log-odds.
    chance_low, chance_high : float
        Bootstrap interval over subjects.
    grey_low, grey_high : float
        Chances between these are called ``grey``: sampling error of the cut-off, and
        of the assay where its error was stated.
    sensitivity, sensitivity_low, sensitivity_high : float
        Out-of-fold, with the bootstrap interval of what re-chosen cut-offs give.
    specificity, specificity_low, specificity_high : float
        Likewise.
    positive_value, negative_value : float
        Predictive values at `prevalence`; null where none is stated.
    prevalence : float
        Share of the positive class among the people the test is for; null where it is
        not stated.
    net_benefit : float
        At the cut-off's chance, at the stated prevalence or the study's own.
    sentence : str
        In words.
    """

    name: str
    chance: float
    log_odds: float
    chance_low: float
    chance_high: float
    grey_low: float
    grey_high: float
    sensitivity: float
    sensitivity_low: float
    sensitivity_high: float
    specificity: float
    specificity_low: float
    specificity_high: float
    positive_value: float
    negative_value: float
    prevalence: float
    net_benefit: float
    sentence: str


@dataclass(frozen=True, slots=True)
class Fallback:
    """The panel without one marker, for samples in which it could not be measured.

    Attributes
    ----------
    missing : str
        The marker that is not there.
    intercept : float
        Of the panel without it.
    coefficients : mapping of str to float
        Of the other markers.
    metric, loss, loss_low, loss_high : float
        Honest metric of panels that lost the marker in this role, and what it lost.
    sentence : str
        In words.
    """

    missing: str
    intercept: float
    coefficients: Mapping[str, float]
    metric: float
    loss: float
    loss_low: float
    loss_high: float
    sentence: str


@dataclass(frozen=True, slots=True)
class HonestFigures:
    """What is known of the panel's accuracy before new people are measured.

    Attributes
    ----------
    metric_of : str
        What the figures belong to: the procedure, never this very panel.
    metric, metric_low, metric_high : float
        Area under the ROC curve within test folds, with its interval.
    slope : float
        Out-of-fold calibration slope.
    shrinkage : float
        What the refit's log-odds were multiplied by.
    sentence : str
        In words.
    """

    metric_of: str
    metric: float
    metric_low: float
    metric_high: float
    slope: float
    shrinkage: float
    sentence: str


@dataclass(frozen=True, slots=True)
class TrainingRows:
    """The rows that taught the panel, so that others can be told from them.

    Attributes
    ----------
    samples, subjects, cases : int
        Numbers of them.
    prevalence : float
        Share of the positive class, every subject counted once.
    score_mean, score_deviation : float
        Of the panel's log-odds on these rows.
    ids : sequence of str
        Hash of each sample's and subject's id.
    values : sequence of str
        Hash of each sample's measured marker values.
    sha256 : mapping of str to str
        Role of each input file to its hash.
    """

    samples: int
    subjects: int
    cases: int
    prevalence: float
    score_mean: float
    score_deviation: float
    ids: Sequence[str]
    values: Sequence[str]
    sha256: Mapping[str, str]


@dataclass(frozen=True, slots=True)
class Parent:
    """The panel file that this one was recalibrated from.

    Attributes
    ----------
    sha256 : str
        Its content hash.
    changed : str
        ``intercept``, or ``intercept and slope``.
    intercept, slope : float
        What the parent's log-odds were changed by.
    samples, cases : int
        Rows that the change was learnt from.
    sentence : str
        In words, with figures on rows that did not fit it.
    """

    sha256: str
    changed: Literal["intercept", "intercept and slope"]
    intercept: float
    slope: float
    samples: int
    cases: int
    sentence: str


@dataclass(frozen=True, slots=True)
class PanelContent:
    """Content of a panel file.

    Attributes
    ----------
    panel_format : int
        Version of this layout.
    content_sha256 : str
        Hash of all the rest. It notices accidents, not forgery.
    name : str
        Name of the panel, ``maker-size``.
    study : str
        Name of the study file.
    outcome, negative, positive : str
        Column and classes; chances are those of the positive class.
    design : str
        How people came into the study.
    prevalence : float
        That chances are stated for; null: the study's own share of the positive class.
    steps : sequence of AssayStep
        Preparation of one sample, in order.
    references : sequence of PanelReference
        Assays beside the markers.
    markers : sequence of PanelMarker
        In the order in which the score is summed.
    intercept : float
        Log-odds where every prepared value is 0.
    cutoffs : sequence of CutOff
        May be empty.
    fallbacks : sequence of Fallback
        One a marker, or none.
    ridge_penalty : float
        Of the refit.
    honest : HonestFigures
        What is known of its accuracy.
    training : TrainingRows
        Rows that taught it.
    record_sha256 : str
        Hash of the content of the run's ``record.json``, keys sorted, no spaces.
    seed : int
        Root of the run's random draws.
    versions : mapping of str to str
        Of panelkit, Python and libraries.
    parent : Parent or None
        None unless recalibrated.
    cautions : sequence of str
        To be read before use.
    """

    panel_format: Literal[1]
    content_sha256: str
    name: str
    study: str
    outcome: str
    negative: str
    positive: str
    design: str
    prevalence: float
    steps: Sequence[AssayStep]
    references: Sequence[PanelReference]
    markers: Sequence[PanelMarker]
    intercept: float
    cutoffs: Sequence[CutOff]
    fallbacks: Sequence[Fallback]
    ridge_penalty: float
    honest: HonestFigures
    training: TrainingRows
    record_sha256: str
    seed: int
    versions: Mapping[str, str]
    parent: Parent | None
    cautions: Sequence[str]

    @property
    def features(self) -> tuple[str, ...]:
        """Ids of markers, then references: what has to be measured."""
        own = [marker.feature for marker in self.markers]
        return (*own, *(each.feature for each in self.references))
