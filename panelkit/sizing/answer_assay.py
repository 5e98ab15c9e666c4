"""Answers about assays: limits, losses, replicates, bridging sets."""

import math
from collections.abc import Callable, Sequence

import numpy as np

from panelkit.config import SIZING
from panelkit.metrics import cv_from_log2_sd, log2_sd_from_cv
from panelkit.records import SizingAnswer, SizingCurve, SizingSeries, SizingTable
from panelkit.sizing.bridging import BridgingSize, bridging_size, widths_of
from panelkit.sizing.error_simulation import simulate_area
from panelkit.sizing.transfer import (
    AssayError,
    PanelModel,
    area_with_error,
    assay_limits,
    common_limit,
    locked_operating_point,
    refitted_area,
    replicates_needed,
)
from panelkit.sizing.words import SMALL_PRINT, figures, percent, sizes_around, whole

__all__ = ["answer_bridging", "answer_limits", "answer_loss", "answer_replicates"]

GRID = (0.0, 0.05, 0.1, 0.15, 0.2, 0.25, 0.3, 0.4, 0.5, 0.6, 0.8, 1.0)
SOURCES = (
    "Pepe 2003, The Statistical Evaluation of Medical Tests, section 4.4",
    "Spearman 1904, Am J Psychol 15:72",
)
REPLICATES = (1, 2, 3, 4, 6, 8)


def _panel_table(model: PanelModel) -> SizingTable:
    return SizingTable(
        "panel",
        "the panel as it enters the formulas (log2 scale)",
        ("marker", "weight", "difference", "sd_within_class"),
        tuple(
            (name, float(w), float(d), math.sqrt(float(v)))
            for name, w, d, v in zip(
                model.markers,
                model.weights,
                model.differences,
                np.diag(model.covariance),
                strict=True,
            )
        ),
    )


def _about(model: PanelModel, n_plates: int, origin: Sequence[str]) -> tuple[str, ...]:
    return (
        *origin,
        "Values are on the log2 scale and normal with one covariance in both classes; "
        "the weights stay as they are.",
        "CV means error beyond that of the discovery platform, which is in the data "
        "already; errors of different markers are independent and do not depend on the "
        "level.",
        f"Cases and controls are spread evenly over {whole(n_plates)} plates; a shift "
        "that a plate shares cancels between its own samples. If the classes sit on "
        "plates of their own, the limit is that of one_class_shift instead.",
    )


def answer_limits(
    model: PanelModel,
    loss: float,
    generator: np.random.Generator,
    origin: Sequence[str],
    n_plates: int = SIZING.plates,
    specificity: float = SIZING.cut_off_specificity,
    point_loss: float = SIZING.point_loss,
) -> SizingAnswer:
    """Return the assay requirement sheet of a panel.

    Parameters
    ----------
    model : PanelModel
        The panel, on the log2 scale.
    loss : float
        Of area that is accepted.
    generator : numpy.random.Generator
        For the simulation that the closed form is held against.
    origin : sequence of str
        Where the panel's numbers come from, in words.
    n_plates : int
        Over which samples are spread.
    specificity, point_loss : float
        Of the locked cut-off; loss there that a shift of everybody may cause.

    Returns
    -------
    SizingAnswer
        Largest CV, shift and least correlation of each marker.

    Raises
    ------
    UsageError
        A loss that the panel cannot have.
    """
    limits = assay_limits(model, loss, n_plates, specificity, point_loss)
    own, shared = common_limit(model, loss, n_plates)
    n = len(model.markers)
    checks = []
    for name, error in (
        ("independent", AssayError((own,) * n, (0.0,) * n, n_plates)),
        ("plate-shared", AssayError((0.0,) * n, (shared,) * n, n_plates)),
    ):
        spread = max((*error.within, *error.between))
        if math.isfinite(spread):
            seen = simulate_area(model, error, generator)
            checks.append(
                (
                    name, cv_from_log2_sd(spread), area_with_error(model, error),
                    seen.mean, seen.se, seen.low, seen.high,
                )
            )  # fmt: skip
    strictest = min(limits, key=lambda each: each.alone_cv)
    return SizingAnswer(
        question="What does the assay have to reach so that the panel loses no more?",
        sentence=f"The panel's area of {figures(model.area)} falls by "
        f"{figures(loss)} when every marker has an added CV of "
        f"{percent(cv_from_log2_sd(own))}, or plates shift every marker with a CV of "
        f"{percent(cv_from_log2_sd(shared))}. Strictest is {strictest.marker}: alone "
        f"it may have {percent(strictest.alone_cv)}.",
        figures={
            "area": model.area,
            "all_cv": _number(cv_from_log2_sd(own)),
            "all_plate_cv": _number(cv_from_log2_sd(shared)),
            "strictest": strictest.marker,
            "strictest_alone_cv": _number(strictest.alone_cv),
        },
        inputs={
            "loss": loss,
            "plates": n_plates,
            "specificity": specificity,
            "point_loss": point_loss,
        },
        assumptions=(
            *_about(model, n_plates, origin),
            "alone: this marker has the error, the others none. Correlations are with "
            "the discovery platform within a class, and hold for error of the new "
            "platform only.",
            "one_class_shift moves one class only and costs area; everybody_shift "
            "moves "
            f"all samples and costs at most {figures(100 * point_loss)} points of "
            f"sensitivity or specificity at the cut-off locked at specificity "
            f"{figures(specificity)}.",
            *SMALL_PRINT,
        ),
        tables=(
            SizingTable(
                "requirements",
                "largest added CV (fractions), shift (log2) and least correlation",
                (
                    "marker", "weight", "cv_all", "cv_alone", "plate_cv_alone",
                    "correlation_all", "correlation_alone", "one_class_shift",
                    "everybody_shift",
                ),
                tuple(
                    (
                        e.marker, e.weight, _number(cv_from_log2_sd(own)),
                        _number(e.alone_cv), _number(e.alone_plate_cv),
                        e.all_correlation, e.alone_correlation,
                        _number(e.one_class_shift), _number(e.everybody_shift),
                    )
                    for e in limits
                ),
            ),
            SizingTable(
                "simulation",
                "closed form and simulation at the common limit",
                (
                    "error", "cv", "area_closed_form", "area_simulated", "se",
                    "study_5_percent", "study_95_percent",
                ),
                tuple(checks),
            ),
            _panel_table(model),
        ),
        curve=_loss_curve(model, n_plates, model.area - loss, generator),
        sources=SOURCES,
    )  # fmt: skip


