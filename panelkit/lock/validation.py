"""A locked panel on new people: figures, shifts, a verdict."""

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

from panelkit.config import LOCK, ValidationPlan
from panelkit.errors import InputDataError, PanelFileError, StudyFileError, name_some
from panelkit.lock.figures import (
    calibration_figures,
    cutoff_figures,
    discrimination_figure,
    subgroup_figures,
)
from panelkit.lock.freeze import id_hash, value_hash
from panelkit.lock.pairs import pair_figures
from panelkit.lock.scoring import Scores
from panelkit.lock.shifts import marker_shifts
from panelkit.records import (
    RESEARCH_USE,
    PanelContent,
    Validation,
    ValidationFigure,
    Verdict,
)

__all__ = ["NewPeople", "refuse_other_plan", "refuse_overlap", "validate_panel"]

FEWEST_MARKERS: Final = 3
"""Markers below which equal values may be a coincidence."""


@dataclass(frozen=True, slots=True, eq=False)
class NewPeople:
    """New samples with their outcomes.

    Attributes
    ----------
    samples : ndarray of shape (n_samples,), object
        Ids.
    subject_ids : ndarray of shape (n_samples,), object
        Subject of each sample, by id.
    subjects : ndarray of shape (n_samples,), int64
        Subject codes.
    outcome : ndarray of shape (n_samples,)
        0 and 1.
    values : ndarray of shape (n_features, n_samples)
        Measured values in the order of the panel's features.
    groups : mapping of str to ndarray of shape (n_samples,), object
        Columns by which accuracy is looked at in parts.
    openings : int
        How often rows set aside have been opened; 0 for other samples.
    """

    samples: NDArray[np.object_]
    subject_ids: NDArray[np.object_]
    subjects: NDArray[np.int64]
    outcome: NDArray[np.float64]
    values: NDArray[np.floating[Any]]
    groups: Mapping[str, NDArray[np.object_]]
    openings: int = 0


def refuse_overlap(panel: PanelContent, people: NewPeople) -> list[str]:
    """Refuse samples that taught the panel, by id and by values.

    Parameters
    ----------
    panel : PanelContent
        The panel.
    people : NewPeople
        Who is to judge it; outcomes are not looked at.

    Returns
    -------
    list of str
        What could not be looked at, in words.

    Raises
    ------
    InputDataError
        Samples or subjects of the training rows.
    """
    known = set(panel.training.ids)
    by_id = [
        str(name)
        for name, subject in zip(people.samples, people.subject_ids, strict=True)
        if id_hash(str(name)) in known or id_hash(str(subject)) in known
    ]
    if by_id:
        raise _overlap(by_id, "ids (of sample or subject)")
    if len(panel.features) < FEWEST_MARKERS:
        return [
            "Overlap with the training samples was looked for by id only: equal values "
            f"of fewer than {FEWEST_MARKERS} assays may be a coincidence."
        ]
    if people.values.shape[0] != len(panel.features):
        return []
    hashes = set(panel.training.values)
    by_value = [
        str(name)
        for name, row in zip(people.samples, people.values.T.tolist(), strict=True)
        if not np.isnan(row).all() and value_hash(row) in hashes
    ]
    if by_value:
        raise _overlap(by_value, "measured values")
    return []


def _overlap(names: Sequence[str], how: str) -> InputDataError:
    return InputDataError(
        code="training-overlap",
        where="sample sheet",
        what=f"{len(names)} samples have {how} of training samples: {name_some(names)}",
        accepted="people who did not teach the panel",
        next_step="Take them out: on them the panel looks better than it is",
    )


def refuse_other_plan(panel: PanelContent, plan: ValidationPlan | None) -> None:
    """Refuse a plan of another panel, or of a cut-off that it does not have.

    Raises
    ------
    PanelFileError
        The plan names another panel file.
    StudyFileError
        The plan names an unknown cut-off.
    """
    if plan is None:
        return
    if plan.panel != panel.content_sha256:
        raise PanelFileError(
            code="plan-of-another-panel",
            where="the plan, key 'panel'",
            what=f"it was written for another panel file (got {plan.panel!r})",
            accepted=f"the content hash of this one, {panel.content_sha256!r}",
            next_step="Validate the panel that the plan names",
        )
    names = [cut.name for cut in panel.cutoffs]
    needs = plan.primary != "auc"
    if needs and (not names or (plan.cutoff and plan.cutoff not in names)):
        raise StudyFileError(
            code="plan-cutoff-unknown",
            where="the plan, key 'cutoff'",
            what=f"the panel has no such cut-off (got {plan.cutoff!r})",
            accepted=f"one of {name_some(names)}" if names else "a panel with cut-offs",
            next_step="Correct the name",
        )


