"""Standing texts of the report: methods with their sources, and cautions."""

from dataclasses import dataclass

__all__ = ["CAUTIONS", "COST_LINES", "METHODS", "SOURCES", "STATEMENTS", "Method"]


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


METHODS = (
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
        "Area under the ROC curve within test folds, averaged over folds and repeats. "
        "In each fold everything is learnt again from the training rows: preparation, "
        "shortlist, candidates, panel, tuning. Every "
        "subject counts once. Its interval comes from the placements of each subject.",
        ("ledell", "delong"),
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

SOURCES = {
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
    "breiman": "Breiman, Friedman, Olshen & Stone 1984. Classification and Regression "
    "Trees. Wadsworth.",
}

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
    "Where the calibration slope is far below 1, predicted chances are too extreme; "
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
