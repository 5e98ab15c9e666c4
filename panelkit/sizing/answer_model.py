"""Answers about developing a model, validating it, and comparing two panels."""

import math
from itertools import zip_longest

from panelkit.config import SIZING
from panelkit.records import SizingAnswer, SizingCurve, SizingSeries, SizingTable
from panelkit.sizing.development import (
    DevelopmentSize,
    develop_binary,
    develop_survival,
    largest_cox_snell,
)
from panelkit.sizing.external import (
    area_se_newcombe,
    people_for_area,
    people_for_benefit,
    people_for_ratio,
    people_for_slope,
    sensitivity_at,
    slope_information_of_area,
    validate_continuous,
)
from panelkit.sizing.paired import (
    cases_for_areas,
    exact_mcnemar_power,
    mcnemar_power,
    pairs_for_mcnemar,
)
from panelkit.sizing.words import (
    SMALL_PRINT,
    figures,
    largest_of,
    sizes_around,
    whole,
)

__all__ = [
    "answer_compare_areas",
    "answer_compare_shares",
    "answer_develop",
    "answer_develop_survival",
    "answer_validate",
    "answer_validate_number",
]

WIDE = (
    "Every feature that was ever looked at is a candidate parameter: a search through "
    "thousands of features fails these criteria by design, whatever its size. They "
    "judge the fit of a few markers named beforehand; a search is judged by its nested "
    "accuracy and its learning curve instead (panelkit size learning RUN)."
)
PARAMETERS = (1, 2, 3, 5, 8, 10, 15, 20, 25, 30, 50, 100)
MOST_EXACT = 600  # people up to which the exact power is summed


def _development_rows(found: DevelopmentSize) -> list[tuple[str, float]]:
    return [
        ("overall risk", found.overall_risk),
        ("prediction error", found.prediction_error),
        ("shrinkage", found.shrinkage),
        ("optimism of R2", found.optimism),
    ]


def answer_develop(
    prevalence: float, parameters: int, cox_snell: float
) -> SizingAnswer:
    """Return the people for developing a model of a binary outcome.

    Parameters
    ----------
    prevalence : float
        Share with the outcome.
    parameters : int
        Candidate parameters.
    cox_snell : float
        Expected Cox-Snell R2.

    Returns
    -------
    SizingAnswer
        Four criteria; the largest decides.

    Raises
    ------
    UsageError
        Values that no study can have.
    """
    found = develop_binary(prevalence, parameters, cox_snell)
    rows = _development_rows(found)
    many = sorted({*PARAMETERS, parameters})
    others = [develop_binary(prevalence, p, cox_snell) for p in many]
    inputs = {
        "prevalence": prevalence,
        "parameters": parameters,
        "cox_snell": cox_snell,
        "largest_cox_snell": largest_cox_snell(prevalence),
        "shrinkage": SIZING.shrinkage,
        "optimism": SIZING.optimism,
        "risk_margin": SIZING.risk_margin,
        "prediction_error": SIZING.prediction_error,
    }
    assumptions = (
        WIDE,
        f"Wanted: shrinkage at least {SIZING.shrinkage:g}, optimism of Nagelkerke's R2 "
        f"at most {SIZING.optimism:g}, overall risk within {SIZING.risk_margin:g}, "
        "mean "
        f"absolute prediction error at most {SIZING.prediction_error:g}.",
        "The criterion of the prediction error comes from simulations with up to 30 "
        "parameters"
        + (": beyond its range here." if parameters > 30 else ".")
        + f" Without it {whole(found.people_three)} people would do.",
        *SMALL_PRINT,
    )
    return _developed(found, rows, many, others, inputs, assumptions)


