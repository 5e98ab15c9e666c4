"""Findings about single cells, floors, gaps and scales, on invented cohorts."""

import numpy as np
import pandas as pd
import pytest

from panelkit.ingest.cohort_reader import read_cohort


@pytest.fixture
def wide():
    """Sixty samples, 200 features on the log scale, classes that nothing tells."""
    return Wide()


class Wide:
    def __init__(self):
        draws = np.random.default_rng(7)
        self.ids = [f"S{number}" for number in range(60)]
        level = draws.normal(7, 1.5, 200)
        self.values = np.clip(level + draws.normal(0, 0.7, (60, 200)), 1.0, 15.0)
        self.sheet = pd.DataFrame(
            {"sample_id": self.ids, "group": ["case", "control"] * 30}
        )
        self.features = None

    def read(self, **options):
        names = [f"F{number}" for number in range(self.values.shape[1])]
        return read_cohort(
            pd.DataFrame(self.values, index=self.ids, columns=names),
            self.sheet,
            outcome="group",
            positive="case",
            features=self.features,
            **options,
        )

    def found(self, code, **options):
        return [item for item in self.read(**options).findings if item.code == code]


def test_nothing_is_found_where_nothing_is(wide):
    assert [i.code for i in wide.read().findings] == ["scale-guess", "class-sizes"]


@pytest.mark.parametrize("cell", [1e20, -999.0, 999.0, -1e30])
@pytest.mark.filterwarnings("error")
def test_absurd_cells_stop_and_are_named_by_position(wide, cell):
    wide.values[4, 11] = wide.values[9, 3] = cell
    [finding] = wide.found("value-absurd")
    assert finding.severity == "stop"
    assert finding.message.startswith("2 cells lie far outside")
    assert f"feature 'F3', sample 'S9': {cell:.6g}" in finding.message
    assert f"feature 'F11', sample 'S4': {cell:.6g}" in finding.message
    [scale] = wide.found("scale-guess")
    assert "log scale" in scale.message
    assert not wide.found("scales-mixed")


def test_five_absurd_cells_are_named_and_all_are_counted(wide):
    wide.values[:7, 50] = -99.0
    [finding] = wide.found("value-absurd")
    assert finding.message.startswith("7 cells")
    assert finding.message.count("feature ") == 5
    assert finding.message.endswith(" and 2 more")


def test_wide_measurements_are_not_absurd(wide):
    wide.values = np.rint(2.0**wide.values)
    wide.values[0, 0] = 5e6
    assert not wide.found("value-absurd")
    wide.values[0, 0] = 1e14
    assert "1 cell lies" in wide.found("value-absurd")[0].message


def test_negative_cell_among_counts(wide):
    wide.values = np.rint(2.0**wide.values)
    wide.values[5, 8] = -1.0
    [finding] = wide.found("values-negative")
    assert "feature 'F8', sample 'S5': -1" in finding.message


def test_floor_of_the_matrix_and_of_single_features(wide):
    assert not wide.found("values-at-floor")
    floored = np.maximum(wide.values, 5.0)
    share = (floored == 5.0).mean()
    assert share > 0.05  # or the test would show nothing
    wide.values = floored
    [finding] = wide.found("values-at-floor")
    assert f"{100 * share:.3g} % of the values equal the smallest one, 5" in (
        finding.message
    )
    wide = Wide()
    limits = np.quantile(wide.values[:, :3], 0.4, axis=0)
    wide.values[:, :3] = np.maximum(wide.values[:, :3], limits)
    [finding] = wide.found("values-at-floor")
    assert finding.message.startswith("3 features have more than 20 %")


def test_no_usable_feature_stops(wide):
    wide.values[:, :100] = 3.0
    wide.values[10:, 100:150] = np.nan
    names = [f"F{number}" for number in range(200)]
    wide.features = pd.DataFrame({"feature": names, "role": ["control"] * 200})
    wide.features.loc[:149, "role"] = "marker"
    [finding] = wide.found("no-usable-feature")
    assert finding.severity == "stop"
    assert "50 may not enter a panel" in finding.message
    assert "50 are missing in more than 50 %" in finding.message
    assert "100 have a single value" in finding.message
    wide.features.loc[199, "role"] = "marker"
    assert not wide.found("no-usable-feature")