def _number(value: float) -> float | None:
    """Return a number, or None where there is no limit."""
    return value if math.isfinite(value) else None


def _loss_curve(
    model: PanelModel,
    n_plates: int,
    target: float | None,
    generator: np.random.Generator,
) -> SizingCurve:
    n = len(model.markers)
    kinds: dict[str, Callable[[float], AssayError]] = {
        "independent": lambda cv: AssayError.of_cv(n, cv, 0.0, n_plates),
        "plate-shared": lambda cv: AssayError.of_cv(n, 0.0, cv, n_plates),
    }
    lines = [
        SizingSeries(
            f"{name} error",
            tuple(100.0 * cv for cv in GRID),
            tuple(area_with_error(model, error(cv)) for cv in GRID),
        )
        for name, error in kinds.items()
    ]
    some = GRID[2::3]
    seen = [
        simulate_area(model, kinds["independent"](cv), generator, 50) for cv in some
    ]
    lines.append(
        SizingSeries(
            "simulated (independent)",
            tuple(100.0 * cv for cv in some),
            tuple(each.mean for each in seen),
            tuple(each.mean - 2.0 * each.se for each in seen),
            tuple(each.mean + 2.0 * each.se for each in seen),
            points_only=True,
        )
    )
    return SizingCurve(
        "added_error",
        "What added error costs",
        "Area under the ROC curve against an added CV that every marker has; lines are "
        "closed forms, points simulations with two standard errors.",
        "added CV of every marker (%)",
        "area under the ROC curve",
        tuple(lines),
        target,
    )