def answer_develop_survival(
    rate: float, follow_up: float, parameters: int, cox_snell: float
) -> SizingAnswer:
    """Return the people for developing a model of a time to an event.

    Parameters
    ----------
    rate, follow_up : float
        Events per person and unit of time; mean follow-up.
    parameters : int
        Candidate parameters.
    cox_snell : float
        Expected Cox-Snell R2.

    Returns
    -------
    SizingAnswer
        Two criteria; the larger decides.

    Raises
    ------
    UsageError
        Values that no study can have.
    """
    found = develop_survival(rate, follow_up, parameters, cox_snell)
    rows = _development_rows(found)[2:]
    many = sorted({*PARAMETERS, parameters})
    others = [develop_survival(rate, follow_up, p, cox_snell) for p in many]
    inputs = {
        "rate": rate,
        "follow_up": follow_up,
        "parameters": parameters,
        "cox_snell": cox_snell,
        "shrinkage": SIZING.shrinkage,
        "optimism": SIZING.optimism,
    }
    assumptions = (
        WIDE,
        f"Wanted: shrinkage at least {SIZING.shrinkage:g}, optimism of Nagelkerke's R2 "
        f"at most {SIZING.optimism:g}; the null model has a constant rate.",
        *SMALL_PRINT,
    )
    return _developed(found, rows, many, others, inputs, assumptions)


def _developed(
    found: DevelopmentSize,
    rows: list[tuple[str, float]],
    many: list[int],
    others: list[DevelopmentSize],
    inputs: dict[str, float],
    assumptions: tuple[str, ...],
) -> SizingAnswer:
    parameters = int(inputs["parameters"])
    return SizingAnswer(
        question="How many people does developing a model take?",
        sentence=f"{whole(found.people)} people with about "
        f"{whole(found.events)} events ({figures(found.events_per_parameter)} for each "
        f"of {whole(parameters)} candidate parameters); the criterion of "
        f"{largest_of(rows)} decides. A search through thousands of features fails "
        "these criteria by design: look at its learning curve instead.",
        figures={
            "people": found.people,
            "events": found.events,
            "events_per_parameter": found.events_per_parameter,
            "people_without_prediction_error": found.people_three,
            **{f"exact_{name.replace(' ', '_')}": value for name, value in rows},
        },
        inputs=inputs,
        assumptions=assumptions,
        tables=(
            SizingTable(
                "demands",
                "what each criterion needs",
                ("criterion", "people_exact", "people"),
                tuple((name, v, math.ceil(v - 1e-9)) for name, v in rows),
            ),
            SizingTable(
                "range",
                "people by number of candidate parameters",
                ("parameters", "people", "events_per_parameter"),
                tuple(
                    (p, each.people, each.events_per_parameter)
                    for p, each in zip(many, others, strict=True)
                ),
            ),
        ),
        curve=SizingCurve(
            "development",
            "People by number of candidate parameters",
            "People that the criteria of Riley et al. ask for; each feature that a "
            "search looks at counts as a parameter.",
            "candidate parameters",
            "people",
            (
                SizingSeries(
                    "largest criterion",
                    tuple(map(float, many)),
                    tuple(float(each.people) for each in others),
                ),
            ),
            None,
            ((f"{whole(found.people)} people", float(parameters)),),
            logarithmic=True,
        ),
        sources=(
            "Riley et al. 2020, BMJ 368:m441",
            "Riley et al. 2019, Stat Med 38:1276",
            "van Smeden et al. 2019, Stat Methods Med Res 28:2455",
        ),
    )