def test_gaps_by_class_that_tell_the_outcome(wide):
    draws = np.random.default_rng(3)
    gaps = draws.random(wide.values.shape) < 0.1
    wide.values[gaps] = np.nan
    assert not wide.found("missing-tied-to-outcome")
    assert wide.found("missing-by-class")[0].severity == "info"
    more = draws.random(wide.values.shape) < 0.3
    more[1::2] = False  # controls keep their values
    wide.values[more] = np.nan
    [tied] = wide.found("missing-tied-to-outcome")
    assert tied.severity == "warning"
    assert "AUC for 'case' of 1 (0.9" in tied.message
    assert "of 200 features with gaps differ by Fisher's exact test" in tied.message
    [by_class] = wide.found("missing-by-class")
    assert by_class.severity == "warning"
    assert "'case' 3" in by_class.message


def test_single_features_whose_gaps_tell_the_outcome(wide):
    """One of 200: what is corrected for many tests is still found."""
    wide.values[::2, 17] = np.nan
    wide.values[[1, 5], 30] = np.nan
    [tied] = wide.found("missing-tied-to-outcome")
    assert "1 of 2 features with gaps" in tied.message
    assert "('F17')" in tied.message


def test_random_gaps_are_rarely_called_telling():
    """On pure noise the warning comes about as seldom as its levels say."""
    called = 0
    for seed in range(40):
        wide = Wide()
        wide.values[np.random.default_rng(seed).random((60, 200)) < 0.15] = np.nan
        called += bool(wide.found("missing-tied-to-outcome"))
    assert called <= 6


def test_gaps_by_batch(wide):
    wide.sheet["plate"] = ["a"] * 30 + ["b"] * 30
    wide.values[:30, :80] = np.nan
    [finding] = wide.found("missing-by-batch", batch="plate")
    assert finding.severity == "warning"
    assert "'a' 40 %, 'b' 0 %" in finding.message


def test_gaps_are_tested_on_one_sample_a_subject(wide):
    """Thirty samples of one person are one observation."""
    wide.sheet["person"] = ["p0"] * 30 + [f"p{n}" for n in range(1, 31)]
    wide.sheet["group"] = ["case"] * 30 + ["control", "case"] * 15
    wide.values[:30, 5] = np.nan
    assert not wide.found("missing-tied-to-outcome", subject="person")


@pytest.mark.parametrize(
    ("change", "kind"),
    [
        (lambda rows: 2.0**rows, "linear"),
        (lambda rows: np.rint(2.0**rows), "whole numbers"),
        (lambda rows: rows - 7.0, "centred at zero"),
        (lambda rows: rows / 16.0, "between 0 and 1"),
    ],
)
def test_samples_on_another_scale_stop(wide, change, kind):
    wide.values[55:] = change(wide.values[55:])
    [finding] = wide.found("scales-mixed")
    assert finding.severity == "stop"
    assert f"55 in logarithms, 5 {kind} ('S55'" in finding.message


def test_linear_values_near_the_limit_are_not_called_mixed(wide):
    wide.values = 2.0 ** (wide.values - 3.5)  # 90th percentiles on both sides of 45
    assert not wide.found("scales-mixed")


def test_copies_are_found_whatever_the_type(wide):
    wide.values[:, 150] = wide.values[:, 20]
    wide.values[:5, 20] = wide.values[:5, 150] = np.nan
    wide.values[:, 199] = wide.values[:, 20] + 1e-12
    [finding] = wide.found("features-copied")
    assert finding.message.endswith(": 'F150 = F20'")
    wide.values = wide.values.astype(np.float32)
    assert "2 features have" in wide.found("features-copied")[0].message