def answer_loss(
    model: PanelModel,
    within: float,
    between: float,
    replicates: int,
    generator: np.random.Generator,
    origin: Sequence[str],
    n_plates: int = SIZING.plates,
    specificity: float = SIZING.cut_off_specificity,
) -> SizingAnswer:
    """Return what a stated error costs a panel.

    Parameters
    ----------
    model : PanelModel
        The panel, on the log2 scale.
    within, between : float
        Added CV of every marker, as fractions.
    replicates : int
        Averaged on the log scale.
    generator : numpy.random.Generator
        For the simulation.
    origin : sequence of str
        Where the panel's numbers come from, in words.
    n_plates : int
        Over which samples are spread.
    specificity : float
        At the locked cut-off.

    Returns
    -------
    SizingAnswer
        Loss of area, in closed form and simulated; with weights learnt anew.

    Raises
    ------
    UsageError
        Errors that no assay can have.
    """
    n = len(model.markers)
    error = AssayError.of_cv(n, within, between, n_plates, replicates)
    area = area_with_error(model, error)
    seen = simulate_area(model, error, generator)
    both = [math.hypot(a, b) for a, b in zip(error.within, error.between, strict=True)]
    again = refitted_area(model, both)
    added = float(model.weights**2 @ np.square(both))
    before = locked_operating_point(model, specificity, 0.0, 0.0)
    after = locked_operating_point(model, specificity, added, 0.0)
    rows = []
    for j, marker in enumerate(model.markers):
        alone = AssayError(
            tuple(s if k == j else 0.0 for k, s in enumerate(error.within)),
            tuple(s if k == j else 0.0 for k, s in enumerate(error.between)),
            n_plates,
        )
        variance = float(model.covariance[j, j])
        rows.append(
            (
                marker,
                model.area - area_with_error(model, alone),
                variance / (variance + both[j] ** 2),
            )
        )
    return SizingAnswer(
        question="What does this error cost the panel?",
        sentence=f"The area falls from {figures(model.area)} to {figures(area)}, a "
        "loss "
        f"of {figures(model.area - area)} (simulated {figures(seen.mean)}, standard "
        f"error {figures(seen.se)}). At the cut-off locked at specificity "
        f"{figures(specificity)}, sensitivity goes from {figures(before[0])} to "
        f"{figures(after[0])} and specificity to {figures(after[1])}.",
        figures={
            "area_before": model.area,
            "area": area,
            "loss": model.area - area,
            "area_simulated": seen.mean,
            "area_simulated_se": seen.se,
            "area_refitted": again,
            "sensitivity_before": before[0],
            "sensitivity": after[0],
            "specificity": after[1],
        },
        inputs={
            "cv_within": within,
            "cv_between": between,
            "replicates": replicates,
            "plates": n_plates,
            "specificity": specificity,
        },
        assumptions=(
            *_about(model, n_plates, origin),
            "Replicates shrink the part within a run only.",
            "area_refitted is the best linear score on the new platform, for weights "
            "learnt anew from many people.",
            *SMALL_PRINT,
        ),
        tables=(
            SizingTable(
                "markers",
                "loss when one marker alone has this error, and its reliability",
                ("marker", "loss_alone", "reliability"),
                tuple(rows),
            ),
            _panel_table(model),
        ),
        curve=_loss_curve(model, n_plates, area, generator),
        sources=SOURCES,
    )


def answer_replicates(
    model: PanelModel,
    loss: float,
    within: float,
    between: float,
    origin: Sequence[str],
    n_plates: int = SIZING.plates,
) -> SizingAnswer:
    """Return how many replicates keep a loss.

    Parameters
    ----------
    model : PanelModel
        The panel, on the log2 scale.
    loss : float
        Of area that is accepted.
    within, between : float
        Added CV of every marker, as fractions.
    origin : sequence of str
        Where the panel's numbers come from, in words.
    n_plates : int
        Over which samples are spread.

    Returns
    -------
    SizingAnswer
        The smallest number, or why none does.

    Raises
    ------
    UsageError
        A loss that the panel cannot have.
    """
    needed = replicates_needed(model, loss, within, between, n_plates)
    n = len(model.markers)
    counts = sorted({*REPLICATES, *((needed,) if needed else ())})
    areas = [
        area_with_error(model, AssayError.of_cv(n, within, between, n_plates, r))
        for r in counts
    ]
    if needed is None:
        floor = area_with_error(model, AssayError.of_cv(n, 0.0, between, n_plates))
        sentence = (
            f"No number of replicates keeps the loss within {figures(loss)}: the error "
            f"between plates alone leaves an area of {figures(floor)} of "
            f"{figures(model.area)}. Lower that error, or calibrate plates."
        )
    else:
        sentence = (
            f"{whole(needed)} replicate{'s' if needed > 1 else ''} of every marker keep"
            f"{'' if needed > 1 else 's'} the area at "
            f"{figures(areas[counts.index(needed)])} or more, of "
            f"{figures(model.area)} without error."
        )
    return SizingAnswer(
        question="How many replicates does the assay need?",
        sentence=sentence,
        figures={"replicates": needed, "area_before": model.area},
        inputs={
            "loss": loss,
            "cv_within": within,
            "cv_between": between,
            "plates": n_plates,
        },
        assumptions=(
            *_about(model, n_plates, origin),
            "Replicates are averaged on the log scale and shrink the part within a run "
            "only.",
            *SMALL_PRINT,
        ),
        tables=(
            SizingTable(
                "range",
                "area by number of replicates",
                ("replicates", "area", "loss"),
                tuple(
                    (r, a, model.area - a) for r, a in zip(counts, areas, strict=True)
                ),
            ),
            _panel_table(model),
        ),
        curve=SizingCurve(
            "replicates",
            "What replicates bring",
            "Area under the ROC curve against replicates of every marker; the dotted "
            "line is the area that was asked for.",
            "replicates",
            "area under the ROC curve",
            (SizingSeries("panel", tuple(map(float, counts)), tuple(areas)),),
            model.area - loss,
            ((f"{needed} replicates", float(needed)),) if needed else (),
        ),
        sources=SOURCES,
    )


