"""The numbers behind each figure, as CSV that a spreadsheet opens without harm."""

import csv
import io
import math
from collections.abc import Sequence

from panelkit.records import RunSummary, ShortlistResults
from panelkit.report.picks import chosen_row, currency

__all__ = ["accuracy_table", "cost_table", "csv_bytes", "frequency_table"]

FORMULA_SIGNS = ("=", "+", "-", "@", "\t", "\r")
Table = list[Sequence[object]]


def csv_bytes(table: Table) -> bytes:
    """Return a table as CSV.

    Parameters
    ----------
    table : list of sequences
        The header, then the rows.

    Returns
    -------
    bytes
        UTF-8. Text that a spreadsheet would take for a formula starts with a single
        quote; numbers keep every digit, and NaN and None are empty cells.
    """
    target = io.StringIO()
    writer = csv.writer(target, lineterminator="\n")
    writer.writerows([_cell(value) for value in row] for row in table)
    return target.getvalue().encode("utf-8", errors="backslashreplace")


def _cell(value: object) -> str:
    if value is None or (isinstance(value, float) and math.isnan(value)):
        return ""
    if isinstance(value, bool):
        return str(value).lower()
    if isinstance(value, str) and value.startswith(FORMULA_SIGNS):
        return f"'{value}"
    return str(value)


def frequency_table(summary: RunSummary | ShortlistResults, n_rows: int) -> Table:
    """Return the drawn features with frequency, interval, threshold and marks."""
    table = summary.shortlist
    rows: Table = [
        (
            "feature",
            "frequency",
            "frequency_low",
            "frequency_high",
            "threshold",
            "picked",
            "candidate",
        )
    ]
    rows += [
        (
            str(table.feature[i]),
            float(table.frequency[i]),
            float(table.frequency_low[i]),
            float(table.frequency_high[i]),
            summary.bound.threshold,
            bool(table.picked[i]),
            bool(table.candidate[i]),
        )
        for i in range(min(n_rows, len(table.feature)))
    ]
    return rows


def accuracy_table(summary: RunSummary) -> Table:
    """Return every maker's points and the comparators' lines."""
    chosen = chosen_row(summary)
    rows: Table = [
        ("kind", "name", "size", "metric", "metric_low", "metric_high", "chosen")
    ]
    rows += [
        (
            "maker",
            row.maker,
            row.size,
            row.metric,
            row.metric_low,
            row.metric_high,
            row is chosen,
        )
        for row in summary.frontier.rows
    ]
    rows += [
        (
            "comparator",
            other.name,
            other.size,
            other.metric,
            other.metric_low,
            other.metric_high,
            False,
        )
        for other in summary.comparators
    ]
    return rows


def cost_table(summary: RunSummary) -> Table:
    """Return every priced panel with its cost per result and accuracy."""
    chosen = chosen_row(summary)
    code = currency(summary)
    rows: Table = [
        (
            "panel",
            "maker",
            "size",
            "platform",
            "cost_per_result",
            "currency",
            "metric",
            "metric_low",
            "metric_high",
            "on_frontier",
            "chosen",
        )
    ]
    rows += [
        (
            row.panel,
            row.maker,
            row.size,
            row.platform,
            row.cost_per_result,
            code,
            row.metric,
            row.metric_low,
            row.metric_high,
            row.on_frontier,
            row is chosen,
        )
        for row in summary.frontier.rows
        if row.cost_per_result is not None
    ]
    return rows
