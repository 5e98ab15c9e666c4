"""The figures of the frontier: accuracy by size, and what accuracy costs."""

import math
from collections.abc import Sequence

from matplotlib.axes import Axes
from matplotlib.colors import to_rgba
from matplotlib.ticker import MaxNLocator

from panelkit.records import FrontierRow, RunSummary
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
from panelkit.report.contrasts import label_of, lines_across, random_band
from panelkit.report.picks import chosen_row, currency

__all__ = ["LABEL_STEP", "apart", "draw_accuracy", "draw_cost"]

LONGEST_MAKER = 28
DODGE = 0.12  # markers; keeps intervals of several makers apart
MOST_TICKS = 15
LABEL_STEP = 0.06  # smallest distance of two labels, as a share of the height


def draw_accuracy(summary: RunSummary) -> bytes:
    """Return accuracy against panel size, a line a maker, comparators across.

    Parameters
    ----------
    summary : RunSummary
        With at least one row in the frontier.

    Returns
    -------
    bytes
        SVG.
    """
    figure, axes = new_figure(4.6)
    axes.grid(axis="y")
    _draw_bands(axes, summary)
    makers = _by_maker(summary.frontier.rows)
    for place, (maker, rows) in enumerate(makers.items()):
        shift = (place - (len(makers) - 1) / 2) * DODGE
        _draw_maker(axes, maker, rows, shift, place)
    chosen = chosen_row(summary)
    if chosen is not None:
        place = list(makers).index(chosen.maker)
        shift = (place - (len(makers) - 1) / 2) * DODGE
        _mark_chosen(axes, chosen.size + shift, chosen.metric)
    _draw_comparators(axes, summary)
    largest = max(row.size for row in summary.frontier.rows)
    if largest <= MOST_TICKS:
        axes.set_xticks(range(1, largest + 1))
    else:
        axes.xaxis.set_major_locator(MaxNLocator(integer=True))
    axes.set_xlabel("panel size (markers)")
    axes.set_ylabel(summary.metric_words)
    columns = 2 if random_band(summary, "random-all") else _legend_columns(list(makers))
    figure.legend(loc="outside upper left", ncols=columns, handlelength=3.2)
    return svg_bytes(figure)


def draw_cost(summary: RunSummary) -> bytes:
    """Return accuracy against cost per result, the frontier joined by a line.

    Parameters
    ----------
    summary : RunSummary
        With at least one priced row in the frontier.

    Returns
    -------
    bytes
        SVG.
    """
    figure, axes = new_figure(4.0)
    axes.grid(axis="both")
    priced = [row for row in summary.frontier.rows if row.cost_per_result is not None]
    front = sorted((row for row in priced if row.on_frontier), key=_cost)
    axes.plot(
        [_cost(row) for row in front],
        [row.metric for row in front],
        color=INK,
        linewidth=1.2,
        drawstyle="steps-post",
        label="frontier",
    )
    for place, (maker, rows) in enumerate(_by_maker(priced).items()):
        series = SERIES[place % len(SERIES)]
        axes.plot(
            [_cost(row) for row in rows],
            [row.metric for row in rows],
            series.marker,
            color=series.colour,
            markersize=6,
            markerfacecolor=_face(place),
            label=drawable(maker, LONGEST_MAKER),
        )
    for row in front:
        axes.annotate(
            str(row.size),
            (_cost(row), row.metric),
            xytext=(-6, 7),
            textcoords="offset points",
            ha="right",
        )
    chosen = chosen_row(summary)
    if chosen is not None and chosen.cost_per_result is not None:
        _mark_chosen(axes, _cost(chosen), chosen.metric)
    axes.margins(0.09, 0.12)
    axes.set_xlabel(f"cost per result ({currency(summary)})")
    axes.set_ylabel(summary.metric_words)
    columns = _legend_columns([row.maker for row in priced])
    figure.legend(loc="outside upper left", ncols=columns)
    return svg_bytes(figure)


def _cost(row: FrontierRow) -> float:
    return math.nan if row.cost_per_result is None else float(row.cost_per_result)


