"""Measurement error of a new assay: closed forms, simulation, and the way back."""

import math

import numpy as np
import pytest
from scipy import stats

from panelkit.errors import UsageError
from panelkit.metrics import cv_from_log2_sd, log2_sd_from_cv
from panelkit.sizing import (
    AssayError,
    PanelModel,
    area_with_error,
    assay_limits,
    attenuated_area,
    common_limit,
    locked_operating_point,
    refitted_area,
    replicates_needed,
    simulate_area,
)

COVARIANCE = np.array([[1.0, 0.3, 0.0], [0.3, 1.0, 0.2], [0.0, 0.2, 1.0]])
DIFFERENCES = np.array([0.8, 0.5, -0.6])


@pytest.fixture
def three():
    weights = np.linalg.solve(COVARIANCE, DIFFERENCES)
    return PanelModel(("a", "b", "c"), weights, DIFFERENCES, COVARIANCE)


def one(difference, sd):
    return PanelModel.of_effects(["a"], [difference], [sd])


@pytest.mark.parametrize(
    ("cv", "sd"),
    [
        (0.05, 0.0720897288), (0.10, 0.1439107709), (0.15, 0.2152015968),
        (0.20, 0.2857145005), (0.30, 0.4235181033), (0.50, 0.6815013324),
    ],
)  # fmt: skip
def test_cv_to_log2_and_back(cv, sd):
    assert log2_sd_from_cv(cv) == pytest.approx(sd, abs=1e-10)
    assert cv_from_log2_sd(sd) == pytest.approx(cv, abs=1e-9)


def test_log2_sd_of_simulated_readings():
    assert cv_from_log2_sd(0.3) == pytest.approx(0.2102124529, abs=1e-10)
    readings = 2.0 ** np.random.default_rng(1).normal(8.0, 0.3, 400_000)
    assert readings.std() / readings.mean() == pytest.approx(0.2102, abs=0.002)
    assert cv_from_log2_sd(1e6) == math.inf


@pytest.mark.parametrize(
    ("distance", "area"),
    [(0.5, 0.6381631951), (1, 0.7602499389), (1.5, 0.8555778168), (2, 0.9213503965)],
)
def test_area_of_a_distance(distance, area):
    """Pepe 2003, section 4.4 (binormal area); values by the normal integral."""
    assert one(distance, 1.0).area == pytest.approx(area, abs=1e-10)


@pytest.mark.parametrize(
    ("area", "row"),
    [
        (0.70, (0.69536732, 0.69057823, 0.68047879, 0.66957682, 0.64460942)),
        (0.80, (0.79398056, 0.78769008, 0.77420561, 0.75933058, 0.72411706)),
        (0.90, (0.89418611, 0.88796688, 0.87415508, 0.85819005, 0.81758336)),
        (0.95, (0.94555530, 0.94067264, 0.92938173, 0.91561755, 0.87760293)),
    ],
)
def test_attenuation(area, row):
    found = [attenuated_area(area, r) for r in (0.95, 0.9, 0.8, 0.7, 0.5)]
    assert found == pytest.approx(row, abs=1e-8)


@pytest.mark.parametrize(
    ("cv", "replicates", "area"),
    [
        (0.0, 1, 0.8116204411), (0.1, 1, 0.8078280167), (0.2, 1, 0.7974055901),
        (0.2, 2, 0.8042716576), (0.2, 3, 0.8066650016), (0.3, 1, 0.7826487722),
        (0.5, 1, 0.7494761154),
    ],
)  # fmt: skip
def test_one_marker_with_a_cv(cv, replicates, area):
    error = AssayError.of_cv(1, cv, replicates=replicates)
    assert area_with_error(one(1.0, 0.8), error) == pytest.approx(area, abs=1e-10)


def test_three_markers(three):
    assert three.weights == pytest.approx(
        [0.6689655172, 0.4367816092, -0.6873563218], abs=1e-10
    )
    added = (0.2, 0.4, 0.3)
    error = AssayError(added, (0.0,) * 3)
    assert three.area == pytest.approx(0.7774283498, abs=1e-10)
    assert area_with_error(three, error) == pytest.approx(0.7689504716, abs=1e-10)
    assert refitted_area(three, added) == pytest.approx(0.7692432547, abs=1e-10)
    equal = PanelModel(
        three.markers, np.array([1.0, 1.0, -1.0]), DIFFERENCES, COVARIANCE
    )
    assert equal.area == pytest.approx(0.7736859925, abs=1e-10)
    assert area_with_error(equal, error) == pytest.approx(0.7639790156, abs=1e-10)


@pytest.mark.parametrize(
    "error",
    [
        AssayError((0.0,) * 3, (0.0,) * 3, 8),
        AssayError((0.2, 0.4, 0.3), (0.0,) * 3, 8),
        AssayError((0.0,) * 3, (0.6, 0.3, 0.9), 4),
        AssayError((0.5,) * 3, (0.8,) * 3, 2),
        AssayError((0.5,) * 3, (0.8,) * 3, 1),
    ],
    ids=["none", "independent", "plates", "both", "one plate"],
)
def test_closed_form_and_simulation_agree(three, error):
    seen = simulate_area(three, error, np.random.default_rng(7), 300, 1200)
    assert abs(seen.mean - area_with_error(three, error)) < 4.5 * seen.se
    assert seen.se < 0.003
    assert seen.low < seen.mean < seen.high


