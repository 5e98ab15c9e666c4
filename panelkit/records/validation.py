"""What new people say of a locked panel."""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

__all__ = ["MarkerShift", "Validation", "ValidationFigure", "Verdict"]

Verdict = Literal["pass", "fail", "inconclusive", "exploratory"]


@dataclass(frozen=True, slots=True)
class ValidationFigure:
    """One figure of a validation.

    Attributes
    ----------
    measure : str
        What it is, for example ``auc``.
    of : str
        ``all``, a cut-off, a subgroup, or another panel.
    value, low, high : float
        With its interval where there is one.
    samples, cases : int
        That it is of.
    method : str
        How the interval was made.
    note : str
        What to keep in mind; ``too small`` for a group of too few people.
    """

    measure: str
    of: str
    value: float
    low: float
    high: float
    samples: int
    cases: int
    method: str
    note: str


@dataclass(frozen=True, slots=True)
class MarkerShift:
    """How far one marker lies from where it was learnt, outcome held equal.

    Attributes
    ----------
    feature : str
        The marker.
    shift, shift_low, shift_high : float
        Mean over the classes of new less training means, prepared scale.
    spread_ratio : float
        Standard deviation within classes, new over training.
    difference_training, difference : float
        Mean of the positive less that of the negative class, then and now.
    difference_low, difference_high : float
        Interval of `difference`.
    outside_share : float
        Share of values outside the training range.
    """

    feature: str
    shift: float
    shift_low: float
    shift_high: float
    spread_ratio: float
    difference_training: float
    difference: float
    difference_low: float
    difference_high: float
    outside_share: float


@dataclass(frozen=True, slots=True)
class Validation:
    """A locked panel judged on new people.

    Attributes
    ----------
    panel, panel_sha256 : str
        Name and content hash of the panel.
    plan_sha256 : str
        Hash of the plan; empty without one.
    scores_sha256 : str
        Hash of the score file, which holds no outcome.
    verdict : str
        ``exploratory`` without a plan.
    sentence : str
        The verdict in words.
    samples, subjects, cases, controls : int
        Who was measured.
    left_out : int
        Samples without a score.
    figures : sequence of ValidationFigure
        All of them.
    shifts : sequence of MarkerShift
        One a marker.
    platform_shift : float
        Median of the markers' shifts.
    notes : sequence of str
        What was noticed, in words.
    openings : int
        How often rows that were set aside have been opened; 0 for other samples.
    research_use : str
        What this may be used for.
    """

    panel: str
    panel_sha256: str
    plan_sha256: str
    scores_sha256: str
    verdict: Verdict
    sentence: str
    samples: int
    subjects: int
    cases: int
    controls: int
    left_out: int
    figures: Sequence[ValidationFigure]
    shifts: Sequence[MarkerShift]
    platform_shift: float
    notes: Sequence[str]
    openings: int
    research_use: str

    def figure(self, measure: str, of: str = "all") -> ValidationFigure | None:
        """Return one figure, or None."""
        for each in self.figures:
            if each.measure == measure and each.of == of:
                return each
        return None
