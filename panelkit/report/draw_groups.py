"""The figure of companion groups: who shares whose votes."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from panelkit.records import ShortlistResults
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

__all__ = ["Group", "draw_groups", "shown_groups"]

N_GROUPS = 15
LONGEST_LABEL = 22
INCHES_PER_ROW = 0.21


@dataclass(frozen=True, slots=True, eq=False)
class Group:
    """One companion group of several features, as the table of the shortlist has it.

    Attributes
    ----------
    members : ndarray of int64
        Rows of the table, most frequent first.
    frequency : float
        Of the group.
    """

    members: NDArray[np.int64]
    frequency: float


def shown_groups(results: ShortlistResults) -> list[Group]:
    """Return the groups that are drawn: several members shown, most frequent first."""
    table = results.shortlist
    found = []
    for code in np.unique(table.group[table.group >= 0]):
        members = np.flatnonzero(table.group == code)
        if len(members) > 1:
            frequency = float(table.group_frequency[members[0]])
            found.append(Group(members, frequency))
    found.sort(key=lambda group: (-group.frequency, int(group.members[0])))
    return [group for group in found if group.frequency > 0.0][:N_GROUPS]


def draw_groups(results: ShortlistResults) -> bytes:
    """Return each group's frequency with those of its members.

    Parameters
    ----------
    results : ShortlistResults
        With at least one group of several members.

    Returns
    -------
    bytes
        SVG.
    """
    table, groups = results.shortlist, shown_groups(results)
    rows = np.arange(len(groups))
    figure, axes = new_figure(1.25 + INCHES_PER_ROW * len(groups))
    axes.grid(axis="x")
    for row, group in enumerate(groups):
        own = table.frequency[group.members]
        axes.hlines(row, own.min(), group.frequency, color=FAINT, linewidth=1.0)
        axes.plot(
            own,
            np.full(len(own), row),
            "o",
            markersize=5.0,
            markerfacecolor=PAPER,
            markeredgecolor=SERIES[1].colour,
            markeredgewidth=1.4,
            label="one member" if row == 0 else None,
        )
    axes.plot(
        [group.frequency for group in groups],
        rows,
        "D",
        markersize=5.5,
        color=SERIES[0].colour,
        label="any member",
        linestyle="none",
    )
    threshold = results.bound.threshold
    axes.axvline(threshold, color=INK, linewidth=1.2, linestyle=(0, (5, 2)))
    axes.text(
        threshold,
        1.0,
        f"threshold {threshold:g}",
        transform=axes.get_xaxis_transform(),
        ha="center",
        va="bottom",
    )
    names = [
        f"{drawable(str(table.feature[group.members[0]]), LONGEST_LABEL)} "
        f"+ {len(group.members) - 1}"
        for group in groups
    ]
    axes.set_yticks(rows, names, parse_math=False)
    axes.tick_params(axis="y", length=0)
    axes.set_ylim(len(groups) - 0.3, -0.7)
    axes.set_xlim(-0.02, 1.02)
    axes.set_xlabel("selection frequency (share of subsamples)")
    axes.spines["left"].set_color(GRID)
    figure.legend(loc="outside lower center", ncols=2, handletextpad=0.3)
    return svg_bytes(figure)
