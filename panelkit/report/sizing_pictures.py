"""The picture of an answer about sizes or assays, and its tables."""

from itertools import pairwise

from matplotlib.axes import Axes
from matplotlib.ticker import FuncFormatter, MaxNLocator

from panelkit.records import SizingAnswer, SizingCurve, SizingSeries
from panelkit.report.canvas import (
    FAINT,
    INK,
    PAPER,
    SERIES,
    drawable,
    new_figure,
    settings,
    svg_bytes,
)
from panelkit.report.pictures import Picture
from panelkit.report.tables import Table, csv_bytes

__all__ = ["draw_sizing", "sizing_tables"]

LONGEST_NAME = 34


def draw_sizing(answer: SizingAnswer) -> tuple[Picture, ...]:
    """Return the picture of an answer, with its numbers and caption.

    Parameters
    ----------
    answer : SizingAnswer
        With a curve or without.

    Returns
    -------
    tuple of Picture
        One, or none where there is nothing to draw.
    """
    curve = answer.curve
    if curve is None or not curve.series:
        return ()
    with settings():
        figure, axes = new_figure(3.9)
        axes.grid(axis="y")
        if curve.logarithmic:
            axes.set_xscale("log")
            axes.set_yscale("log")
        for place, line in enumerate(curve.series):
            _draw_line(axes, line, place)
        if not curve.logarithmic:
            _reach(axes, curve)
        if curve.target is not None:
            axes.axhline(
                curve.target, color=FAINT, linestyle=(0, (1, 2)), linewidth=1.2
            )
        axes.set_xlabel(curve.x_label)
        axes.set_ylabel(curve.y_label)
        for place, (words, x) in enumerate(curve.marked):
            _mark(axes, curve, words, x, place)
        _ticks(axes, curve)
        columns = 2 if max(len(line.name) for line in curve.series) <= 26 else 1
        figure.legend(loc="outside upper left", ncols=columns, handlelength=3.2)
        svg = svg_bytes(figure)
    table: Table = [("series", curve.x_label, curve.y_label, "low", "high")]
    for line in curve.series:
        for k, (x, y) in enumerate(zip(line.x, line.y, strict=True)):
            low = line.low[k] if line.low else None
            high = line.high[k] if line.high else None
            table.append((line.name, x, y, low, high))
    return (
        Picture(
            f"{curve.name}_picture", curve.title, curve.caption, svg, csv_bytes(table)
        ),
    )


def sizing_tables(answer: SizingAnswer) -> dict[str, bytes]:
    """Return the tables of an answer as CSV, by their names."""
    return {
        table.name: csv_bytes([table.header, *table.rows]) for table in answer.tables
    }


def _draw_line(axes: Axes, line: SizingSeries, place: int) -> None:
    series = SERIES[place % len(SERIES)]
    many = len(line.x) > 12
    if line.low and line.points_only:
        axes.vlines(line.x, line.low, line.high, color=series.colour, linewidth=1.2)
    elif line.low:
        axes.fill_between(
            line.x, line.low, line.high, color=series.colour, alpha=0.13, linewidth=0
        )
    axes.plot(
        line.x,
        line.y,
        color=series.colour,
        linestyle="none" if line.points_only else series.line,
        marker=series.marker if line.points_only or not many else "none",
        markersize=5.0,
        label=drawable(line.name, LONGEST_NAME),
    )


def _reach(axes: Axes, curve: SizingCurve) -> None:
    """Leave room for what was asked for; start at 0 where values come near to it."""
    values = [y for line in curve.series for y in line.y]
    if curve.target is not None:
        values.append(curve.target)
    low, high = min(values), max(values)
    for line in curve.series:
        low, high = min([low, *line.low]), max([high, *line.high])
    bottom = 0.0 if 0.0 <= low < 0.4 * high else low - 0.06 * (high - low or 1.0)
    top = high + 0.12 * (high - bottom or 1.0)
    probability = high <= 1.0 and curve.target is not None and bottom >= 0.0
    axes.set_ylim(bottom, min(top, 1.02) if probability and high > 0.9 else top)


def _mark(axes: Axes, curve: SizingCurve, words: str, x: float, place: int) -> None:
    """Draw a line across with its words, at the foot where lines rise to the top."""
    axes.axvline(x, color=INK, linewidth=1.0, linestyle=(0, (4, 2)))
    across = axes.transData.transform((x, 1.0))[0]
    right = float(axes.transAxes.inverted().transform((across, 0.0))[0]) > 0.62
    first = curve.series[0]
    rises = first.y[-1] > first.y[0]
    axes.annotate(
        words,
        (x, 0.03 + 0.07 * place if rises else 0.97 - 0.07 * place),
        xycoords=("data", "axes fraction"),
        xytext=(-5 if right else 5, 0),
        textcoords="offset points",
        ha="right" if right else "left",
        va="bottom" if rises else "top",
        bbox={"facecolor": PAPER, "edgecolor": "none", "pad": 1.0},
    )


def _ticks(axes: Axes, curve: SizingCurve) -> None:
    if curve.ticks:
        axes.set_xticks(range(1, len(curve.ticks) + 1))
        axes.set_xticklabels(
            [drawable(name, LONGEST_NAME) for name in curve.ticks],
            rotation=25,
            ha="right",
        )
        axes.margins(x=0.12)
        axes.yaxis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:,g}"))
        return
    places = sorted({x for line in curve.series for x in line.x})
    integer = all(float(x).is_integer() for x in places)
    few = len(places) <= 8 and integer
    if few and all(b - a == 1.0 for a, b in pairwise(places)):
        axes.set_xticks(places)
        axes.margins(x=0.12)
    elif not curve.logarithmic:
        axes.xaxis.set_major_locator(
            MaxNLocator(nbins=7, steps=[1, 2, 2.5, 5, 10], integer=integer)
        )
    axes.xaxis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:,g}"))
    axes.yaxis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:,g}"))