def answer_validate(
    prevalence: float,
    area: float,
    threshold: float | None = None,
    slope_width: float = SIZING.slope_width,
) -> SizingAnswer:
    """Return the people for validating a locked model of a binary outcome.

    Parameters
    ----------
    prevalence, area : float
        Expected in the new cohort.
    threshold : float or None
        Probability at which someone is treated; None takes the prevalence.
    slope_width : float
        Full width wanted of the calibration slope's interval.

    Returns
    -------
    SizingAnswer
        Observed over expected, area, slope, net benefit; the largest decides.

    Raises
    ------
    UsageError
        Values that no study can have.
    """
    information = slope_information_of_area(area, prevalence)
    cut = prevalence if threshold is None else threshold
    slope = people_for_slope(information, slope_width)
    ratio = people_for_ratio(prevalence)
    by_area = people_for_area(area, prevalence)
    sensitivity, specificity = sensitivity_at(area, prevalence, _share(cut))
    benefit = people_for_benefit(sensitivity, specificity, prevalence, cut)
    rows = [
        ("observed over expected", ratio, SIZING.ratio_width),
        ("area", float(by_area), SIZING.area_width),
        ("calibration slope", slope, slope_width),
        ("net benefit", benefit, SIZING.benefit_width),
    ]
    demands = [(name, value) for name, value, _ in rows]
    people = max(math.ceil(value - 1e-9) for _, value in demands)
    sizes = sizes_around(people)
    half = math.asinh(SIZING.ratio_width / 2.0)
    columns = [
        [2.0 * math.sinh(half * math.sqrt(ratio / n)) for n in sizes],
        [3.92 * area_se_newcombe(area, n, prevalence) for n in sizes],
        [slope_width * math.sqrt(slope / n) for n in sizes],
        [SIZING.benefit_width * math.sqrt(benefit / n) for n in sizes],
    ]  # fmt: skip
    return SizingAnswer(
        question="How many people does validating a locked model take?",
        sentence=f"{whole(people)} people with about {whole(people * prevalence)} "
        f"events; the {largest_of(demands)} decides. The area alone would need "
        f"{whole(by_area)}.",
        figures={
            "people": people,
            "events": people * prevalence,
            **{f"exact_{n.replace(' ', '_')}": v for n, v in demands},
            "sensitivity_at_threshold": sensitivity,
            "specificity_at_threshold": specificity,
        },
        inputs={
            "prevalence": prevalence,
            "area": area,
            "threshold": cut,
            **{f"width_{n.replace(' ', '_')}": w for n, _, w in rows},
        },
        assumptions=(
            "Full widths wanted of the 95 % intervals: "
            + ", ".join(f"{name} {figures(w)}" for name, _, w in rows)
            + ".",
            "The model is well calibrated in the new cohort and its linear predictor "
            "normal with one variance in both classes; another spread of predictions "
            "changes the slope's number most.",
            f"Net benefit at a threshold probability of {figures(cut)}, where the "
            "model "
            f"would have sensitivity {figures(sensitivity)} and specificity "
            f"{figures(specificity)}.",
            "The panel is locked before, and no outcome of these people was seen.",
            *SMALL_PRINT,
        ),
        tables=(
            SizingTable(
                "demands",
                "what each criterion needs",
                ("criterion", "full_width", "people_exact", "people"),
                tuple((n, w, v, math.ceil(v - 1e-9)) for n, v, w in rows),
            ),
            SizingTable(
                "range",
                "full widths with other numbers of people",
                ("people", *(f"width_{n.replace(' ', '_')}" for n, *_ in rows)),
                tuple(zip(sizes, *columns, strict=True)),
            ),
        ),
        curve=SizingCurve(
            "validation",
            "Precision of a validation",
            "Full widths of the 95 % intervals against people, each as a share of the "
            "width that was asked for; below the dotted line all demands are met.",
            "people in the validation cohort",
            "width / width wanted",
            tuple(
                SizingSeries(
                    name, tuple(map(float, sizes)), tuple(v / w for v in column)
                )
                for (name, _, w), column in zip(rows, columns, strict=True)
            ),
            1.0,
            ((f"{whole(people)} people", float(people)),),
        ),
        sources=(
            "Riley et al. 2021, Stat Med 40:4230",
            "Newcombe 2006, Stat Med 25:559",
            "Marsh, Janes & Pepe 2020, Stat Med 39:2980",
        ),
    )


def _share(value: float) -> float:
    """Return a share that a logit can take; what is no share is refused later."""
    return value if 0.0 < value < 1.0 else 0.5


