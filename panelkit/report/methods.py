"""Standing texts of the report: methods with their sources, and cautions."""

from collections.abc import Callable
from dataclasses import dataclass, replace

from panelkit.records import RunSummary
from panelkit.report.contrasts import named
from panelkit.report.outcome_words import words_of

__all__ = [
    "CAUTIONS",
    "COST_LINES",
    "STATEMENTS",
    "Method",
    "methods_of",
    "sources_of",
]


@dataclass(frozen=True, slots=True)
class Method:
    """One thing that was done.

    Attributes
    ----------
    name : str
        What it serves.
    text : str
        How it was done.
    sources : tuple of str
        Keys of `SOURCES`.
    """

    name: str
    text: str
    sources: tuple[str, ...] = ()


_ALWAYS = (
    Method(
        "Sparse models",
        "In each subsample a model with an L1 penalty is followed from its largest "
        "penalty downwards; features are picked in the order in which they enter.",
        ("tibshirani",),
    ),
    Method(
        "Selection frequency",
        "Subsamples are drawn as complementary pairs of disjoint halves without a "
        "subject in common. A feature's selection frequency is the share of subsamples "
        "among whose first picks it is.",
        ("meinshausen", "shah"),
    ),
    Method(
        "Bound on the shortlist",
        "The worst-case bound counts the features whose chance of being picked is "
        "below average and that reach the threshold all the same. It assumes "
        "nothing about which features are picked, but independent people and random "
        "halves; halves stratified by outcome and repeated measurements lie outside "
        "it. Features, true or not, that are picked more often than the average are "
        "not counted.",
        ("shah",),
    ),
    Method(
        "Accuracy",
        "{metric} within test folds, averaged over folds and repeats. In each "
        "fold everything is learnt again from the training rows: preparation, "
        "shortlist, candidates, panel, tuning. Every subject counts once. Its interval "
        "comes from the share of each subject in it.",
    ),
    Method(
        "Standard error over folds",
        "Folds share training rows, so the plain standard error is too small. The "
        "corrected one allows for the overlap; both are shown.",
        ("nadeau",),
    ),
    Method(
        "Smallest panel within one standard error",
        "Of the panels whose accuracy is within one standard error of the best, the "
        "smallest is taken.",
        ("breiman",),
    ),
)

_COMPARED = (
    Method(
        "Models that read everything",
        "Ridge and the lasso on all features are tuned on training rows and judged on "
        "the same folds. Differences to the primary rule are paired over folds, with "
        "the corrected standard error.",
        ("hoerl", "tibshirani", "nadeau"),
    ),
    Method(
        "Random panels",
        "Panels of each size are drawn by lot from all features and from each fold's "
        "candidates and refitted in every fold. The p-value is one more than the "
        "number of random panels at least as accurate, over one more than their "
        "number, so that it is never 0.",
        ("venet", "phipson"),
    ),
)

_OF_AFTERMATH: tuple[tuple[Callable[[RunSummary], object], Method], ...] = (
    (
        lambda summary: summary.aftermath.stand_ins or summary.aftermath.fragility,
        Method(
            "Stand-ins and lost markers",
            "In each fold the panel that the chosen maker made there, at the chosen "
            "size, loses the marker of each role in turn: the rest is refitted; or the "
            "marker stands at its training mean in the model as it was; or what the "
            "maker takes next comes in; or the feature outside the panel that is most "
            "correlated with it. Losses are paired over folds, with the corrected "
            "standard error.",
            ("nadeau",),
        ),
    ),
    (
        lambda summary: summary.aftermath.learning_curve,
        Method(
            "More people",
            "On the folds of the first repeat the training subjects are thinned within "
            "each stratum, test rows stay, and everything is learnt and chosen again. "
            "Gains of all people over fewer are paired over these folds.",
            ("nadeau",),
        ),
    ),
    (
        lambda summary: summary.aftermath.subgroups,
        Method(
            "Subgroups",
            "The out-of-fold predictions of the headline are judged within each group, "
            "in test folds, with models that were learnt on everybody. Numbers are cut "
            "into thirds. Groups with fewer than five of a kind get no figure.",
        ),
    ),
    (
        lambda summary: any(
            row.measure.startswith("net-benefit")
            for row in summary.aftermath.added_value
        ),
        Method(
            "Net benefit",
            "True positives minus false positives weighed by the odds of the chance "
            "from which one would act, per person, out of fold.",
            ("vickers",),
        ),
    ),
    (
        lambda summary: any(
            row.measure == "brier" for row in summary.aftermath.added_value
        ),
        Method(
            "Brier score",
            "Mean squared distance of predicted chance and outcome, out of fold.",
            ("brier",),
        ),
    ),
    (
        lambda summary: any(
            row.statistic == "spearman" for row in summary.aftermath.handling
        ),
        Method(
            "Score against a number",
            "Rank correlation of the out-of-fold score, averaged over repeats, with "
            "the nuisance column, where the outcome is the same.",
            ("spearman",),
        ),
    ),
    (
        lambda summary: any(
            row.statistic == "epsilon-squared" for row in summary.aftermath.handling
        ),
        Method(
            "Score against groups",
            "Share of the rank variance of the out-of-fold score, averaged over "
            "repeats, that lies between the groups of the nuisance column, where the "
            "outcome is the same; p from the rank test for several groups.",
            ("kruskal", "kelley"),
        ),
    ),
)