def answer_bridging(
    cv: float,
    other_cv: float,
    shift: float,
    correlation: float,
    confidence: float = SIZING.confidence,
) -> SizingAnswer:
    """Return how many samples to measure on both platforms.

    Parameters
    ----------
    cv, other_cv : float
        Of the two platforms, as fractions.
    shift : float
        Half-width wanted of the interval of the mean difference, log2.
    correlation : float
        Expected, of the two platforms over these samples.
    confidence : float
        Two-sided.

    Returns
    -------
    SizingAnswer
        Mean difference, correlation, limits of agreement; the largest decides.

    Raises
    ------
    UsageError
        Values that no study can have.
    """
    sd = math.hypot(log2_sd_from_cv(cv), log2_sd_from_cv(other_cv))
    size = bridging_size(sd, shift, correlation, confidence=confidence)
    rows = _bridging_rows(size)
    sizes = sizes_around(size.samples)
    widths = [widths_of(n, sd, correlation, confidence) for n in sizes]
    wanted = (shift, SIZING.concordance_width, SIZING.limits_width)
    return SizingAnswer(
        question="How many samples have to be measured on both platforms?",
        sentence=f"{whole(size.samples)} samples; the "
        f"{max(rows, key=lambda row: row[1])[0]} decides. For the mean difference "
        f"alone {whole(size.shift)} would do.",
        figures={
            "samples": size.samples,
            **{f"samples_{name.replace(' ', '_')}": n for name, n in rows},
            "difference_sd": sd,
        },
        inputs={
            "cv": cv,
            "other_cv": other_cv,
            "shift": shift,
            "correlation": correlation,
            "correlation_width": SIZING.concordance_width,
            "limits_width": SIZING.limits_width,
            "confidence": confidence,
        },
        assumptions=(
            f"Wanted at {figures(100 * confidence)} %: mean difference within "
            f"{figures(shift)} (log2, half-width), correlation within a full width of "
            f"{SIZING.concordance_width:g}, limits of agreement within "
            f"{SIZING.limits_width:g} SD of the differences (half-width).",
            "The two readings of a sample differ by the errors of both platforms only, "
            "which do not depend on the level: a difference that does needs more "
            "samples "
            "at the ends of the range.",
            "The numbers hold for one marker; measure every marker of the panel on the "
            "same samples.",
            "Samples span the range of every marker in both classes (panelkit bridge "
            "choose), are randomised over plates on both platforms, and were not used "
            "to choose the panel where that can be helped.",
            *SMALL_PRINT,
        ),
        tables=(
            SizingTable(
                "demands", "what each demand needs", ("demand", "samples"), rows
            ),
            SizingTable(
                "range",
                "precision with other numbers of samples",
                ("samples", "half_width_shift", "width_correlation",
                 "half_width_limits_in_sd"),
                tuple((n, *w) for n, w in zip(sizes, widths, strict=True)),
            ),
        ),
        curve=SizingCurve(
            "bridging",
            "Precision of a bridging set",
            "Widths of the intervals against samples measured on both platforms, each "
            "as a share of the width wanted; below the dotted line all demands are "
            "met.",
            "samples on both platforms",
            "width / width wanted",
            tuple(
                SizingSeries(
                    name,
                    tuple(map(float, sizes)),
                    tuple(w[k] / wanted[k] for w in widths),
                )
                for k, (name, _) in enumerate(rows)
            ),
            1.0,
            ((f"{whole(size.samples)} samples", float(size.samples)),),
        ),
        sources=(
            "Bland & Altman 1999, Stat Methods Med Res 8:135",
            "Bonett & Wright 2000, Psychometrika 65:23",
        ),
    )  # fmt: skip


def _bridging_rows(size: BridgingSize) -> tuple[tuple[str, int], ...]:
    return (
        ("mean difference", size.shift),
        ("correlation", size.concordance),
        ("limits of agreement", size.limits),
    )