def answer_validate_number(r_squared: float) -> SizingAnswer:
    """Return the people for validating a locked model of a number.

    Parameters
    ----------
    r_squared : float
        Expected share of variance that is explained.

    Returns
    -------
    SizingAnswer
        R2 and calibration slope; the larger decides.

    Raises
    ------
    UsageError
        Not a share.
    """
    found = validate_continuous(r_squared)
    sizes = sizes_around(found.people)
    one = [SIZING.r_squared_width * math.sqrt(found.r_squared / n) for n in sizes]
    two = [
        SIZING.slope_width * math.sqrt((found.slope - 1.0) / (n - 1.0)) for n in sizes
    ]
    demands = [("R2", found.r_squared), ("calibration slope", found.slope)]
    return SizingAnswer(
        question="How many people does validating a locked model of a number take?",
        sentence=f"{whole(found.people)} people; the {largest_of(demands)} decides.",
        figures={
            "people": found.people,
            "exact_r_squared": found.r_squared,
            "exact_calibration_slope": found.slope,
        },
        inputs={
            "r_squared": r_squared,
            "width_r_squared": SIZING.r_squared_width,
            "width_calibration_slope": SIZING.slope_width,
        },
        assumptions=(
            f"Full widths wanted of the 95 % intervals: R2 {SIZING.r_squared_width:g}, "
            f"calibration slope {SIZING.slope_width:g}.",
            "The model is well calibrated; residuals have one variance.",
            *SMALL_PRINT,
        ),
        tables=(
            SizingTable(
                "demands",
                "what each criterion needs",
                ("criterion", "people_exact", "people"),
                tuple((n, v, math.ceil(v - 1e-9)) for n, v in demands),
            ),
            SizingTable(
                "range",
                "full widths with other numbers of people",
                ("people", "width_r_squared", "width_calibration_slope"),
                tuple(zip(sizes, one, two, strict=True)),
            ),
        ),
        curve=SizingCurve(
            "validation",
            "Precision of a validation",
            "Full widths of the 95 % intervals, each as a share of the width wanted.",
            "people in the validation cohort",
            "width / width wanted",
            (
                SizingSeries(
                    "R2",
                    tuple(map(float, sizes)),
                    tuple(v / SIZING.r_squared_width for v in one),
                ),
                SizingSeries(
                    "calibration slope",
                    tuple(map(float, sizes)),
                    tuple(v / SIZING.slope_width for v in two),
                ),
            ),
            1.0,
            ((f"{whole(found.people)} people", float(found.people)),),
        ),
        sources=("Archer et al. 2021, Stat Med 40:133",),
    )  # fmt: skip


def answer_compare_areas(
    area: float,
    other_area: float,
    correlation: float,
    controls_per_case: float = SIZING.controls_per_case,
    power: float = SIZING.power,
    significance: float = SIZING.significance,
) -> SizingAnswer:
    """Return the people for telling the areas of two panels apart.

    Parameters
    ----------
    area, other_area, correlation, controls_per_case, power, significance
        As for `cases_for_areas`.

    Returns
    -------
    SizingAnswer
        Cases and controls, and what other correlations would mean.

    Raises
    ------
    UsageError
        Values that no two panels can have.
    """
    rest = (controls_per_case, power, significance)
    exact = cases_for_areas(area, other_area, correlation, *rest)
    cases = math.ceil(exact - 1e-9)
    controls = math.ceil(controls_per_case * cases - 1e-9)
    grid = sorted({0.0, 0.2, 0.4, 0.5, 0.6, 0.7, 0.8, 0.9, 0.95, correlation})
    needed = [
        math.ceil(cases_for_areas(area, other_area, r, *rest) - 1e-9) for r in grid
    ]
    totals = [n + math.ceil(controls_per_case * n - 1e-9) for n in needed]
    return SizingAnswer(
        question="How many people tell the areas of two panels apart?",
        sentence=f"{whole(cases)} cases and {whole(controls)} controls, together "
        f"{whole(cases + controls)}, each measured with both panels, to find "
        f"{figures(area)} against {figures(other_area)} with power "
        f"{figures(100 * power)} % at a two-sided level of {figures(significance)}.",
        figures={
            "people": cases + controls,
            "cases": cases,
            "controls": controls,
            "cases_exact": exact,
        },
        inputs={
            "area": area,
            "other_area": other_area,
            "correlation": correlation,
            "controls_per_case": controls_per_case,
            "power": power,
            "significance": significance,
        },
        assumptions=(
            "Both panels are locked and read on the same people.",
            f"The two estimated areas correlate by {figures(correlation)}; panels that "
            "share markers correlate more. The answer hangs on it: see the table.",
            "Scores are normal with one variance in both classes (binormal variance).",
            *SMALL_PRINT,
        ),
        tables=(
            SizingTable(
                "range",
                "people by correlation of the two areas",
                ("correlation", "cases", "people"),
                tuple(zip(grid, needed, totals, strict=True)),
            ),
        ),
        curve=SizingCurve(
            "compare_areas",
            "People by correlation of the two areas",
            "People for telling the areas apart; the more alike the panels rank "
            "people, "
            "the fewer are needed.",
            "correlation of the two areas",
            "cases and controls together",
            (SizingSeries("both panels", tuple(grid), tuple(map(float, totals))),),
            None,
            ((f"{whole(cases + controls)} people", correlation),),
        ),
        sources=(
            "Obuchowski & McClish 1997, Stat Med 16:1529",
            "Obuchowski 1994, J Clin Epidemiol 47:549",
        ),
    )


