"""Answers about the precision of sensitivity, specificity and area."""

import math

from panelkit.config import SIZING
from panelkit.records import SizingAnswer, SizingCurve, SizingSeries, SizingTable
from panelkit.sizing.demands import check_share
from panelkit.sizing.precision import (
    area_size_binormal,
    area_size_hanley_mcneil,
    area_size_normal_scores,
    area_width,
    buderer_size,
    normal_quantile,
    wilson_size,
    wilson_width,
)
from panelkit.sizing.words import SMALL_PRINT, figures, sizes_around, whole

__all__ = ["answer_accuracy", "answer_area"]


def answer_accuracy(
    sensitivity: float,
    specificity: float,
    half_width: float,
    prevalence: float,
    confidence: float = SIZING.confidence,
) -> SizingAnswer:
    """Return the cohort that measures sensitivity and specificity.

    Parameters
    ----------
    sensitivity, specificity : float
        Expected.
    half_width : float
        Wanted of both intervals.
    prevalence : float
        Share of cases in the cohort.
    confidence : float
        Two-sided.

    Returns
    -------
    SizingAnswer
        By Wilson's interval; the normal formula beside it with both roundings.

    Raises
    ------
    UsageError
        Values that no study can have.
    """
    check_share("sensitivity", sensitivity)
    check_share("specificity", specificity)
    check_share("prevalence", prevalence)
    z = normal_quantile(confidence)
    parts = (
        ("sensitivity", "cases", sensitivity, prevalence),
        ("specificity", "controls", specificity, round(1.0 - prevalence, 12)),
    )
    printed_z = 1.96 if confidence == SIZING.confidence else z
    wilson = [wilson_size(p, half_width, share, confidence) for _, _, p, share in parts]
    normal = [buderer_size(p, half_width, share, printed_z) for _, _, p, share in parts]
    people = max(each.cohort_early for each in wilson)
    decides = "sensitivity" if people == wilson[0].cohort_early else "specificity"
    sizes = sizes_around(people)
    widths = [
        [wilson_width(p, n * share, z) / 2.0 for n in sizes] for _, _, p, share in parts
    ]
    return SizingAnswer(
        question="How many people measure sensitivity and specificity well enough?",
        sentence=f"{whole(people)} people give {whole(wilson[0].people)} cases and at "
        f"least {whole(wilson[1].people)} controls; intervals of both figures are then "
        f"at most {figures(2 * half_width)} wide (Wilson). {decides.capitalize()} "
        f"decides. The normal formula of 1996 says "
        f"{whole(max(n.cohort_late for n in normal))} people, or "
        f"{whole(max(n.cohort_early for n in normal))} when cases are rounded up "
        "first.",
        figures={
            "people": people,
            "cases": wilson[0].people,
            "controls": wilson[1].people,
            "people_normal_rounded_late": max(n.cohort_late for n in normal),
            "people_normal_rounded_early": max(n.cohort_early for n in normal),
        },
        inputs={
            "sensitivity": sensitivity,
            "specificity": specificity,
            "half_width": half_width,
            "prevalence": prevalence,
            "confidence": confidence,
        },
        assumptions=(
            f"Intervals are two-sided at {figures(100 * confidence)} %.",
            "The figures come out as expected: with another sensitivity the interval "
            "is wider or narrower.",
            f"{figures(100 * prevalence)} % of the people turn out to be cases; by "
            "chance it may be fewer, so recruit until the cases are there.",
            "The normal formula takes z = "
            f"{figures(printed_z) if printed_z != 1.96 else '1.96'}; "
            "'rounded late' rounds the cohort up only, 'rounded early' rounds the "
            "class "
            "up first. The publication does not settle which, so both are shown.",
            "The cut-off is locked before; one sample a person.",
            *SMALL_PRINT,
        ),
        tables=(
            SizingTable(
                "demands",
                "what each figure needs",
                (
                    "figure", "class", "expected", "people_exact", "people_wilson",
                    "cohort_wilson", "people_normal_exact", "cohort_normal_late",
                    "cohort_normal_early",
                ),
                tuple(
                    (
                        name, people_of, p, w.exact, w.people, w.cohort_early,
                        n.exact, n.cohort_late, n.cohort_early,
                    )
                    for (name, people_of, p, _), w, n in zip(
                        parts, wilson, normal, strict=True
                    )
                ),
            ),
            SizingTable(
                "range",
                "half-width of the interval with other numbers of people",
                ("people", "half_width_sensitivity", "half_width_specificity"),
                tuple(zip(sizes, *widths, strict=True)),
            ),
        ),
        curve=SizingCurve(
            "precision",
            "Precision of sensitivity and specificity",
            f"Half-width of the {figures(100 * confidence)} % interval (Wilson) "
            "against people in the cohort; the dotted line is what was asked for.",
            "people in the cohort",
            "half-width of the interval",
            tuple(
                SizingSeries(name, tuple(map(float, sizes)), tuple(width))
                for (name, *_), width in zip(parts, widths, strict=True)
            ),
            half_width,
            ((f"{whole(people)} people", float(people)),),
        ),
        sources=(
            "Wilson 1927, J Am Stat Assoc 22:209",
            "Buderer 1996, Acad Emerg Med 3:895",
        ),
    )  # fmt: skip