@pytest.mark.parametrize(
    ("cv", "single", "duplicate"),
    [(0.1, 0.8309, 0.8342), (0.2, 0.8131, 0.8247), (0.3, 0.7895, 0.8109)],
)
def test_added_cv_and_duplicates(cv, single, duplicate):
    """Markers of distance 1.2, 0.5, 0.5 with SD 0.6: d^2 / (1 + s^2 / 0.36) by hand."""
    sds = [0.6] * 3
    panel = PanelModel.of_effects(["a", "b", "c"], [0.72, 0.3, 0.3], sds)
    assert panel.area == pytest.approx(0.8377, abs=5e-5)
    for replicates, area in ((1, single), (2, duplicate)):
        error = AssayError.of_cv(3, cv, replicates=replicates)
        assert area_with_error(panel, error) == pytest.approx(area, abs=5e-5)


def test_a_shift_of_the_only_plate_costs_nothing(three):
    """The closed form must know that a plate's shift cancels within the plate."""
    error = AssayError((0.0,) * 3, (5.0,) * 3, 1)
    assert area_with_error(three, error) == pytest.approx(three.area, abs=1e-12)


def test_limits_are_the_inverse(three):
    loss, plates = 0.02, 5
    own, shared = common_limit(three, loss, plates)
    for error in (
        AssayError((own,) * 3, (0.0,) * 3, plates),
        AssayError((0.0,) * 3, (shared,) * 3, plates),
    ):
        assert area_with_error(three, error) == pytest.approx(
            three.area - loss, abs=1e-10
        )
    for j, limit in enumerate(assay_limits(three, loss, plates)):
        for cv, kind in ((limit.alone_cv, 0), (limit.alone_plate_cv, 1)):
            added = [0.0] * 3
            added[j] = log2_sd_from_cv(cv)
            parts = [(0.0,) * 3, (0.0,) * 3]
            parts[kind] = tuple(added)
            assert area_with_error(three, AssayError(*parts, plates)) == pytest.approx(
                three.area - loss, abs=1e-9
            )
        # a correlation r with the first platform adds a variance s^2 (1 / r^2 - 1)
        variance = COVARIANCE[j, j] * (1 / limit.alone_correlation**2 - 1)
        assert math.sqrt(variance) == pytest.approx(
            log2_sd_from_cv(limit.alone_cv), rel=1e-9
        )


def test_limit_of_a_shift_of_one_class(three):
    loss = 0.02
    for j, limit in enumerate(assay_limits(three, loss)):
        shifted = DIFFERENCES.copy()
        shifted[j] -= math.copysign(limit.one_class_shift, three.weights[j])
        moved = PanelModel(three.markers, three.weights, shifted, COVARIANCE)
        assert moved.area == pytest.approx(three.area - loss, abs=1e-10)


def test_limit_of_a_shift_of_everybody(three):
    """One direction costs specificity, the other sensitivity; the nearer one counts."""
    before = locked_operating_point(three, 0.9, 0.0, 0.0)
    limit = assay_limits(three, 0.02, 8, 0.9, 0.05)[0]
    size = abs(three.weights[0]) * limit.everybody_shift
    losses = [
        max(np.subtract(before, locked_operating_point(three, 0.9, 0.0, sign * size)))
        for sign in (-1, 1)
    ]
    assert max(losses) == pytest.approx(0.05, abs=1e-9)


def test_locked_cut_off():
    panel = one(1.5, 1.0)
    scale = panel.weights[0]
    for added, shift, sensitivity, specificity in (
        (0.0, 0.0, 0.5864601343, 0.9),
        (0.25, 0.0, 0.5774546981, 0.8741550821),
        (0.0, 0.3, 0.6979272855, 0.8368395906),
    ):
        found = locked_operating_point(panel, 0.9, added * scale**2, shift * scale)
        assert found == pytest.approx((sensitivity, specificity), abs=1e-10)


def test_replicates():
    panel = one(1.0, 0.8)
    assert replicates_needed(panel, 0.0075, 0.2) == 2  # 0.80427 of 0.81162
    assert replicates_needed(panel, 0.0074, 0.2) == 2
    assert replicates_needed(panel, 0.0073, 0.2) == 3
    assert replicates_needed(panel, 0.005, 0.2, between=0.5) is None


def test_a_panel_of_a_run_is_scaled_to_its_honest_area():
    panel = PanelModel.of_effects(["a", "b"], [2.0, -1.0], [1.0, 0.5], 0.3)
    assert panel.covariance[0, 1] == pytest.approx(-0.15)
    scaled = panel.scaled_to(0.8)
    assert scaled.area == pytest.approx(0.8, abs=1e-12)
    assert scaled.differences / panel.differences == pytest.approx(
        [scaled.differences[0] / 2.0] * 2
    )
    d2 = panel.differences @ np.linalg.solve(panel.covariance, panel.differences)
    assert panel.area == pytest.approx(stats.norm.cdf(math.sqrt(d2 / 2)), abs=1e-12)


@pytest.mark.parametrize(
    ("call", "words"),
    [
        (lambda: one(1.0, 0.0), "SD"),
        (lambda: one(math.nan, 1.0), "finite difference"),
        (lambda: PanelModel.of_effects([], [], []), "without markers"),
        (
            lambda: PanelModel.of_effects(["a", "b", "c"], [1] * 3, [1] * 3, -0.6),
            "above -0.5",
        ),
        (lambda: one(1.0, 1.0).scaled_to(0.5), "above 0.5"),
        (lambda: assay_limits(one(1.0, 1.0), 0.0), "loss"),
        (lambda: assay_limits(one(1.0, 1.0), 0.3), "below 0.26"),
        (lambda: common_limit(one(1.0, 1.0), 0.01, 0), "plates"),
    ],
)
def test_nonsense_is_refused(call, words):
    with pytest.raises(UsageError, match=words):
        call()
