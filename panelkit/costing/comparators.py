"""What else could be done with the same data, on the same folds, in sentences."""

import numpy as np
from numpy.typing import NDArray

from panelkit.costing.comparisons import FROM_ALL, FROM_CANDIDATES
from panelkit.costing.comparisons.dense import (
    LASSO,
    LASSO_ONE_SE,
    LASSO_SIZES,
    RIDGE,
)
from panelkit.costing.comparisons.plain_columns import (
    CONTROLS,
    COVARIATES,
    NUISANCE,
    WITH_COVARIATES,
)
from panelkit.costing.frontier import Judge
from panelkit.costing.honest_accuracy import HonestAccuracy
from panelkit.costing.primary import Primary
from panelkit.metrics import CrossValidated, paired_interval
from panelkit.records import Comparator, OutOfFold

__all__ = ["compare", "no_better_than_random"]

ENOUGH = 0.05  # p-value from which a panel is called no better than random ones


def compare(
    accuracy: HonestAccuracy, judge: Judge, primary: Primary, n_features: int
) -> tuple[Comparator, ...]:
    """Return the comparators, each with a sentence against the primary rule.

    Parameters
    ----------
    accuracy : HonestAccuracy
        Out-of-fold predictions.
    judge : Judge
        Outcome, subjects, folds.
    primary : Primary
        The primary rule.
    n_features : int
        Features that ridge reads.

    Returns
    -------
    tuple of Comparator
        Dense models, one marker, random panels, covariates and nuisance columns where
        there are any, no skill.
    """
    nested = judge.metric(primary.predictions)
    rows = [
        _model(kind, name, size, predictions, nested, judge)
        for kind, name, size, predictions in _models(accuracy, primary, n_features)
    ]
    rows += _random(accuracy, judge, primary)
    rows += _random_at_headline(accuracy, judge, primary)
    rows.append(_no_skill(judge))
    return tuple(rows)


def _models(
    accuracy: HonestAccuracy, primary: Primary, n_features: int
) -> list[tuple[str, str, int, OutOfFold]]:
    others = accuracy.others
    found: list[tuple[str, str, int, OutOfFold]] = []

    def add(kind: str, key: str, name: str, size: int) -> None:
        if key in others:
            found.append((kind, name, size, others[key]))

    add("ridge", RIDGE, "ridge on all features", n_features)
    if LASSO_SIZES in accuracy.figures:
        sizes = np.median(accuracy.figures[LASSO_SIZES], axis=(0, 1)).astype(int)
        add("lasso", LASSO, "lasso on all features, smallest loss", int(sizes[0]))
        one_se = "lasso on all features, one SE"
        add("lasso-one-se", LASSO_ONE_SE, one_se, int(sizes[1]))
    for predictions in accuracy.panels:
        if (predictions.maker, predictions.size) == ("univariate", 1):
            name = "one marker, the most different in each fold"
            found.append(("one-marker", name, 1, predictions))
    add("covariates", COVARIATES, "covariates alone", 0)
    panel = accuracy.panels[primary.taken.row]
    add(
        "covariates-with-panel",
        f"{WITH_COVARIATES}{panel.maker}-{panel.size}",
        f"covariates with {panel.maker}-{panel.size}",
        panel.size,
    )
    add("nuisance", NUISANCE, "nuisance columns alone", 0)
    add("controls", CONTROLS, "control features alone", 0)
    return found


def _model(
    kind: str,
    name: str,
    size: int,
    predictions: OutOfFold,
    primary: CrossValidated,
    judge: Judge,
) -> Comparator:
    found = judge.metric(predictions)
    per_fold: NDArray[np.float64] = (found.per_fold - primary.per_fold).ravel()
    difference = paired_interval(per_fold, judge.test_to_train, judge.confidence)
    same = bool((per_fold[~np.isnan(per_fold)] == 0.0).all())
    return Comparator(
        name,
        size,
        found.mean,
        found.low,
        found.high,
        _sentence(name, found, primary, difference, same, judge.confidence),
        kind,
        *difference,
    )


def _sentence(
    name: str,
    found: CrossValidated,
    primary: CrossValidated,
    difference: tuple[float, float, float],
    same: bool,
    confidence: float,
) -> str:
    gap, low, high = difference
    name = f"{name[0].upper()}{name[1:]}"
    figures = f"{found.mean:.3f} against {primary.mean:.3f}"
    if same:
        return (
            f"{name}: identical to the primary rule in every fold ({found.mean:.3f})."
        )
    if np.isnan(low):
        return f"{name}: {figures}; too few folds for an interval of the difference."
    spread = (
        f"difference {gap:+.3f}, {100 * confidence:g} % interval {low:+.3f} to "
        f"{high:+.3f}"
    )
    if low <= 0.0 <= high:
        return (
            f"{name}: not told apart from the primary rule by these data ({figures}; "
            f"{spread})."
        )
    if gap < 0.0:
        return f"{name}: less accurate than the primary rule ({figures}; {spread})."
    return (
        f"{name}: more accurate than the primary rule ({figures}; {spread}), so the "
        "small panel gives something away."
    )