def answer_area(
    area: float,
    width: float,
    controls_per_case: float = SIZING.controls_per_case,
    confidence: float = SIZING.confidence,
) -> SizingAnswer:
    """Return the cases and controls that measure an area under the ROC curve.

    Parameters
    ----------
    area : float
        Expected.
    width : float
        Full width wanted of its interval.
    controls_per_case : float
        Ratio of the classes.
    confidence : float
        Two-sided.

    Returns
    -------
    SizingAnswer
        By three variance formulas; the largest number is the answer.

    Raises
    ------
    UsageError
        Values that no study can have.
    """
    z = normal_quantile(confidence)
    one = area_size_hanley_mcneil(area, width, controls_per_case, confidence)
    exact, *two = area_size_binormal(area, width, controls_per_case, confidence)
    three = area_size_normal_scores(area, width, controls_per_case, confidence)
    cases, controls = max(one, (two[0], two[1]), three)
    sizes = sizes_around(cases + controls)
    counts = [max(2, math.floor(n / (1.0 + controls_per_case))) for n in sizes]
    widths = [area_width(area, n, controls_per_case, z) for n in counts]
    return SizingAnswer(
        question="How many people measure an area under the ROC curve well enough?",
        sentence=f"{whole(cases)} cases and {whole(controls)} controls, together "
        f"{whole(cases + controls)}, for an interval at most {figures(width)} wide. "
        f"Hanley and McNeil's variance asks for {whole(one[0])} cases, Obuchowski's "
        f"binormal variance for {whole(two[0])}, counting normal scores (what DeLong's "
        f"estimate is on average) for {whole(three[0])}; the largest is taken.",
        figures={
            "people": cases + controls,
            "cases": cases,
            "controls": controls,
            "cases_hanley_mcneil": one[0],
            "controls_hanley_mcneil": one[1],
            "cases_binormal": two[0],
            "controls_binormal": two[1],
            "cases_binormal_exact": exact,
            "cases_normal_scores": three[0],
            "controls_normal_scores": three[1],
        },
        inputs={
            "area": area,
            "width": width,
            "controls_per_case": controls_per_case,
            "confidence": confidence,
        },
        assumptions=(
            f"The interval is area plus or minus {figures(z)} standard errors.",
            "Hanley and McNeil's variance stands for scores with exponential tails. "
            "Obuchowski's is an approximation for normal scores and on the safe side; "
            "the third is exact for a counted area of normal scores with one variance "
            "in both classes.",
            "The panel is locked; one sample a person; the area is as expected.",
            *SMALL_PRINT,
        ),
        tables=(
            SizingTable(
                "demands",
                "what each variance needs",
                ("variance", "cases", "controls", "people"),
                (
                    ("Hanley-McNeil", one[0], one[1], sum(one)),
                    ("binormal (Obuchowski)", two[0], two[1], sum(two)),
                    ("normal scores (expected DeLong)", *three, sum(three)),
                ),
            ),
            SizingTable(
                "range",
                "width of the interval with other numbers of people",
                (
                    "people",
                    "cases",
                    "width_hanley_mcneil",
                    "width_binormal",
                    "width_normal_scores",
                ),
                tuple(
                    (n, count, *each)
                    for n, count, each in zip(sizes, counts, widths, strict=True)
                ),
            ),
        ),
        curve=SizingCurve(
            "area_width",
            "Precision of the area under the ROC curve",
            f"Width of the {figures(100 * confidence)} % interval against people, by "
            "three variances; the dotted line is what was asked for.",
            "cases and controls together",
            "width of the interval",
            tuple(
                SizingSeries(
                    name, tuple(map(float, sizes)), tuple(w[k] for w in widths)
                )
                for k, name in enumerate(("Hanley-McNeil", "binormal", "normal scores"))
            ),
            width,
            ((f"{whole(cases + controls)} people", float(cases + controls)),),
        ),
        sources=(
            "Hanley & McNeil 1982, Radiology 143:29",
            "Obuchowski 1994, J Clin Epidemiol 47:549",
            "Bamber 1975, J Math Psychol 12:387",
            "DeLong, DeLong & Clarke-Pearson 1988, Biometrics 44:837",
        ),
    )
