"""Words that depend on the kind of outcome, by the code of its metric."""

from dataclasses import dataclass

__all__ = ["OutcomeWords", "words_of"]


@dataclass(frozen=True, slots=True)
class OutcomeWords:
    """How a kind of outcome is spoken of.

    Attributes
    ----------
    predicted : str
        What a score becomes.
    sign : str
        What a plus in the shortlist means; empty where a marker has no one sign.
    difference : str
        What the difference in the shortlist is; empty where there is none.
    loss : str
        The loss by which models are tuned.
    rarest : str
        What the smaller count of a group counts.
    within : str
        What is held fixed where scores are looked at beside nuisance columns.
    sources : tuple of str
        Keys of the sources of the metric.
    """

    predicted: str
    sign: str
    difference: str
    loss: str
    rarest: str
    within: str
    sources: tuple[str, ...]


_WORDS = {
    "auc": OutcomeWords(
        "predicted chances",
        "a higher value points to the positive class",
        "positive minus negative class on the prepared scale",
        "log loss",
        "of the rarer class",
        "class",
        ("ledell", "delong"),
    ),
    "hand-till": OutcomeWords(
        "predicted chances",
        "",
        "",
        "log loss of the classes",
        "of the rarest class",
        "class",
        ("hand", "ledell"),
    ),
    "r-squared": OutcomeWords(
        "predicted values",
        "a higher value goes with a larger number",
        "",
        "squared error",
        "in the smallest quarter of the outcome",
        "quarter of the outcome",
        ("ledell",),
    ),
    "concordance": OutcomeWords(
        "predicted hazards",
        "a higher value goes with an earlier event",
        "",
        "loss of the partial likelihood",
        "events",
        "group",
        ("harrell", "ledell"),
    ),
}
_OTHER = OutcomeWords(
    "predictions",
    "a higher value goes with a higher score",
    "as in the shortlist's own file",
    "loss",
    "of the rarest kind",
    "group",
    ("ledell",),
)


def words_of(metric: str) -> OutcomeWords:
    """Return the words for a metric's code; general ones for a code that is new."""
    return _WORDS.get(metric, _OTHER)
