"""The figure of subgroups: one figure with its interval a group, by column."""

import math

from matplotlib.axes import Axes

from panelkit.records import RunSummary, Subgroup
from panelkit.report.canvas import (
    FAINT,
    INK,
    PAPER,
    SERIES,
    drawable,
    new_figure,
    svg_bytes,
)

__all__ = ["draw_subgroups", "drawn_groups"]

LONGEST_LABEL = 24
LONGEST_COLUMN = 34
INCHES_PER_ROW = 0.215
MOST_GROUPS = 40


def drawn_groups(summary: RunSummary) -> tuple[Subgroup, ...]:
    """Return the groups that are drawn, at most forty."""
    return summary.aftermath.subgroups[:MOST_GROUPS]


def draw_subgroups(summary: RunSummary) -> bytes:
    """Return the headline's predictions judged within each group.

    Parameters
    ----------
    summary : RunSummary
        With at least one group.

    Returns
    -------
    bytes
        SVG.
    """
    lines: list[str | Subgroup] = []
    for row in drawn_groups(summary):
        if row.column not in lines:
            lines.append(row.column)
        lines.append(row)
    figure, axes = new_figure(1.3 + INCHES_PER_ROW * (len(lines) + 1))
    axes.grid(axis="x")
    headline = summary.choice.headline.metric
    axes.axvline(headline, color=INK, linewidth=1.2, label="headline")
    axes.axvline(
        summary.no_skill,
        color=FAINT,
        linewidth=1.0,
        linestyle=(0, (2, 2)),
        label="no skill",
    )
    names, places = [], []
    for place, line in enumerate(lines):
        if isinstance(line, str):
            axes.annotate(
                drawable(line, LONGEST_COLUMN),
                (0.01, place),
                xycoords=("axes fraction", "data"),
                va="center",
                fontweight="bold",
                bbox={"facecolor": PAPER, "edgecolor": "none", "pad": 0.8},
            )
            continue
        names.append(drawable(line.group, LONGEST_LABEL))
        places.append(place)
        _draw_group(axes, line, place, headline)
    axes.annotate(
        "samples (rarest)",
        (1.02, -1.0),
        xycoords=("axes fraction", "data"),
        va="center",
        color=FAINT,
        annotation_clip=False,
    )
    axes.set_yticks(places, names, parse_math=False)
    axes.tick_params(axis="y", length=0)
    axes.set_ylim(len(lines) - 0.4, -1.5)
    axes.set_xlabel(summary.metric_words)
    axes.spines["left"].set_visible(False)
    figure.legend(loc="outside upper left", ncols=4, handletextpad=0.5)
    return svg_bytes(figure)


def _draw_group(axes: Axes, row: Subgroup, place: int, headline: float) -> None:
    """Draw one group: open where its whole interval lies below the headline."""
    axes.annotate(
        f"{row.n_samples:,} ({row.n_events:,})",
        (1.02, place),
        xycoords=("axes fraction", "data"),
        va="center",
        annotation_clip=False,
    )
    if not math.isfinite(row.metric):
        axes.annotate(
            "too few for a figure",
            (0.5, place),
            xycoords=("axes fraction", "data"),
            va="center",
            ha="center",
            color=FAINT,
            fontstyle="italic",
        )
        return
    low = row.metric_high < headline
    series = SERIES[1] if low else SERIES[0]
    axes.hlines(
        place, row.metric_low, row.metric_high, color=series.colour, linewidth=1.6
    )
    label = "interval below the headline" if low else "group"
    known = {text for text in axes.get_legend_handles_labels()[1]}
    axes.plot(
        [row.metric],
        [place],
        series.marker,
        color=series.colour,
        markersize=6,
        markerfacecolor=PAPER if low else series.colour,
        markeredgewidth=1.5,
        label="_" if label in known else label,
    )