def random_figures(
    figures: NDArray[np.float64], size: int, observed: float
) -> tuple[float, float, float, float]:
    """Return mean, 5th and 95th percentile of random panels, and a p-value.

    Parameters
    ----------
    figures : ndarray of shape (n_repeats, n_folds, n_sizes, n_panels)
        The metric of each random panel in each fold; the first repeat counts.
    size : int
        Position of the size.
    observed : float
        The metric to be judged.

    Returns
    -------
    mean, low, high, p : float
        p is (1 + random panels at least as accurate) / (panels + 1).

    References
    ----------
    Phipson & Smyth 2010, Stat Appl Genet Mol Biol 9:39 (why p is never 0).
    """
    panels = np.nanmean(figures[0, :, size], axis=0)
    low, high = np.quantile(panels, [0.05, 0.95])
    p = (1 + int((panels >= observed).sum())) / (len(panels) + 1)
    return float(panels.mean()), float(low), float(high), p


def no_better_than_random(
    accuracy: HonestAccuracy, judge: Judge, primary: Primary
) -> bool:
    """Return whether the headline is reached by more than 5 % of random panels."""
    sizes = sorted({each.size for each in accuracy.panels})
    observed = _in_first_repeat(primary.predictions, judge)
    place = sizes.index(accuracy.panels[primary.taken.row].size)
    return random_figures(accuracy.figures[FROM_ALL], place, observed)[3] > ENOUGH


def _random(
    accuracy: HonestAccuracy, judge: Judge, primary: Primary
) -> list[Comparator]:
    """Return random panels of each size against the chosen maker at that size."""
    maker = accuracy.panels[primary.taken.row].maker
    own = {each.size: each for each in accuracy.panels if each.maker == maker}
    sizes = sorted(own)
    rows = []
    for key, kind, source in (
        (FROM_ALL, "random-all", "all features"),
        (FROM_CANDIDATES, "random-candidates", "candidates"),
    ):
        if key not in accuracy.figures:
            continue
        figures = accuracy.figures[key]
        for place, size in enumerate(sizes):
            observed = _in_first_repeat(own[size], judge)
            mean, low, high, p = random_figures(figures, place, observed)
            rows.append(
                Comparator(
                    f"random panels of {size} from {source}",
                    size,
                    mean,
                    low,
                    high,
                    _random_sentence(
                        f"{figures.shape[-1]} panels of {_markers(size)} drawn by lot "
                        f"from {source} reach {mean:.3f} on average, one in twenty "
                        f"{high:.3f} or more, against {observed:.3f} of the maker "
                        f"{maker} at that size (p = {p:.3g})",
                        source,
                        p,
                    ),
                    kind,
                    p=p,
                )
            )
    return rows


def _in_first_repeat(predictions: OutOfFold, judge: Judge) -> float:
    """Return the metric on the folds on which random panels were learnt."""
    return float(np.nanmean(judge.metric(predictions).per_fold[0]))


def _random_at_headline(
    accuracy: HonestAccuracy, judge: Judge, primary: Primary
) -> list[Comparator]:
    """Return random panels of the chosen size against the headline's procedure."""
    if FROM_ALL not in accuracy.figures:
        return []
    sizes = sorted({each.size for each in accuracy.panels})
    size = accuracy.panels[primary.taken.row].size
    figures = accuracy.figures[FROM_ALL]
    observed = _in_first_repeat(primary.predictions, judge)
    mean, low, high, p = random_figures(figures, sizes.index(size), observed)
    lead = (
        f"{figures.shape[-1]} panels of {_markers(size)} drawn by lot from all "
        f"features reach {mean:.3f} on average, one in twenty {high:.3f} or more, "
        f"against {observed:.3f} of the headline's procedure on the same folds "
        f"(p = {p:.3g})"
    )
    words = (
        "the whole procedure is no better than random panels of the chosen size"
        if p > ENOUGH
        else "the whole procedure is better than random panels of the chosen size"
    )
    name = f"random panels of {size}, the chosen size, against the headline"
    return [
        Comparator(
            name, size, mean, low, high, f"{lead}: {words}.", "random-headline", p=p
        )
    ]


def _markers(size: int) -> str:
    return "1 marker" if size == 1 else f"{size} markers"


def _random_sentence(lead: str, source: str, p: float) -> str:
    if source == "candidates":
        if p > ENOUGH:
            return f"{lead}: which of the candidates enter hardly matters."
        return f"{lead}: choosing among the candidates helps."
    if p > ENOUGH:
        return f"{lead}: the maker is no better than random panels of this size."
    return f"{lead}: choosing markers helps."


def _no_skill(judge: Judge) -> Comparator:
    task = judge.task
    words = f"Without any feature the {task.metric_words} is {task.no_skill:g}."
    strata = task.strata
    if task.family in ("binomial", "multinomial"):
        share = float(np.bincount(strata).max()) / len(strata)
        words = (
            "Calling everybody the commonest class separates nobody "
            f"({task.metric_words} {task.no_skill:g}), though it is right for "
            f"{share:.0%} of the samples."
        )
    return Comparator(
        "no feature at all",
        0,
        task.no_skill,
        float("nan"),
        float("nan"),
        words,
        "no-feature",
    )
