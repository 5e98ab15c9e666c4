"""The tables behind a shortlist, with features by name."""

from typing import Any

import numpy as np

from panelkit.records import ShortlistResults
from panelkit.runtime import RunFolder

__all__ = ["write_shortlist_tables"]


def write_shortlist_tables(folder: RunFolder, results: ShortlistResults) -> None:
    """Write ``companions.csv``, ``selectors.csv``, ``bounds.csv`` and ``null.csv``.

    ``null.csv`` has a row a feature with its p-values, where shuffles were asked for.

    Raises
    ------
    RunFolderError
        A file cannot be written.
    """
    _companions(folder, results)
    _selectors(folder, results)
    bound = results.bound
    folder.table(
        "bounds.csv",
        bound.__slots__,
        [[getattr(bound, name) for name in bound.__slots__]],
    )
    if results.null is not None:
        _null(folder, results)


def _companions(folder: RunFolder, results: ShortlistResults) -> None:
    table, names = results.companions, results.features
    numbers = [name for name in table.__slots__ if name not in ("first", "second")]
    folder.table(
        "companions.csv",
        ["first", "second", *numbers],
        (
            [names[table.first[i]], names[table.second[i]]]
            + [getattr(table, name)[i] for name in numbers]
            for i in range(len(table.first))
        ),
    )


def _selectors(folder: RunFolder, results: ShortlistResults) -> None:
    folder.table(
        "selectors.csv",
        [
            "selector", "shortlist", "top_feature", "top_frequency", "asked",
            "realised", "worst_case", "unimodal", "stability", "stability_low",
            "stability_high", "kuncheva", "jaccard",
        ],
        [
            [
                each.selector,
                ";".join(str(results.features[j]) for j in each.shortlist),
                results.features[each.top_feature],
                each.top_frequency,
                each.bound.asked,
                each.bound.realised,
                each.bound.worst_case,
                each.bound.unimodal,
                each.agreement.stability,
                each.agreement.low,
                each.agreement.high,
                each.agreement.kuncheva,
                each.agreement.jaccard,
            ]
            for each in results.selectors
        ],
    )  # fmt: skip


def _null(folder: RunFolder, results: ShortlistResults) -> None:
    null = results.null
    if null is None:
        return
    frequency = dict(
        zip(results.shortlist.feature, results.shortlist.frequency, strict=True)
    )
    shown: list[list[Any]] = [
        [
            name,
            frequency[name],
            null.adjusted_p[j],
            null.feature_p[j],
            null.feature_q[j],
        ]
        for j, name in enumerate(results.features)
        if name in frequency
    ]
    order = np.argsort([-row[1] for row in shown], kind="stable")
    folder.table(
        "null.csv",
        ["feature", "frequency", "p_adjusted", "p_feature", "q_feature"],
        [shown[k] for k in order],
    )
