"""The figure of the shuffles: the most frequent feature of noise and of the data."""

import numpy as np
from matplotlib.ticker import MaxNLocator

from panelkit.records import NullShortlist
from panelkit.report.canvas import GRID, INK, PAPER, SERIES, new_figure, svg_bytes

__all__ = ["draw_null"]

N_BINS = 40


def draw_null(null: NullShortlist, threshold: float) -> bytes:
    """Return how high the most frequent feature of each shuffle comes.

    Parameters
    ----------
    null : NullShortlist
        Of at least one shuffle.
    threshold : float
        Selection frequency from which a feature is shortlisted.

    Returns
    -------
    bytes
        SVG.
    """
    figure, axes = new_figure(2.9)
    axes.grid(axis="y")
    counts, _, _ = axes.hist(
        null.top_frequency,
        bins=[k / N_BINS for k in range(N_BINS + 1)],
        color=SERIES[1].colour,
        edgecolor="none",
        rwidth=0.86,
    )
    highest = float(np.max(counts))
    axes.set_ylim(0.0, 1.3 * highest)
    axes.yaxis.set_major_locator(MaxNLocator(5, integer=True))
    axes.axvline(threshold, color=INK, linewidth=1.2, linestyle=(0, (5, 2)))
    axes.axvline(null.observed_top, color=SERIES[0].colour, linewidth=2.2)
    room = 0.02
    for place, label, colour, height in (
        (threshold, f"threshold {threshold:g}", INK, 1.22),
        (
            null.observed_top,
            f"these data {null.observed_top:.2f}",
            SERIES[0].colour,
            1.1,
        ),
    ):
        left = place > 0.7
        axes.text(
            place - room if left else place + room,
            height * highest,
            label,
            color=colour,
            ha="right" if left else "left",
            va="center",
            bbox={"facecolor": PAPER, "edgecolor": "none", "pad": 1.0},
        )
    axes.set_xlim(0.0, 1.02)
    axes.set_xlabel("frequency of the most frequent feature")
    axes.set_ylabel("shuffles")
    axes.spines["left"].set_color(GRID)
    return svg_bytes(figure)
