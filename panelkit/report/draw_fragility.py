"""The figure of lost markers: two ends a marker, joined."""

from panelkit.records import Fragility, RunSummary
from panelkit.report.canvas import FAINT, INK, SERIES, drawable, new_figure, svg_bytes

__all__ = ["draw_fragility", "fragility_rows"]

LONGEST_LABEL = 22
INCHES_PER_ROW = 0.27
MOST_MARKERS = 30
EDGE = 0.16  # rows; keeps the two intervals of a marker apart
LOOKS = (
    ("lost-refitted", "the rest refitted", SERIES[0], SERIES[0].colour, -EDGE, 5.0),
    ("lost-imputed", "its mean put in", SERIES[1], "none", EDGE, 8.0),
)


def fragility_rows(summary: RunSummary) -> dict[str, dict[str, Fragility]]:
    """Return what is drawn: markers by falling loss, each with its events.

    Parameters
    ----------
    summary : RunSummary
        A finished run.

    Returns
    -------
    dict of str to dict of str to Fragility
        At most thirty markers, the gravest loss first.
    """
    found: dict[str, dict[str, Fragility]] = {}
    for row in sorted(summary.aftermath.fragility, key=lambda row: -row.loss):
        if row.marker and row.event in {look[0] for look in LOOKS}:
            found.setdefault(row.marker, {})[row.event] = row
    return dict(list(found.items())[:MOST_MARKERS])


def draw_fragility(summary: RunSummary) -> bytes:
    """Return what is lost with each marker, refitted and imputed.

    Parameters
    ----------
    summary : RunSummary
        With at least one lost marker.

    Returns
    -------
    bytes
        SVG.
    """
    markers = fragility_rows(summary)
    figure, axes = new_figure(1.25 + INCHES_PER_ROW * len(markers))
    axes.grid(axis="x")
    axes.axvline(0.0, color=INK, linewidth=1.0)
    for place, events in enumerate(markers.values()):
        ends = [row.loss for row in events.values()]
        axes.hlines(
            place,
            min(ends),
            max(ends),
            color=FAINT,
            linewidth=3.0,
            alpha=0.5,
            zorder=1.5,
        )
    for event, label, series, face, shift, size in LOOKS:
        rows = [
            (place, events[event])
            for place, events in enumerate(markers.values())
            if event in events
        ]
        if not rows:
            continue
        axes.hlines(
            [place + shift for place, _ in rows],
            [row.loss_low for _, row in rows],
            [row.loss_high for _, row in rows],
            color=series.colour,
            linewidth=1.0,
            linestyle=series.line,
        )
        axes.plot(
            [row.loss for _, row in rows],
            [place for place, _ in rows],
            series.marker,
            markersize=size,
            color=series.colour,
            markerfacecolor=face,
            markeredgewidth=1.5,
            label=label,
        )
    names = [drawable(name, LONGEST_LABEL) for name in markers]
    axes.set_yticks(range(len(names)), names, parse_math=False)
    axes.tick_params(axis="y", length=0)
    axes.set_ylim(len(names) - 0.4, -0.6)
    axes.set_xlabel(f"loss of {summary.metric_words}")
    axes.spines["left"].set_visible(False)
    axes.spines["bottom"].set_color(FAINT)
    figure.legend(loc="outside upper left", ncols=2, handletextpad=0.3)
    return svg_bytes(figure)
