"""The pictures of a report, each with its numbers and a caption that says it all."""

from dataclasses import dataclass

from panelkit.records import RunSummary, ShortlistResults
from panelkit.report.aftermath_tables import (
    lost_markers_table,
    people_table,
    subgroup_table,
)
from panelkit.report.aftermath_words import (
    fragility_caption,
    learning_caption,
    subgroup_caption,
)
from panelkit.report.canvas import settings
from panelkit.report.draw_fragility import draw_fragility
from panelkit.report.draw_frontier import draw_accuracy, draw_cost
from panelkit.report.draw_learning import draw_learning
from panelkit.report.draw_shortlist import N_DRAWN, draw_frequencies
from panelkit.report.draw_subgroups import draw_subgroups
from panelkit.report.picks import chosen_row, currency, is_priced
from panelkit.report.tables import (
    accuracy_table,
    cost_table,
    csv_bytes,
    frequency_table,
)
from panelkit.report.wording import interval, printable, shorten, three_figures

__all__ = ["Picture", "draw_all", "frequency_caption"]

LONGEST_IN_SENTENCE = 40


@dataclass(frozen=True, slots=True)
class Picture:
    """One figure.

    Attributes
    ----------
    name : str
        Stem of its files in ``figures/`` and ``tables/``.
    title : str
        What is drawn.
    caption : str
        What was found.
    svg, table : bytes
        The picture; the numbers behind it as CSV.
    """

    name: str
    title: str
    caption: str
    svg: bytes
    table: bytes


def draw_all(summary: RunSummary) -> tuple[Picture, ...]:
    """Return the pictures that the run gives rise to.

    Parameters
    ----------
    summary : RunSummary
        A finished run.

    Returns
    -------
    tuple of Picture
        Frequencies, accuracy by size, cost where panels were priced, and what the
        chosen panel loses with a marker, with people and within groups.
    """
    pictures = []
    with settings():
        if len(summary.shortlist.feature):
            pictures.append(
                Picture(
                    name="selection_frequency",
                    title="How often features are picked",
                    caption=frequency_caption(summary),
                    svg=draw_frequencies(summary),
                    table=csv_bytes(frequency_table(summary, N_DRAWN)),
                )
            )
        if summary.frontier.rows:
            pictures.append(
                Picture(
                    name="accuracy_by_size",
                    title="What each panel size buys in accuracy",
                    caption=_accuracy_caption(summary),
                    svg=draw_accuracy(summary),
                    table=csv_bytes(accuracy_table(summary)),
                )
            )
        if is_priced(summary):
            pictures.append(
                Picture(
                    name="cost_and_accuracy",
                    title="What accuracy costs",
                    caption=_cost_caption(summary),
                    svg=draw_cost(summary),
                    table=csv_bytes(cost_table(summary)),
                )
            )
        pictures += _aftermath(summary)
    return tuple(pictures)


def _aftermath(summary: RunSummary) -> list[Picture]:
    found = summary.aftermath
    pictures = []
    if any(row.marker for row in found.fragility):
        pictures.append(
            Picture(
                name="lost_markers",
                title="What is lost with each marker",
                caption=fragility_caption(summary),
                svg=draw_fragility(summary),
                table=csv_bytes(lost_markers_table(summary)),
            )
        )
    if len(found.learning_curve) > 1:
        pictures.append(
            Picture(
                name="accuracy_by_people",
                title="What more people bring",
                caption=learning_caption(summary),
                svg=draw_learning(summary),
                table=csv_bytes(people_table(summary)),
            )
        )
    if found.subgroups:
        pictures.append(
            Picture(
                name="accuracy_by_group",
                title="The headline within parts of the cohort",
                caption=subgroup_caption(summary),
                svg=draw_subgroups(summary),
                table=csv_bytes(subgroup_table(summary)),
            )
        )
    return pictures


def frequency_caption(summary: RunSummary | ShortlistResults) -> str:
    """Return what the picture of the frequencies shows."""
    table = summary.shortlist
    n_picked = int(table.picked.sum())
    few = {0: "No feature reaches", 1: "One feature reaches"}
    reach = few.get(n_picked, f"{n_picked:,} features reach")
    first = shorten(printable(str(table.feature[0])), LONGEST_IN_SENTENCE)
    return (
        f"{reach} the threshold of {summary.bound.threshold:g}. The most often picked, "
        f"{first}, is in {three_figures(float(table.frequency[0]))} of all subsamples. "
        f"Drawn are the first {min(N_DRAWN, len(table.feature)):,} of "
        f"{len(table.feature):,} features that were ever picked or are candidates; "
        "bars show what more subsamples of these same people could change, not what "
        "another cohort would show."
    )


def _accuracy_caption(summary: RunSummary) -> str:
    row = chosen_row(summary)
    if row is None:
        found = "No panel was chosen."
    else:
        spread = interval(row.metric_low, row.metric_high)
        found = (
            f"The chosen panel ({row.maker}, size {row.size}) stands at "
            f"{three_figures(row.metric)} ({spread})."
        )
    return (
        f"{found} Each point is the honest accuracy of a maker at one size, each bar "
        "its interval; horizontal lines are comparators on the same folds, and bands "
        "hold nine in ten panels drawn by lot. The highest "
        "point of a curve flatters itself: read the headline figure instead."
    )


def _cost_caption(summary: RunSummary) -> str:
    rows = [row for row in summary.frontier.rows if row.cost_per_result is not None]
    n_front = sum(row.on_frontier for row in rows)
    row = chosen_row(summary)
    chosen = ""
    if row is not None and row.cost_per_result is not None:
        chosen = (
            f" The chosen panel costs {row.cost_per_result:,f} {currency(summary)} "
            f"per result at {three_figures(row.metric)}."
        )
    return (
        f"{n_front:,} of {len(rows):,} priced panels are on the frontier: nothing that "
        f"costs as little is as accurate.{chosen} Figures along the line are sizes."
    )
