"""The comparators as the page shows them: short names, and which rows of many."""

from textwrap import wrap

from panelkit.records import Comparator, RunSummary
from panelkit.report.canvas import drawable
from panelkit.report.picks import chosen_row

__all__ = [
    "is_random",
    "kept_rows",
    "label_of",
    "lines_across",
    "named",
    "random_band",
]

_LABELS = {
    "ridge": "ridge on everything",
    "lasso": "lasso, smallest loss",
    "lasso-one-se": "lasso, one SE",
    "one-marker": "best single marker",
    "covariates": "covariates",
    "covariates-with-panel": "covariates + panel",
    "nuisance": "nuisance columns",
    "controls": "control features",
    "no-feature": "no feature",
}
LONGEST_LINE = 24
MOST_LINES = 2


def named(summary: RunSummary, kind: str) -> Comparator | None:
    """Return the first comparator of a kind; None where the run has none."""
    return next((row for row in summary.comparators if row.kind == kind), None)


def is_random(row: Comparator) -> bool:
    """Return whether a comparator stands for panels drawn by lot."""
    return row.kind.startswith("random")


def label_of(row: Comparator) -> str:
    """Return a comparator's name for a picture: whole words on at most two lines."""
    if row.kind in _LABELS:
        return _LABELS[row.kind]
    lines = wrap(drawable(row.name, 10**6), LONGEST_LINE, break_long_words=False)
    more = " …" if len(lines) > MOST_LINES else ""
    return "\n".join(drawable(line, LONGEST_LINE + 4) for line in lines[:2]) + more


def lines_across(summary: RunSummary) -> list[Comparator]:
    """Return the comparators that are drawn as a line over all sizes."""
    return [row for row in summary.comparators if not is_random(row)]


def random_band(summary: RunSummary, kind: str) -> list[Comparator]:
    """Return random panels of one kind by rising size."""
    rows = [row for row in summary.comparators if row.kind == kind]
    return sorted(rows, key=lambda row: row.size)


def kept_rows(summary: RunSummary) -> list[Comparator]:
    """Return what the page's table shows.

    Parameters
    ----------
    summary : RunSummary
        A finished run.

    Returns
    -------
    list of Comparator
        Every model; of the random panels of each kind the chosen size (against the
        headline where that was judged) and the largest. The rest is in the run's own
        table.
    """
    chosen = chosen_row(summary)
    judged = {"random-all"} if named(summary, "random-headline") is not None else set()
    kept = []
    for row in summary.comparators:
        if row.kind in ("random-all", "random-candidates"):
            sizes = {other.size for other in random_band(summary, row.kind)}
            wanted = {max(sizes)}
            if chosen is not None and row.kind not in judged:
                wanted.add(chosen.size)
            if row.size not in wanted:
                continue
        kept.append(row)
    return kept
