"""Learning curves, detection, bridging sets, and plates."""

import math

import numpy as np
import pytest
from scipy import stats

from panelkit.errors import UsageError
from panelkit.metrics import contingency_table, cramers_v
from panelkit.records import LearningPoint
from panelkit.sizing import (
    allocate_plates,
    bridging_size,
    choose_bridging_set,
    fit_learning_curve,
    marker_power,
    simulate_detection,
    well_names,
    widths_of,
)


def points(curve, people=(30, 60, 120, 240), se=0.01):
    return [LearningPoint(n / 240, n, curve(n), 0.5, 1.0, se) for n in people]


def test_a_known_curve_comes_back():
    """plateau 0.9, distance 1.2, rate 0.5: the form of Mukherjee et al. 2003."""
    fit = fit_learning_curve(
        points(lambda n: 0.9 - 1.2 * n**-0.5), np.random.default_rng(1)
    )
    assert fit.plateau == pytest.approx(0.9, abs=0.002)
    assert fit.metric(1000) == pytest.approx(0.9 - 1.2 / math.sqrt(1000), abs=0.002)
    assert fit.people_for(0.85) == pytest.approx(576, rel=0.03)
    assert fit.people_for(0.95) == math.inf
    low, high = fit.interval(480)
    assert low < fit.metric(480) < high
    assert not fit.at_edge


def test_a_flat_curve_is_named():
    fit = fit_learning_curve(points(lambda _: 0.8), np.random.default_rng(1))
    assert fit.metric(10_000) == pytest.approx(0.8, abs=1e-9)
    assert fit.at_edge


def test_no_curve_through_two_points():
    with pytest.raises(UsageError, match="2 numbers of people"):
        fit_learning_curve(points(lambda _: 0.8, (30, 60)), np.random.default_rng(1))


def test_power_of_a_t_test():
    """Cohen 1988, table 2.3.5 (from memory): d = 0.5, 64 in each group, 80 %."""
    assert marker_power(64, 64, 0.5, 0.05) == pytest.approx(0.80, abs=0.005)


def test_detection_with_a_selector_of_known_power():
    """A t test as selector must find what the noncentral t says it finds."""
    level = 0.01

    def select(values, outcome, _number):
        found = stats.ttest_ind(values[outcome == 1], values[outcome == 0])
        return np.asarray(found.pvalue) < level

    draws = [np.random.default_rng(k) for k in range(60)]
    found = simulate_detection(60, 0.9, select, draws, 0.4, 400, 20, level * 400)
    assert found.single_test == pytest.approx(marker_power(24, 36, 0.9, level))
    assert found.found == pytest.approx(found.single_test, abs=4 * found.found_se)
    assert found.found_se < 0.03
    assert found.false_markers == pytest.approx(380 * level, abs=1.0)


def test_detection_refuses_what_cannot_be_halved():
    with pytest.raises(UsageError, match="at least 8 of each class"):
        simulate_detection(20, 1.0, None, [], 0.2)


def test_bridging_sizes_are_the_smallest():
    sd, shift, correlation = 0.25, 0.1, 0.9
    size = bridging_size(sd, shift, correlation)
    wanted = {"shift": shift, "concordance": 0.1, "limits": 1.0}
    for place, (name, width) in enumerate(wanted.items()):
        n = getattr(size, name)
        assert widths_of(n, sd, correlation, 0.95)[place] <= width
        assert widths_of(n - 1, sd, correlation, 0.95)[place] > width
    assert size.samples == max(size.shift, size.concordance, size.limits)


def test_limits_of_agreement_as_published():
    """Bland & Altman: 100 samples give limits within 0.34 SD (from memory)."""
    assert widths_of(100, 1.0, 0.5, 0.95)[2] == pytest.approx(0.34, abs=0.005)


def test_correlation_interval_covers():
    """Fisher's z: 95 % of intervals hold the truth, within 3 SE of 2,000 draws."""
    draws = np.random.default_rng(4)
    n, truth = 40, 0.9
    pairs = draws.multivariate_normal([0, 0], [[1, truth], [truth, 1]], (2000, n))
    seen = np.array([np.corrcoef(pair.T)[0, 1] for pair in pairs])
    half = 1.959964 / math.sqrt(n - 3)
    inside = np.abs(np.arctanh(seen) - math.atanh(truth)) <= half
    assert inside.mean() == pytest.approx(0.95, abs=0.015)
    width = np.tanh(np.arctanh(seen) + half) - np.tanh(np.arctanh(seen) - half)
    assert widths_of(n, 1.0, truth, 0.95)[1] == pytest.approx(
        np.median(width), rel=0.05
    )


