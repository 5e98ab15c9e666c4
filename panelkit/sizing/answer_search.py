"""Answers about searching: the learning curve, and what a shortlist can find."""

import math
from collections.abc import Sequence

from panelkit.config import SIZING
from panelkit.records import (
    LearningPoint,
    SizingAnswer,
    SizingCurve,
    SizingSeries,
    SizingTable,
)
from panelkit.sizing.demands import check_between
from panelkit.sizing.detection import Detection
from panelkit.sizing.learning import LearningFit
from panelkit.sizing.words import SMALL_PRINT, figures, whole

__all__ = ["answer_detection", "answer_learning"]

BEYOND = (1.25, 1.5, 2.0, 3.0, 4.0)


def answer_learning(
    points: Sequence[LearningPoint], fit: LearningFit, target: float | None
) -> SizingAnswer:
    """Return what more people would bring, by the learning curve of a run.

    Parameters
    ----------
    points : sequence of LearningPoint
        The nested metric with fewer people.
    fit : LearningFit
        The curve through them.
    target : float or None
        Metric that is wanted; None asks for what twice the people bring.

    Returns
    -------
    SizingAnswer
        Extrapolation with the interval of redrawn curves.

    Raises
    ------
    UsageError
        A target that no metric can have.
    """
    most = max(p.n_subjects for p in points)
    now = fit.metric(most)
    twice = fit.metric(2.0 * most)
    low, high = fit.interval(2.0 * most)
    sentence = (
        f"With twice the {whole(most)} training people the nested metric would go from "
        f"{figures(now)} to {figures(twice)} ({figures(low)} to {figures(high)})."
    )
    people = math.nan
    marked: tuple[tuple[str, float], ...] = (("measured so far", most),)
    if target is not None:
        check_between("target of the metric", target, 0.0, 1.0)
        people = fit.people_for(target)
        if math.isfinite(people):
            people = float(max(1, math.ceil(people)))
            sentence += (
                f" {whole(people)} training people are expected to reach "
                f"{figures(target)}."
            )
            marked = (*marked, (f"{whole(people)} people", people))
        else:
            sentence += (
                f" The curve never reaches {figures(target)}: its plateau is "
                f"{figures(fit.plateau)}. More people of this kind will not do; look "
                "for other markers or better measurements."
            )
    flat = (
        ("The points rise so little, or so steadily, that they do not determine the "
         "curve (a parameter is at its bound): trust its interval, not its line.",)
        if fit.at_edge
        else ()
    )  # fmt: skip
    ends = [p.n_subjects for p in points]
    ends += [factor * most for factor in BEYOND]
    if math.isfinite(people) and people <= 20.0 * most:
        ends.append(people)
    grid = sorted(set(ends))
    intervals = [fit.interval(n) for n in grid]
    values = tuple(fit.metric(n) for n in grid)
    return SizingAnswer(
        question="What would more people bring to the search for a panel?",
        sentence=sentence,
        figures={
            "people": None if not math.isfinite(people) else people,
            "plateau": fit.plateau,
            "distance": fit.distance,
            "rate": fit.rate,
            "metric_now": now,
            "metric_with_twice": twice,
            "metric_with_twice_low": low,
            "metric_with_twice_high": high,
            "undetermined": int(fit.at_edge),
        },
        inputs={"target": target, "training_people": most, "points": len(points)},
        assumptions=(
            "metric(n) = plateau - distance / n^rate, fitted to the run's learning "
            "curve by least squares weighted with its standard errors.",
            "n counts people in training; with 5 folds a cohort has a quarter more.",
            "New people are like these, and the procedure stays the same.",
            "The interval redraws each point within its standard error; training sets "
            "overlap, so that it is rough. Nothing beyond twice the people is more "
            "than "
            "a hint.",
            *flat,
            *SMALL_PRINT,
        ),
        tables=(
            SizingTable(
                "range",
                "metric expected with other numbers of people in training",
                ("people", "metric", "metric_low", "metric_high"),
                tuple(
                    (n, value, *interval)
                    for n, value, interval in zip(grid, values, intervals, strict=True)
                ),
            ),
        ),
        curve=SizingCurve(
            "learning",
            "The nested metric with more people",
            "Points: the run's nested metric with its interval. Line: the "
            "inverse-power "
            "curve, with the interval of curves through redrawn points.",
            "people in training",
            "nested metric",
            (
                SizingSeries(
                    "fitted",
                    tuple(grid),
                    values,
                    tuple(low for low, _ in intervals),
                    tuple(high for _, high in intervals),
                ),
                SizingSeries(
                    "measured",
                    tuple(p.n_subjects for p in points),
                    tuple(p.metric for p in points),
                    tuple(p.metric_low for p in points),
                    tuple(p.metric_high for p in points),
                    points_only=True,
                ),
            ),
            target,
            marked,
        ),
        sources=(
            "Mukherjee et al. 2003, J Comput Biol 10:119",
            "Figueroa et al. 2012, BMC Med Inform Decis Mak 12:8",
        ),
    )