def answer_compare_shares(
    discordant: float,
    difference: float,
    power: float = SIZING.power,
    significance: float = SIZING.significance,
) -> SizingAnswer:
    """Return the people for telling the sensitivities of two panels apart.

    Parameters
    ----------
    discordant, difference, power, significance
        As for `pairs_for_mcnemar`.

    Returns
    -------
    SizingAnswer
        By the asymptotic formula, and for the exact test.

    Raises
    ------
    UsageError
        Values that no two panels can have.
    """
    needed = pairs_for_mcnemar(discordant, difference, power, significance)
    formula = math.ceil(needed - 1e-9)
    exact = _exact_pairs(formula, discordant, difference, power, significance)
    people = exact or formula
    sizes = sizes_around(people)
    by_formula = [mcnemar_power(n, discordant, difference, significance) for n in sizes]
    summed = [n for n in sizes if n <= MOST_EXACT]
    powers = [
        exact_mcnemar_power(n, discordant, difference, significance) for n in summed
    ]
    lines = [SizingSeries("formula", tuple(map(float, sizes)), tuple(by_formula))]
    if summed:
        lines.append(
            SizingSeries("exact test", tuple(map(float, summed)), tuple(powers))
        )
    said = (
        f"{whole(exact)} people for McNemar's exact test; the asymptotic formula says "
        f"{whole(formula)}."
        if exact
        else f"{whole(formula)} people by the asymptotic formula (too many to sum the "
        "exact test)."
    )
    return SizingAnswer(
        question="How many people tell two paired shares apart?",
        sentence=f"{said} Count cases for sensitivities, controls for specificities.",
        figures={
            "people": people,
            "people_formula": formula,
            "people_formula_exact": needed,
            "people_exact_test": exact,
        },
        inputs={
            "discordant": discordant,
            "difference": difference,
            "power": power,
            "significance": significance,
        },
        assumptions=(
            f"The panels disagree on {figures(100 * discordant)} % of these people, "
            "and "
            f"one is right {figures(100 * abs(difference))} points more often.",
            f"Power {figures(100 * power)} % at a two-sided level of "
            f"{figures(significance)}; power of the exact test has small dips, the "
            "number given keeps the power from there on for the next 20 people.",
            "Both cut-offs are locked before.",
            *SMALL_PRINT,
        ),
        tables=(
            SizingTable(
                "range",
                "power with other numbers of people",
                ("people", "power_formula", "power_exact"),
                tuple(zip_longest(sizes, by_formula, powers)),
            ),
        ),
        curve=SizingCurve(
            "compare_shares",
            "Power of McNemar's test",
            "Power against people on whom both panels are read; the dotted line is the "
            "power that was asked for.",
            "people of the class",
            "power",
            tuple(lines),
            power,
            ((f"{whole(people)} people", float(people)),),
        ),
        sources=(
            "Connor 1987, Biometrics 43:207",
            "McNemar 1947, Psychometrika 12:153",
        ),
    )  # fmt: skip


def _exact_pairs(
    start: int, discordant: float, difference: float, power: float, level: float
) -> int | None:
    """Return the people from which the exact test keeps its power for a while."""
    kept, first, n = 0, start, max(4, int(0.9 * start))
    while n <= MOST_EXACT:
        if exact_mcnemar_power(n, discordant, difference, level) >= power:
            first = n if not kept else first
            kept += 1
            if kept > 20:
                return first
        else:
            kept = 0
        n += 1
    return None