def test_a_bridging_set_spans_the_range():
    draws = np.random.default_rng(5)
    values, outcome = draws.normal(size=(200, 4)), np.arange(200) % 4 == 0
    chosen = choose_bridging_set(values, outcome.astype(float), 40)
    assert len(set(chosen.tolist())) == 40
    assert (values[chosen].min(axis=0) == values.min(axis=0)).all()
    assert (values[chosen].max(axis=0) == values.max(axis=0)).all()
    assert outcome[chosen].mean() == pytest.approx(0.25, abs=0.08)

    def gap(rows):
        apart = ((values[:, None] - values[rows]) ** 2).sum(axis=2)
        return np.sqrt(apart.min(axis=1)).max()

    by_chance = [gap(draws.choice(200, 40, replace=False)) for _ in range(50)]
    assert gap(chosen) < np.quantile(by_chance, 0.05)


@pytest.fixture
def people():
    draws = np.random.default_rng(6)
    n = 250
    columns = {
        "outcome": draws.choice(["yes", "no"], n, p=[0.3, 0.7]).tolist(),
        "site": draws.choice(["A", "B", "C"], n, p=[0.5, 0.3, 0.2]).tolist(),
    }
    return columns, [f"P{k}" for k in draws.integers(0, 190, n)]


def test_plates_are_balanced_and_subjects_whole(people):
    columns, subjects = people
    found = allocate_plates(columns, subjects, np.random.default_rng(1))
    counts = np.bincount(found.plate)
    assert found.n_plates == len(counts) == 3
    assert counts.max() <= 96 - 8
    assert counts.max() - counts.min() <= 8
    by_subject = {}
    for plate, subject in zip(found.plate, subjects, strict=True):
        by_subject.setdefault(subject, set()).add(plate)
    assert {len(plates) for plates in by_subject.values()} == {1}
    places = {(p, w) for p, w in zip(found.plate, found.well, strict=True)}
    assert len(places) == 250
    assert not {well for _, well in places} & set(found.control_wells)
    for each in found.balance:
        assert each.association < each.by_chance
        assert each.share_as_even < 0.05
    shown = {each.column: each.association for each in found.balance}
    table, _, _ = contingency_table(
        [str(p) for p in found.plate], list(columns["site"])
    )
    assert shown["site"] == pytest.approx(cramers_v(table))


def test_chance_is_what_chance_gives():
    """Cramer's V under chance: V^2 has mean (r-1)(c-1) / ((n-1) min(r-1, c-1))."""
    n = 264
    outcome = ["yes"] * 100 + ["no"] * (n - 100)
    found = allocate_plates(
        {"outcome": outcome},
        [str(k) for k in range(n)],
        np.random.default_rng(1),
        n_chance=2000,
    )
    assert found.n_plates == 3
    # V^2 (n - 1) is chi-square with 2 degrees of freedom: V has a Rayleigh mean
    assert found.balance[0].by_chance == pytest.approx(
        math.sqrt(math.pi / 2 / (n - 1)), rel=0.05
    )


def test_the_same_seed_gives_the_same_map(people):
    one, two, other = (
        allocate_plates(*people, np.random.default_rng(seed), n_chance=5)
        for seed in (1, 1, 2)
    )
    assert (one.well == two.well).all()
    assert (one.plate == two.plate).all()
    assert (one.well != other.well).any()


def test_positions_do_not_follow_the_sheet(people):
    """Wells are drawn: the order of the sheet must not come back within a plate."""
    found = allocate_plates(*people, np.random.default_rng(1), n_chance=5)
    own = np.flatnonzero(found.plate == 0)
    assert abs(stats.spearmanr(own, found.position[own]).statistic) < 0.3


def test_subjects_that_barely_fit_get_another_plate():
    """Three subjects of six samples do not fit into two plates of ten by halves."""
    subjects = [f"P{k}" for k in range(3) for _ in range(6)]
    found = allocate_plates(
        {"outcome": ["yes"] * 18}, subjects, np.random.default_rng(1), 10, 0, n_chance=5
    )
    assert found.n_plates == 3


def test_wells():
    names = well_names(96)
    assert names[:9] == ["A1", "B1", "C1", "D1", "E1", "F1", "G1", "H1", "A2"]
    assert names[-1] == "H12"
    assert len(set(well_names(384))) == 384
    assert well_names(1536)[31] == "AF1"
    assert well_names(10)[-1] == "10"


@pytest.mark.parametrize(("wells", "controls"), [(8, 8), (0, 0), (3, 0)])
def test_plates_without_room(wells, controls):
    with pytest.raises(UsageError):
        allocate_plates(
            {"outcome": ["a"] * 4},
            ["P"] * 4,
            np.random.default_rng(1),
            wells,
            controls,
        )