def validate_panel(
    panel: PanelContent,
    scores: Scores,
    people: NewPeople,
    scores_sha256: str,
    *,
    plan: tuple[ValidationPlan, str] | None = None,
    prevalence: float = float("nan"),
    against: tuple[PanelContent, Scores] | None = None,
    noticed: Sequence[str] = (),
) -> Validation:
    """Return what new people say of a panel.

    Parameters
    ----------
    panel : PanelContent
        The panel.
    scores : Scores
        Of the people, made before their outcomes were joined.
    people : NewPeople
        With outcomes.
    scores_sha256 : str
        Hash of the score file.
    plan : tuple of ValidationPlan and str, optional
        Written beforehand, and the hash of its file; without one the validation is
        exploratory.
    prevalence : float
        For predictive values and net benefit; NaN: the panel's own, if stated.
    against : tuple of PanelContent and Scores, optional
        Another panel on the same people.
    noticed : sequence of str
        Notes so far.

    Returns
    -------
    Validation
        Figures, shifts, verdict.

    Raises
    ------
    FitError
        One class only.
    """
    wanted = None if plan is None else plan[0]
    confidence = LOCK.confidence if wanted is None else wanted.confidence
    scored = ~np.isnan(scores.log_odds)
    if against is not None:
        scored &= ~np.isnan(against[1].log_odds)
    y, log_odds = people.outcome[scored], scores.log_odds[scored]
    subjects = people.subjects[scored]
    share = panel.prevalence if math.isnan(prevalence) else prevalence
    figures = [
        discrimination_figure(log_odds, y, subjects, confidence),
        *calibration_figures(log_odds, y, confidence),
        *_case_mix(panel, log_odds, y),
        *cutoff_figures(panel, scores, scored, y, share, confidence),
        *subgroup_figures(
            {name: column[scored] for name, column in people.groups.items()},
            log_odds,
            y,
            subjects,
            confidence,
        ),
    ]
    if against is not None:
        figures += pair_figures(
            (panel, log_odds),
            (against[0], against[1].log_odds[scored]),
            y,
            subjects,
            confidence,
        )
    shifts = marker_shifts(panel, scores, people.outcome, confidence)
    verdict, sentence = _verdict(panel, figures, wanted, y)
    moved = [each.shift for each in shifts if not math.isnan(each.shift)]
    platform_shift = float(np.median(moved)) if moved else float("nan")
    notes = [
        *noticed,
        *_notes(panel, scores, figures),
        *_mix_in_words(panel, figures, y, platform_shift),
    ]
    if len(np.unique(subjects)) < len(y):
        notes.append(
            "Some people gave several samples: the interval of the AUC counts each "
            "once, those of proportions and calibration do not and are too narrow."
        )
    return Validation(
        panel=panel.name,
        panel_sha256=panel.content_sha256,
        plan_sha256="" if plan is None else plan[1],
        scores_sha256=scores_sha256,
        verdict=verdict,
        sentence=sentence,
        samples=len(y),
        subjects=len(np.unique(subjects)),
        cases=int(y.sum()),
        controls=int((1.0 - y).sum()),
        left_out=int((~scored).sum()),
        figures=tuple(figures),
        shifts=tuple(shifts),
        platform_shift=platform_shift,
        notes=tuple(notes),
        openings=people.openings,
        research_use=RESEARCH_USE,
    )


