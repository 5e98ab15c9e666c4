"""The CSVs hold the numbers of the summary, harmless in a spreadsheet."""

import csv
import io
from decimal import Decimal

import numpy as np
import pytest

from panelkit.report import render
from panelkit.report.tables import csv_bytes


@pytest.fixture(scope="module")
def tables(summary):
    return {
        path: list(csv.DictReader(io.StringIO(content.decode(), newline="")))
        for path, content in render(summary).items()
        if path.endswith(".csv")
    }


def number(cell):
    return float(cell) if cell else np.nan


def test_frequencies_agree_with_the_summary(tables, summary):
    rows = tables["tables/selection_frequency.csv"]
    table = summary.shortlist
    assert len(rows) == 30
    for name in ("frequency", "frequency_low", "frequency_high"):
        np.testing.assert_array_equal(
            [number(row[name]) for row in rows], getattr(table, name)[:30]
        )
    assert [row["picked"] == "true" for row in rows] == list(table.picked[:30])
    assert {row["threshold"] for row in rows} == {"0.75"}


def test_ids_are_kept_but_for_a_quote_before_formula_signs(tables, summary):
    rows = tables["tables/selection_frequency.csv"]
    for row, name in zip(rows, summary.shortlist.feature, strict=False):
        guard = "'" if name[0] in "=+-@" else ""
        assert row["feature"] == guard + name
    assert any(row["feature"].startswith("'=") for row in rows)
    assert any(row["feature"].startswith("'-") for row in rows)


def test_accuracy_agrees_with_the_summary(tables, summary):
    rows = tables["tables/accuracy_by_size.csv"]
    wanted = [
        *(("maker", row.maker, row) for row in summary.frontier.rows),
        *(("comparator", other.name, other) for other in summary.comparators),
    ]
    assert len(rows) == len(wanted)
    for row, (kind, name, record) in zip(rows, wanted, strict=True):
        assert (row["kind"], row["name"]) == (kind, name)
        assert int(row["size"]) == record.size
        for figure in ("metric", "metric_low", "metric_high"):
            np.testing.assert_equal(number(row[figure]), getattr(record, figure))
    assert [row["size"] for row in rows if row["chosen"] == "true"] == ["8"]


def test_cost_agrees_with_the_summary_to_the_cent(tables, summary):
    rows = tables["tables/cost_and_accuracy.csv"]
    for row, record in zip(rows, summary.frontier.rows, strict=True):
        assert row["panel"] == record.panel
        assert Decimal(row["cost_per_result"]) == record.cost_per_result
        assert row["currency"] == "EUR"
        assert (row["on_frontier"] == "true") == record.on_frontier


def test_numbers_below_zero_are_not_guarded():
    assert csv_bytes([("x", "y"), (-1.5, "-1.5")]) == b"x,y\n-1.5,'-1.5\n"


def test_a_lone_surrogate_does_not_stop_the_table():
    assert b"\\ud800" in csv_bytes([("a\ud800",)])