_SOURCES = {
    "tibshirani": "Tibshirani 1996. Regression shrinkage and selection via the lasso. "
    "Journal of the Royal Statistical Society B 58, 267-288.",
    "meinshausen": "Meinshausen & Bühlmann 2010. "
    "Stability selection. Journal of the Royal Statistical Society B 72, 417-473.",
    "shah": "Shah & Samworth 2013. Variable selection with error control: another look "
    "at stability selection. Journal of the Royal Statistical Society B 75, 55-80.",
    "ledell": "LeDell, Petersen & van der Laan 2015. Computationally efficient "
    "confidence intervals for cross-validated area under the ROC curve estimates. "
    "Electronic Journal of Statistics 9, 1583-1607.",
    "delong": "DeLong, DeLong & Clarke-Pearson 1988. Comparing the areas under two or "
    "more correlated receiver operating characteristic curves. Biometrics 44, 837-845.",
    "nadeau": "Nadeau & Bengio 2003. Inference for the generalization error. Machine "
    "Learning 52, 239-281.",
    "hand": "Hand & Till 2001. A simple generalisation of the area under the ROC curve "
    "for multiple class classification problems. Machine Learning 45, 171-186.",
    "harrell": "Harrell, Lee & Mark 1996. Multivariable prognostic models. Statistics "
    "in Medicine 15, 361-387.",
    "hoerl": "Hoerl & Kennard 1970. Ridge regression: biased estimation for "
    "nonorthogonal problems. Technometrics 12, 55-67.",
    "venet": "Venet, Dumont & Detours 2011. Most random gene expression signatures are "
    "significantly associated with breast cancer outcome. PLoS Computational Biology "
    "7, e1002240.",
    "phipson": "Phipson & Smyth 2010. Permutation p-values should never be zero. "
    "Statistical Applications in Genetics and Molecular Biology 9, 39.",
    "vickers": "Vickers & Elkin 2006. Decision curve analysis: a novel method for "
    "evaluating prediction models. Medical Decision Making 26, 565-574.",
    "brier": "Brier 1950. Verification of forecasts expressed in terms of probability. "
    "Monthly Weather Review 78, 1-3.",
    "spearman": "Spearman 1904. The proof and measurement of association between two "
    "things. American Journal of Psychology 15, 72-101.",
    "kruskal": "Kruskal & Wallis 1952. Use of ranks in one-criterion variance "
    "analysis. Journal of the American Statistical Association 47, 583-621.",
    "kelley": "Kelley 1935. An unbiased correlation ratio measure. Proceedings of the "
    "National Academy of Sciences 21, 554-559.",
    "breiman": "Breiman, Friedman, Olshen & Stone 1984. Classification and Regression "
    "Trees. Wadsworth.",
}


def methods_of(summary: RunSummary) -> tuple[Method, ...]:
    """Return what was done in this run, in words.

    Parameters
    ----------
    summary : RunSummary
        A finished run.

    Returns
    -------
    tuple of Method
        What every run does, then what this one did beside it.
    """
    metric = summary.metric_words[:1].upper() + summary.metric_words[1:]
    own = words_of(summary.metric).sources
    always = tuple(
        replace(
            each,
            text=each.text.format(metric=metric),
            sources=each.sources or (own if each.name == "Accuracy" else ()),
        )
        for each in _ALWAYS
    )
    dense, random = _COMPARED
    compared = [dense] if named(summary, "ridge") is not None else []
    compared += [random] if named(summary, "random-all") is not None else []
    did = [method for ran, method in _OF_AFTERMATH if ran(summary)]
    return (*always, *compared, *did)


def sources_of(summary: RunSummary) -> dict[str, str]:
    """Return the published sources of what this run did, in order of use."""
    used = (key for method in methods_of(summary) for key in method.sources)
    return {key: _SOURCES[key] for key in dict.fromkeys(used)}


CAUTIONS = (
    "Accuracy belongs to a procedure (a maker at a size, or the whole way with its "
    "choice), learnt again in every fold. The accuracy of the printed panel itself is "
    "unknown until it is measured in new people.",
    "The interval describes the spread over people for models trained as these were. "
    "It does not cover a change of clinic, specimen, assay or population.",
    "A marker called 'candidate only' carries no control of error. A marker called "
    "'error-controlled' is so as a member of the shortlist, not as a member of the "
    "panel.",
    "Companions travel together: another cohort may pick another member of a group.",
    "Single-marker figures are apparent: computed on the samples that chose the "
    "marker, they are too good.",
    "Where the calibration slope is far below 1, predictions are too extreme; "
    "the order of the scores may still be useful.",
    "Costs rest on the price list and the programme as given. Prices that were "
    "missing are shown as a range or named.",
)

STATEMENTS = (
    "intended use",
    "population",
    "specimen",
    "reference standard",
    "blinding",
    "registration",
    "ethics",
)

COST_LINES = {
    "collection": "Collection of samples",
    "setup": "Set-up of platform and pools",
    "development": "Development of assays",
    "samples": "Work on each sample",
    "lots": "Changes of lot",
    "runs": "Runs",
    "positions": "Positions",
    "assays": "Assays (reagents)",
    "kits": "Kits",
}