def _case_mix(
    panel: PanelContent, log_odds: NDArray[np.float64], y: NDArray[np.float64]
) -> list[ValidationFigure]:
    """Return what differs between the people and those who taught the panel.

    References
    ----------
    Debray et al. 2015, J Clin Epidemiol 68:279 (mean and spread of the linear
    predictor tell samples of another mix).
    """
    training = panel.training
    nothing = float("nan")
    spread = float(log_odds.std())
    figures = {
        "prevalence-difference": float(y.mean()) - training.prevalence,
        "spread-ratio": spread / training.score_deviation
        if training.score_deviation > 0.0
        else nothing,
        "score-shift": float(log_odds.mean()) - training.score_mean,
    }
    return [
        ValidationFigure(
            name, "all", value, nothing, nothing, len(y), int(y.sum()), "",
            "new people against the training rows",
        )
        for name, value in figures.items()
    ]  # fmt: skip


def _mix_in_words(
    panel: PanelContent,
    figures: Sequence[ValidationFigure],
    y: NDArray[np.float64],
    platform_shift: float,
) -> list[str]:
    """Name what differs, however small: a reader has to see it beside the AUC."""
    known = {f.measure: f.value for f in figures if f.of == "all"}
    found = [
        f"Cases are {100 * float(y.mean()):.0f} % here and "
        f"{100 * panel.training.prevalence:.0f} % where the panel was learnt.",
    ]
    if not math.isnan(known["spread-ratio"]):
        found.append(
            f"Scores spread {known['spread-ratio']:.2f} times as wide as where the "
            "panel was learnt; a narrower mix of people lowers every AUC."
        )
    if not math.isnan(platform_shift):
        found.append(
            f"The median marker lies {platform_shift:+.2f} from where it was learnt, "
            "outcome held equal (prepared scale)."
        )
    return found


def _verdict(
    panel: PanelContent,
    figures: Sequence[ValidationFigure],
    plan: ValidationPlan | None,
    y: NDArray[np.float64],
) -> tuple[Verdict, str]:
    area = figures[0]
    shown = _interval(area)
    if plan is None:
        return (
            "exploratory",
            f"Exploratory, no plan was written: AUC {shown} on {len(y)} samples; "
            f"out of fold it was {panel.honest.metric:.3f}.",
        )
    of = "all"
    if plan.primary != "auc":
        of = plan.cutoff or panel.cutoffs[0].name
    primary = next(f for f in figures if f.measure == plan.primary and f.of == of)
    cases, controls = int(y.sum()), int((1.0 - y).sum())
    words = f"{plan.primary} {_interval(primary)}, at least {plan.at_least:g} was asked"
    if cases < plan.cases or controls < plan.controls:
        return (
            "inconclusive",
            f"Inconclusive: {cases} cases and {controls} controls, the plan asks for "
            f"{plan.cases} and {plan.controls}; {words}.",
        )
    if primary.low >= plan.at_least:
        return "pass", f"Pass: {words}."
    if primary.high < plan.at_least:
        return "fail", f"Fail: {words}."
    return "inconclusive", f"Inconclusive: {words}, inside the interval."


def _interval(figure: ValidationFigure) -> str:
    if math.isnan(figure.low):
        return f"{figure.value:.3f} (no interval)"
    return f"{figure.value:.3f} ({figure.low:.3f} to {figure.high:.3f})"


def _notes(
    panel: PanelContent, scores: Scores, figures: Sequence[ValidationFigure]
) -> list[str]:
    found = []
    area, honest = figures[0], panel.honest
    drop = honest.metric - area.value
    if drop > 0.0 and area.high < honest.metric:
        found.append(
            f"The AUC is {drop:.3f} below the out-of-fold figure, which its interval "
            "does not reach."
        )
    slope = next(f for f in figures if f.measure == "calibration-slope")
    if slope.high < 1.0:
        found.append(
            f"Calibration slope {slope.value:.2f}: chances are too extreme here."
        )
    large = next(f for f in figures if f.measure == "calibration-in-the-large")
    if not large.low <= 0.0 <= large.high and not math.isnan(large.low):
        found.append(
            f"Chances are too {'low' if large.value > 0 else 'high'} on average "
            f"(calibration in the large {large.value:+.2f} log-odds): "
            "see `panelkit recalibrate`."
        )
    flagged = sum("training-range" in flags for flags in scores.flags)
    if flagged:
        found.append(
            f"{flagged} of {len(scores.samples)} samples have a marker outside its "
            "training range."
        )
    return found
