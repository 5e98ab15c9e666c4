"""The figure of the shortlist: selection frequencies against the threshold."""

import numpy as np

from panelkit.records import RunSummary, ShortlistResults
from panelkit.report.canvas import (
    FAINT,
    GRID,
    INK,
    PAPER,
    SERIES,
    drawable,
    new_figure,
    svg_bytes,
)

__all__ = ["N_DRAWN", "draw_frequencies"]

N_DRAWN = 30
LONGEST_LABEL = 22
INCHES_PER_ROW = 0.185


def draw_frequencies(summary: RunSummary | ShortlistResults) -> bytes:
    """Return features by falling selection frequency, with intervals.

    Parameters
    ----------
    summary : RunSummary or ShortlistResults
        With at least one row in the shortlist table.

    Returns
    -------
    bytes
        SVG.
    """
    table = summary.shortlist
    n_rows = min(N_DRAWN, len(table.feature))
    rows = np.arange(n_rows)
    figure, axes = new_figure(1.15 + INCHES_PER_ROW * n_rows)
    axes.grid(axis="x")
    axes.hlines(
        rows,
        table.frequency_low[:n_rows],
        table.frequency_high[:n_rows],
        color=FAINT,
        linewidth=1.2,
    )
    picked, candidate = table.picked[:n_rows], table.candidate[:n_rows]
    groups = (
        ("in the shortlist", picked, SERIES[0].colour, SERIES[0].colour, "D"),
        ("candidate only", candidate & ~picked, PAPER, SERIES[1].colour, "o"),
        ("neither", ~candidate & ~picked, FAINT, FAINT, "|"),
    )
    for label, here, face, edge, marker in groups:
        if here.any():
            axes.plot(
                table.frequency[:n_rows][here],
                rows[here],
                marker,
                markersize=5.5,
                markerfacecolor=face,
                markeredgecolor=edge,
                markeredgewidth=1.5,
                label=label,
            )
    threshold = summary.bound.threshold
    axes.axvline(threshold, color=INK, linewidth=1.2, linestyle=(0, (5, 2)))
    axes.text(
        threshold,
        1.0,
        f"threshold {threshold:g}",
        transform=axes.get_xaxis_transform(),
        ha="center",
        va="bottom",
    )
    names = [drawable(str(name), LONGEST_LABEL) for name in table.feature[:n_rows]]
    axes.set_yticks(rows, names, parse_math=False)
    axes.tick_params(axis="y", length=0)
    axes.set_ylim(n_rows - 0.3, -0.7)
    axes.set_xlim(-0.02, 1.02)
    axes.set_xlabel("selection frequency (share of subsamples)")
    axes.spines["left"].set_color(GRID)
    figure.legend(loc="outside lower center", ncols=3, handletextpad=0.3)
    return svg_bytes(figure)