def answer_detection(
    found: Sequence[Detection],
    prevalence: float,
    n_features: int,
    n_true: int,
    n_cohorts: int,
    how: str,
    power: float = SIZING.power,
) -> SizingAnswer:
    """Return which differences the shortlist finds, by simulation.

    Parameters
    ----------
    found : sequence of Detection
        One for each number of people and difference.
    prevalence : float
        Share of cases.
    n_features, n_true : int
        Of every invented cohort.
    n_cohorts : int
        Invented cohorts for each.
    how : str
        The selector in words.
    power : float
        Share of true markers that is wanted.

    Returns
    -------
    SizingAnswer
        Share of true markers found.
    """
    sizes = sorted({each.n_people for each in found})
    effects = sorted({each.difference for each in found})
    by = {(each.n_people, each.difference): each for each in found}
    least = {
        n: next((d for d in effects if by[n, d].found >= power), None) for n in sizes
    }
    said = [
        f"with {whole(n)} people differences from {figures(d)} SD on"
        if d is not None
        else f"with {whole(n)} people none of those tried"
        for n, d in least.items()
    ]
    return SizingAnswer(
        question="Which differences can the shortlist find?",
        sentence=f"The shortlist finds at least {figures(100 * power)} % of the true "
        f"markers: {'; '.join(said)}.",
        figures={f"least_difference_with_{n}": d for n, d in least.items()},
        inputs={
            "people": ", ".join(map(str, sizes)),
            "differences": ", ".join(f"{d:g}" for d in effects),
            "prevalence": prevalence,
            "features": n_features,
            "true_markers": n_true,
            "invented_cohorts": n_cohorts,
            "power": power,
        },
        assumptions=(
            how,
            f"{whole(n_true)} of {whole(n_features)} features differ, all by the same "
            "number of within-class SD; features are independent and normal. "
            "Companions "
            "share their picks, so that correlated features are found less often one "
            "by "
            "one.",
            f"{whole(n_cohorts)} invented cohorts each; standard errors are in the "
            "table.",
            "single_test is the power of one t test at the level that tolerates as "
            "many "
            "false markers: what a univariate ranking could do at best.",
            "A marker that the shortlist misses may still be a candidate and enter a "
            "panel.",
            *SMALL_PRINT,
        ),
        tables=(
            SizingTable(
                "range",
                "share of true markers found",
                (
                    "people", "difference", "found", "found_se", "all_found",
                    "false_markers", "single_test",
                ),
                tuple(
                    (
                        e.n_people, e.difference, e.found, e.found_se, e.all_found,
                        e.false_markers, e.single_test,
                    )
                    for e in found
                ),
            ),
        ),
        curve=_detection_curve(found, sizes, effects, power),
        sources=(
            "Meinshausen & Buhlmann 2010, JRSS-B 72:417",
            "Shah & Samworth 2013, JRSS-B 75:55",
        ),
    )  # fmt: skip


def _detection_curve(
    found: Sequence[Detection],
    sizes: Sequence[int],
    effects: Sequence[float],
    power: float,
) -> SizingCurve:
    by = {(each.n_people, each.difference): each for each in found}
    if len(effects) > 1:
        lines = [
            SizingSeries(
                f"{whole(n)} people",
                tuple(effects),
                tuple(by[n, d].found for d in effects),
                tuple(_end(by[n, d], -1.0) for d in effects),
                tuple(_end(by[n, d], 1.0) for d in effects),
            )
            for n in sizes
        ]
        label = "difference (within-class SD)"
    else:
        d = effects[0]
        lines = [
            SizingSeries(
                f"difference {d:g}",
                tuple(map(float, sizes)),
                tuple(by[n, d].found for n in sizes),
                tuple(_end(by[n, d], -1.0) for n in sizes),
                tuple(_end(by[n, d], 1.0) for n in sizes),
            )
        ]
        label = "people"
    return SizingCurve(
        "detection",
        "What the shortlist finds",
        "Share of true markers on the shortlist, mean over invented cohorts with two "
        "standard errors; the dotted line is the share that was asked for.",
        label,
        "share of true markers found",
        tuple(lines),
        power,
    )


def _end(each: Detection, sign: float) -> float:
    if math.isnan(each.found_se):
        return each.found
    return min(1.0, max(0.0, each.found + sign * 2.0 * each.found_se))
