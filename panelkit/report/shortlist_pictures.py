"""The pictures of a shortlist, each with its numbers and a caption."""

from collections.abc import Sequence

import numpy as np

from panelkit.records import NullShortlist, ShortlistResults
from panelkit.report.canvas import settings
from panelkit.report.draw_groups import draw_groups, shown_groups
from panelkit.report.draw_null import draw_null
from panelkit.report.draw_paths import draw_convergence, draw_paths
from panelkit.report.draw_shortlist import N_DRAWN, draw_frequencies
from panelkit.report.pictures import Picture, frequency_caption
from panelkit.report.tables import csv_bytes, frequency_table

__all__ = ["draw_shortlist_pictures", "render_shortlist"]


def render_shortlist(results: ShortlistResults) -> dict[str, bytes]:
    """Return the pictures of a shortlist and the numbers behind them.

    Parameters
    ----------
    results : ShortlistResults
        A finished shortlist.

    Returns
    -------
    dict of str to bytes
        ``figures/*.svg``, each with its ``tables/*.csv``. The same results always give
        the same bytes.
    """
    files = {}
    for picture in draw_shortlist_pictures(results):
        files[f"figures/{picture.name}.svg"] = picture.svg
        files[f"tables/{picture.name}.csv"] = picture.table
    return files


def draw_shortlist_pictures(results: ShortlistResults) -> tuple[Picture, ...]:
    """Return the pictures that a shortlist gives rise to.

    Parameters
    ----------
    results : ShortlistResults
        A finished shortlist.

    Returns
    -------
    tuple of Picture
        Sorted frequencies, frequencies along the path, convergence, companion groups,
        shuffles; those that have something to show.
    """
    pictures = []
    with settings():
        if len(results.shortlist.feature):
            pictures.append(
                Picture(
                    name="selection_frequency",
                    title="How often features are picked",
                    caption=frequency_caption(results),
                    svg=draw_frequencies(results),
                    table=csv_bytes(frequency_table(results, N_DRAWN)),
                )
            )
        if len(results.paths.features):
            pictures.append(_path_picture(results))
        if len(results.convergence.features):
            pictures.append(_convergence_picture(results))
        if shown_groups(results):
            pictures.append(_group_picture(results))
        if results.null is not None:
            pictures.append(_null_picture(results.null, results.bound.threshold))
    return tuple(pictures)


def _path_picture(results: ShortlistResults) -> Picture:
    paths = results.paths
    rows: list[Sequence[object]] = [
        ("relative_penalty", "feature", "frequency", "n_active", "separated_share")
    ]
    rows += [
        (
            float(paths.relative_penalty[k]),
            str(results.features[j]),
            float(paths.frequency[k, column]),
            float(paths.n_active[k]),
            float(paths.separated_share[k]),
        )
        for k in range(len(paths.relative_penalty))
        for column, j in enumerate(paths.features)
    ]
    return Picture(
        name="frequency_along_path",
        title="Frequencies along the penalty path",
        caption="Share of subsamples that hold a feature at equal relative penalty, "
        "without a stop; the bound speaks of the first picks instead. A feature that "
        "rises early and stays is strong; one that rises and falls is replaced.",
        svg=draw_paths(results),
        table=csv_bytes(rows),
    )


def _convergence_picture(results: ShortlistResults) -> Picture:
    convergence = results.convergence
    rows: list[Sequence[object]] = [
        ("subsamples", "feature", "frequency", "shortlist_size")
    ]
    rows += [
        (
            2 * int(convergence.pairs[k]),
            str(results.features[j]),
            float(convergence.frequency[k, column]),
            int(convergence.shortlist_size[k]),
        )
        for k in range(len(convergence.pairs))
        for column, j in enumerate(convergence.features)
    ]
    return Picture(
        name="convergence",
        title="How the frequencies settle",
        caption=convergence.sentence(),
        svg=draw_convergence(results),
        table=csv_bytes(rows),
    )


def _group_picture(results: ShortlistResults) -> Picture:
    table = results.shortlist
    rows: list[Sequence[object]] = [
        ("group", "group_frequency", "feature", "frequency", "picked")
    ]
    rows += [
        (
            int(table.group[i]),
            group.frequency,
            str(table.feature[i]),
            float(table.frequency[i]),
            bool(table.picked[i]),
        )
        for group in shown_groups(results)
        for i in group.members
    ]
    n_split = len(np.unique(results.companions.group[results.companions.vote_split]))
    return Picture(
        name="companion_groups",
        title="Companions that share votes",
        caption=f"Each row is a group of features that travel together, named by its "
        f"most frequent member. {n_split or 'No'} group(s) reach the threshold only "
        "together: far apart from its members, a group's frequency shows split votes.",
        svg=draw_groups(results),
        table=csv_bytes(rows),
    )


def _null_picture(null: NullShortlist, threshold: float) -> Picture:
    rows: list[Sequence[object]] = [
        ("kind", "shuffle", "length", "top_frequency", "top_group_frequency"),
        (
            "observed",
            None,
            null.observed_length,
            null.observed_top,
            null.observed_top_group,
        ),
    ]
    rows += [
        (
            "shuffle",
            k,
            int(null.length[k]),
            float(null.top_frequency[k]),
            float(null.top_group_frequency[k]),
        )
        for k in range(null.n_shuffles)
    ]
    return Picture(
        name="shuffles",
        title="What noise shortlists in this cohort",
        caption=null.sentence(),
        svg=draw_null(null, threshold),
        table=csv_bytes(rows),
    )
