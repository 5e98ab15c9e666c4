"""The figures of how frequencies come about: along the path, and as pairs are added."""

from typing import Any

import numpy as np
from matplotlib.axes import Axes
from numpy.typing import NDArray

from panelkit.records import ShortlistResults
from panelkit.report.canvas import (
    FAINT,
    GRID,
    INK,
    SERIES,
    drawable,
    new_figure,
    svg_bytes,
)

__all__ = ["draw_convergence", "draw_paths"]

LONGEST_LABEL = 20
APART = 0.052  # of the axis: two labels closer than this would overlap
LABEL_PLACES = (0.02, 0.12, 0.25, 0.4, 0.55, 0.7)
LABEL_WIDTH = 0.27


def draw_paths(results: ShortlistResults) -> bytes:
    """Return the share of subsamples that hold a feature, along the path.

    Parameters
    ----------
    results : ShortlistResults
        Its paths at equal relative penalty.

    Returns
    -------
    bytes
        SVG.
    """
    paths = results.paths
    figure, axes = new_figure(3.6)
    axes.grid(axis="y")
    ends = _lines(axes, paths.relative_penalty, paths.frequency)
    axes.set_xscale("log")
    low, high = paths.relative_penalty.min(), paths.relative_penalty.max()
    axes.set_xlim(high, low)
    ticks = [tick for tick in (1.0, 0.7, 0.5, 0.3, 0.2, 0.1, 0.05, 0.02, 0.01) if
             low * 0.999 <= tick <= high * 1.001]  # fmt: skip
    axes.set_xticks(ticks, [f"{tick:g}" for tick in ticks])
    axes.minorticks_off()
    axes.set_xlabel("penalty relative to each subsample's largest")
    axes.set_ylabel("share of subsamples")
    _threshold(axes, results.bound.threshold)
    top = axes.secondary_xaxis("top")
    top.set_xticks(
        ticks,
        [f"{_at(paths.relative_penalty, paths.n_active, tick):.0f}" for tick in ticks],
    )
    top.minorticks_off()
    top.set_xlabel("mean number of features in the model", color=FAINT)
    top.spines["top"].set_visible(False)
    top.tick_params(length=0)
    _names(axes, ends, [str(results.features[j]) for j in paths.features])
    return svg_bytes(figure)


def draw_convergence(results: ShortlistResults) -> bytes:
    """Return the running frequencies as pairs of subsamples are added.

    Parameters
    ----------
    results : ShortlistResults
        Its convergence.

    Returns
    -------
    bytes
        SVG.
    """
    convergence = results.convergence
    figure, axes = new_figure(3.4)
    axes.grid(axis="y")
    ends = _lines(axes, 2.0 * convergence.pairs, convergence.frequency)
    axes.set_xlim(0.0, 2.0 * convergence.pairs[-1])
    axes.set_xlabel("subsamples")
    axes.set_ylabel("frequency so far")
    _threshold(axes, convergence.threshold)
    _names(axes, ends, [str(results.features[j]) for j in convergence.features])
    return svg_bytes(figure)


def _lines(axes: Axes, x: NDArray[Any], y: NDArray[np.float64]) -> NDArray[np.float64]:
    """Draw the first features as series, the others faint; return where they end."""
    for k in range(y.shape[1] - 1, -1, -1):
        look: dict[str, Any] = {"color": FAINT, "linewidth": 0.8}
        if k < len(SERIES):
            look = {"color": SERIES[k].colour, "linestyle": SERIES[k].line}
        axes.plot(x, y[:, k], **look)
    axes.set_ylim(-0.02, 1.02)
    axes.spines["left"].set_color(GRID)
    return np.asarray(y[-1], np.float64)


def _threshold(axes: Axes, threshold: float) -> None:
    """Draw the threshold and write its name where the fewest curves pass."""
    axes.axhline(threshold, color=INK, linewidth=1.2, linestyle=(0, (5, 2)))
    curves = [axes.transData.transform(line.get_xydata()) for line in axes.lines[:-1]]
    points = axes.transAxes.inverted().transform(np.concatenate(curves))
    level = (threshold + 0.02) / 1.04
    crowd = {}
    for side in (1.0, -1.0):
        for left in LABEL_PLACES:
            beside = (points[:, 0] > left - 0.02) & (points[:, 0] < left + LABEL_WIDTH)
            away = side * (points[:, 1] - level)
            crowd[left, side] = int((beside & (away > 0.0) & (away < 0.08)).sum())
    left, side = min(crowd, key=lambda place: crowd[place])
    axes.text(
        left,
        threshold + side * 0.014,
        f"threshold {threshold:g}",
        transform=axes.get_yaxis_transform(),
        va="bottom" if side > 0.0 else "top",
    )


def _names(axes: Axes, ends: NDArray[np.float64], names: list[str]) -> None:
    """Write the names of the series at their ends, moved apart where they meet."""
    shown = np.argsort(-ends[: len(SERIES)], kind="stable")
    room = 1.04
    for k in shown:
        room = min(float(ends[k]), room - APART)
        axes.annotate(
            drawable(names[k], LONGEST_LABEL),
            (1.0, room),
            xycoords=axes.get_yaxis_transform(),
            xytext=(5, 0),
            textcoords="offset points",
            va="center",
            color=SERIES[k].colour,
            annotation_clip=False,
            parse_math=False,
        )


def _at(
    penalties: NDArray[np.float64], values: NDArray[np.float64], penalty: float
) -> float:
    return float(values[np.argmin(np.abs(np.log(penalties / penalty)))])
