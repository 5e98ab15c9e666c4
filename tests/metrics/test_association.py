"""Cramer's V and its bias-corrected form against published formulas and values."""

import math

import numpy as np
import pytest
from scipy.stats.contingency import association

from panelkit.errors import InputDataError
from panelkit.metrics.association import (
    contingency_table,
    cramers_v,
    cramers_v_corrected,
)

# V: Cramer (1946), equal to scipy.stats.contingency.association; corrected V: worked
# out from the formulas of Bergsma (2013), J Korean Stat Soc 42:323
CHECKS = [
    ([[20, 5], [5, 20]], 0.6, 0.5887840578),
    ([[18, 2, 4], [2, 16, 8]], 0.7068549177, 0.6843876499),
    ([[15, 0], [0, 15]], 1.0, 1.0),
    ([[10, 10], [10, 10]], 0.0, 0.0),
]


@pytest.mark.parametrize(("table", "plain", "corrected"), CHECKS)
def test_check_values(table, plain, corrected):
    assert cramers_v(table) == pytest.approx(plain, abs=1e-10)
    assert cramers_v_corrected(table) == pytest.approx(corrected, abs=1e-10)
    assert cramers_v(table) == pytest.approx(
        association(np.array(table), method="cramer"), abs=1e-12
    )


@pytest.mark.parametrize(("table", "plain", "corrected"), CHECKS)
def test_order_of_rows_and_columns_does_not_matter(table, plain, corrected):
    turned = np.array(table)[::-1].T
    assert cramers_v(turned) == pytest.approx(plain)
    assert cramers_v_corrected(turned) == pytest.approx(corrected)


def test_levels_without_counts_are_left_out():
    table = [[20, 5, 0], [5, 20, 0], [0, 0, 0]]
    assert cramers_v(table) == pytest.approx(0.6)
    assert cramers_v_corrected(table) == pytest.approx(0.5887840578)


def test_single_level_has_no_association_to_speak_of():
    assert math.isnan(cramers_v([[3, 4]]))
    assert math.isnan(cramers_v_corrected([[3, 0], [4, 0]]))


def test_level_of_its_own_for_each_row_tells_nothing():
    table = np.zeros((6, 2))
    table[np.arange(6), np.arange(6) % 2] = 1
    assert cramers_v(table) == pytest.approx(1.0)
    assert cramers_v_corrected(table) == 0.0


def test_correction_removes_the_bias_of_independent_columns():
    draws = np.random.default_rng(0)
    plain, corrected = [], []
    for _ in range(300):
        table, _, _ = contingency_table(
            draws.integers(0, 4, 40).astype(str), draws.integers(0, 2, 40).astype(str)
        )
        plain.append(cramers_v(table))
        corrected.append(cramers_v_corrected(table))
    assert np.mean(plain) > 0.2
    assert np.mean(corrected) < 0.1


def test_contingency_table_counts_pairs_in_sorted_order():
    table, rows, columns = contingency_table(["b", "a", "b"], ["x", "x", "y"])
    assert table.tolist() == [[1, 0], [1, 1]]
    assert (rows, columns) == (["a", "b"], ["x", "y"])


def test_wrong_input_is_refused():
    with pytest.raises(InputDataError) as caught:
        cramers_v([1, 2])
    assert caught.value.code == "no-contingency-table"
    with pytest.raises(InputDataError) as caught:
        cramers_v_corrected([[1, -2], [3, 4]])
    assert caught.value.code == "no-contingency-table"
    with pytest.raises(InputDataError) as caught:
        contingency_table(["a"], ["x", "y"])
    assert caught.value.code == "lengths-differ"
    assert caught.value.exit_code == 3