def _legend_columns(makers: list[str]) -> int:
    """Return how many columns of names fit side by side."""
    longest = max(len(drawable(maker, LONGEST_MAKER)) for maker in makers)
    return 4 if longest <= 10 else 3 if longest <= 15 else 2


def _face(place: int) -> str:
    """Return the fill of a maker's marker: open once all series are in use."""
    series = SERIES[place % len(SERIES)]
    return series.colour if place < len(SERIES) else PAPER


def _by_maker(rows: Sequence[FrontierRow]) -> dict[str, list[FrontierRow]]:
    makers: dict[str, list[FrontierRow]] = {}
    for row in rows:
        makers.setdefault(row.maker, []).append(row)
    return {
        maker: sorted(own, key=lambda row: row.size) for maker, own in makers.items()
    }


def _draw_maker(
    axes: Axes, maker: str, rows: list[FrontierRow], shift: float, place: int
) -> None:
    series = SERIES[place % len(SERIES)]
    places = [row.size + shift for row in rows]
    axes.vlines(
        places,
        [row.metric_low for row in rows],
        [row.metric_high for row in rows],
        color=series.colour,
        linewidth=1.0,
        alpha=0.65,
    )
    axes.plot(
        places,
        [row.metric for row in rows],
        color=series.colour,
        linestyle=series.line,
        marker=series.marker,
        markersize=5.5,
        markerfacecolor=_face(place),
        label=drawable(maker, LONGEST_MAKER),
    )


def _mark_chosen(axes: Axes, x: float, y: float) -> None:
    axes.plot(
        [x],
        [y],
        "o",
        markersize=14,
        markerfacecolor="none",
        markeredgecolor=INK,
        markeredgewidth=1.4,
        label="chosen",
    )


def _draw_bands(axes: Axes, summary: RunSummary) -> None:
    """Draw what nine in ten random panels of each size reach, as bands."""
    looks = (
        ("random-all", "drawn by lot, all features", GRID, None, 0.75),
        ("random-candidates", "drawn by lot, candidates", FAINT, "//", 0.0),
    )
    for kind, label, colour, hatch, alpha in looks:
        rows = random_band(summary, kind)
        if len(rows) < 2:
            continue
        axes.fill_between(
            [row.size for row in rows],
            [row.metric_low for row in rows],
            [row.metric_high for row in rows],
            facecolor=to_rgba(colour, alpha),
            edgecolor=colour,
            hatch=hatch,
            linewidth=0.6,
            label=label,
            zorder=0.6,
        )


def _draw_comparators(axes: Axes, summary: RunSummary) -> None:
    """Draw a thin line a comparator; names at the right, pushed apart."""
    others = sorted(
        (other for other in lines_across(summary) if math.isfinite(other.metric)),
        key=lambda other: other.metric,
    )
    for other in others:
        axes.axhline(other.metric, color=FAINT, linewidth=0.9, linestyle=(0, (2, 2)))
    low, high = axes.get_ylim()
    axes.set_ylim(low, high)
    wanted = [(other.metric - low) / (high - low) for other in others]
    for other, own, place in zip(others, wanted, apart(wanted), strict=True):
        axes.annotate(
            label_of(other),
            xy=(1.0, own),
            xytext=(1.03, place),
            xycoords="axes fraction",
            textcoords="axes fraction",
            va="center",
            ha="left",
            fontsize=9,
            bbox={"facecolor": PAPER, "edgecolor": "none", "pad": 0.5},
            arrowprops={
                "arrowstyle": "-",
                "color": FAINT,
                "linewidth": 0.7,
                "relpos": (0.0, 0.5),
                "shrinkA": 0.0,
                "shrinkB": 0.0,
            },
        )


def apart(wanted: list[float]) -> list[float]:
    """Return rising heights at least one label apart, near to those wanted."""
    places: list[float] = []
    for height in wanted:
        places.append(max(height, places[-1] + LABEL_STEP) if places else height)
    excess = max(0.0, places[-1] - 1.0) if places else 0.0
    for i in range(len(places) - 1, -1, -1):
        ceiling = 1.0 if i == len(places) - 1 else places[i + 1] - LABEL_STEP
        if excess and places[i] > ceiling:
            places[i] = ceiling
    return places
