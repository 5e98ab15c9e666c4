"""The learning curve: the nested metric against people."""

from panelkit.records import RunSummary
from panelkit.report.canvas import FAINT, INK, SERIES, new_figure, svg_bytes

__all__ = ["draw_learning"]


def draw_learning(summary: RunSummary) -> bytes:
    """Return accuracy against training subjects, with intervals.

    Parameters
    ----------
    summary : RunSummary
        With a learning curve of at least two points.

    Returns
    -------
    bytes
        SVG.
    """
    curve = summary.aftermath.learning_curve
    figure, axes = new_figure(3.2)
    axes.grid(axis="y")
    series = SERIES[0]
    people = [point.n_subjects for point in curve]
    axes.fill_between(
        people,
        [point.metric_low for point in curve],
        [point.metric_high for point in curve],
        color=series.colour,
        alpha=0.16,
        linewidth=0.0,
        label=f"{100 * summary.confidence:g} % interval",
    )
    axes.plot(
        people,
        [point.metric for point in curve],
        color=series.colour,
        marker=series.marker,
        label="the rule, learnt and chosen again",
    )
    for point in curve:
        axes.annotate(
            f"{100 * point.share:.0f} %",
            (point.n_subjects, point.metric),
            xytext=(0, 8),
            textcoords="offset points",
            ha="center",
            color=INK,
        )
    axes.axhline(
        summary.no_skill,
        color=FAINT,
        linewidth=1.0,
        linestyle=(0, (2, 2)),
        label="no skill",
    )
    axes.margins(0.06, 0.12)
    axes.set_xlabel("training subjects (mean over folds)")
    axes.set_ylabel(summary.metric_words)
    figure.legend(loc="outside upper left", ncols=3)
    return svg_bytes(figure)
