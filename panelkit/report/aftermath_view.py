"""What the sections beside the answer show, ready for the page."""

from dataclasses import dataclass

from panelkit.records import AddedValue, RunSummary
from panelkit.report.aftermath_words import (
    added_value_words,
    learning_words,
    measure_words,
)

__all__ = ["AftermathView", "view_of"]


@dataclass(frozen=True, slots=True)
class AftermathView:
    """Sentences and rows of the sections beside the answer.

    Attributes
    ----------
    learning : str
        Whether more people would help.
    added : str
        What the panel adds to the covariates.
    measures : sequence of (str, AddedValue)
        Each measure in words with its row; the metric, which says least, last.
    priced : bool
        Whether any stand-in has a saving.
    """

    learning: str
    added: str
    measures: tuple[tuple[str, AddedValue], ...]
    priced: bool


def view_of(summary: RunSummary) -> AftermathView:
    """Return what the sections show of a run."""
    found = summary.aftermath
    return AftermathView(
        learning=learning_words(summary),
        added=added_value_words(summary),
        measures=tuple(
            (measure_words(row.measure, summary.metric, summary.metric_words), row)
            for row in found.added_value
        ),
        priced=any(row.saving is not None for row in found.stand_ins),
    )
