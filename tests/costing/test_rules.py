"""Rules of choice: who meets the demand, and which of those is taken."""

from decimal import Decimal

import numpy as np
import pytest

from panelkit.costing import Curve, Rule, pick, within_margin, within_one_se

ONE_SE = Rule("smallest-within-one-se")


def chosen(area, ratio, rule=ONE_SE, cost=None):
    """Return maker and size position; area is (splits, makers, sizes)."""
    n_splits, n_makers, n_sizes = area.shape
    found = pick(
        rule,
        Curve(
            area.reshape(n_splits, -1),
            np.tile(np.arange(1.0, n_sizes + 1), n_makers),
            np.full(n_makers * n_sizes, np.nan) if cost is None else np.ravel(cost),
            ratio,
        ),
    )
    return divmod(found.row, n_sizes)


# five fold errors for panels of 1, 2, 3, 5, 8, 12 and 20 markers
SIZES = np.array([1, 2, 3, 5, 8, 12, 20])
ERRORS = np.array(
    [
        [0.32, 0.28, 0.34, 0.30, 0.36],
        [0.24, 0.22, 0.30, 0.26, 0.28],
        [0.20, 0.18, 0.24, 0.20, 0.22],
        [0.19, 0.15, 0.22, 0.18, 0.20],
        [0.18, 0.14, 0.20, 0.18, 0.20],
        [0.18, 0.15, 0.21, 0.17, 0.20],
        [0.19, 0.17, 0.22, 0.18, 0.21],
    ]
)
AREA = (1.0 - ERRORS).T


def test_within_one_se_of_the_paired_difference():
    # exact arithmetic: 8 markers are best (mean 0.820); 12 lose 0.002 with corrected SE
    # sqrt((1/5 + 1/4) 7.0e-5) = 0.0056; 5 lose 0.008 with the same SE: outside, though
    # the naive SE of the best alone (0.011) would let them in
    assert SIZES[within_one_se(AREA, 0.25)].tolist() == [8, 12]
    naive = 0.0109544512
    assert SIZES[AREA.mean(0) >= 0.820 - naive].min() == 5


def test_a_larger_test_share_widens_the_rule():
    # 5 lose 0.008 = sqrt((1/5 + r) 7.0e-5) at r = 0.714: exact arithmetic
    assert not within_one_se(AREA, 0.70)[3]
    assert within_one_se(AREA, 0.73)[3]


def test_the_best_is_always_within():
    for seed in range(20):
        draws = np.random.default_rng(seed)
        area = draws.uniform(0.5, 1.0, (5, 8))
        assert within_one_se(area, 0.25)[area.mean(0).round(4).argmax()]


def test_steady_loss_is_not_within():
    # 0.01 less on every split: the paired difference has no spread, so SE is 0
    base = np.array([0.6, 0.7, 0.8, 0.9])
    area = np.column_stack([base - 0.01, base, base])
    assert within_one_se(area, 0.25).tolist() == [False, True, True]


def test_equals_of_the_best_are_within_whatever_the_standard_error():
    area = np.column_stack([[0.7, 0.9], [0.9, 0.7], [0.8, 0.8]])
    assert within_one_se(area, 0.0).all()


def test_one_split_lets_only_equals_in():
    area = np.array([[0.7, 0.9, 0.9, 0.89996, 0.8999]])
    assert within_one_se(area, 0.25).tolist() == [False, True, True, True, False]


def test_differences_below_the_rounding_do_not_decide():
    # machines differ in the last bits: 1e-7 must not turn a choice
    base = np.array([0.6, 0.7, 0.8])
    area = np.column_stack([base, base + 1e-7])
    assert within_one_se(area, 0.5).all()
    assert chosen(area[:, None, :], 0.5) == (0, 0)


def test_undefined_splits_are_left_out():
    area = np.vstack([AREA, np.full(7, np.nan)])
    assert within_one_se(area, 0.25).tolist() == within_one_se(AREA, 0.25).tolist()


def test_smallest_size_within_one_se_is_chosen():
    assert chosen(AREA[:, None, :], 0.25) == (0, 4)
    assert chosen(AREA[:, None, :], 0.73) == (0, 3)


def test_more_accurate_maker_of_the_size_is_chosen_then_the_first():
    worse = AREA - np.array([[0.001], [-0.001], [0.001], [-0.001], [0.001]])
    both = np.stack([worse, AREA], axis=1)  # folds, makers, sizes
    assert chosen(both, 0.25) == (1, 4)
    assert chosen(np.stack([AREA, AREA], axis=1), 0.25) == (0, 4)


def test_smaller_size_wins_over_the_more_accurate_maker():
    # maker 0 is best with 2 markers; maker 1 is as good as that with 1
    area = np.zeros((4, 2, 2))
    area[:, 0] = [0.6, 0.9]
    area[:, 1] = [0.9, 0.7]
    assert chosen(area, 0.25) == (1, 0)


# the ten panels of the costing handbook's example 12: mean accuracy, standard error,
# cost, and paired difference to the best with its standard error


def curve_of(means, differences, errors, n=10):
    """Return ten folds with given means, paired differences and corrected errors."""
    # the corrected error of a 10-fold difference is s sqrt(1/10 + 1/9)
    pattern = np.where(np.arange(n) % 2 == 0, 1.0, -1.0)
    pattern = pattern / pattern.std(ddof=1) / np.sqrt(1 / n + 1 / (n - 1))
    best = int(np.argmax(means))
    base = np.full(n, means[best])
    rows = [base + d + e * pattern for d, e in zip(differences, errors, strict=True)]
    return np.array(rows).T


EXAMPLE = {
    # name: size, mean, cost, difference to the best, its standard error
    "P02": (2, 0.781, 18200, -0.090, 0.013),
    "P03": (3, 0.812, 20400, -0.059, 0.011),
    "P04": (4, 0.836, 22600, -0.035, 0.009),
    "P05": (5, 0.849, 24900, -0.022, 0.007),
    "P06": (6, 0.857, 27100, -0.014, 0.006),
    "P08": (8, 0.864, 31600, -0.007, 0.004),
    "P09k": (9, 0.863, 26300, -0.008, 0.0045),
    "P10": (10, 0.868, 36200, -0.003, 0.003),
    "P12": (12, 0.871, 40700, 0.0, 0.0),
    "P13": (13, 0.870, 47000, -0.001, 0.002),
}
NAMES = list(EXAMPLE)
SIZE, MEAN, COST, DIFFERENCE, ERROR = (
    np.array(column, float) for column in zip(*EXAMPLE.values(), strict=True)
)
CURVE = Curve(curve_of(MEAN, DIFFERENCE, ERROR), SIZE, COST, 1 / 9)


@pytest.mark.parametrize(
    ("budget", "expected"),
    [(25_000, "P05"), (30_000, "P09k"), (35_000, "P08"), (50_000, "P12")],
)
def test_best_under_a_budget(budget, expected):
    rule = Rule("best-under-budget", budget=Decimal(budget))
    found = pick(rule, CURVE)
    assert found.met
    assert NAMES[found.row] == expected


def test_an_impossible_budget_names_the_cheapest_as_nearest_miss():
    found = pick(Rule("best-under-budget", budget=Decimal(18_199)), CURVE)
    assert not found.met
    assert NAMES[found.row] == "P02"


@pytest.mark.parametrize(
    ("margin", "smallest", "cheapest"), [(0.02, "P08", "P09k"), (0.03, "P06", "P09k")]
)
def test_not_worse_than_a_margin(margin, smallest, cheapest):
    # lower limits by Student's t (0.95, 9 df) = 1.8331: P06 -0.0250, P08 -0.0143,
    # P09k -0.0163, P05 -0.0348
    small = pick(Rule("smallest-within-margin", margin=margin), CURVE)
    cheap = pick(Rule("cheapest-within-margin", margin=margin), CURVE)
    assert (NAMES[small.row], NAMES[cheap.row]) == (smallest, cheapest)


def test_corrected_error_fails_what_the_naive_one_passes():
    # ten paired differences times 1,000; Nadeau & Bengio 2003
    worse = np.array([-20, -5, -12, -18, -9, -25, -3, -16, -11, -21]) / 1000
    both = np.column_stack([np.full(10, 0.9), 0.9 + worse])
    assert within_margin(both, 1 / 9, 0.0201).tolist() == [True, True]
    assert within_margin(both, 1 / 9, 0.0200).tolist() == [True, False]
    assert within_margin(both, 0.0, 0.0200).tolist() == [True, True]  # the naive one


def test_cheapest_above_a_required_accuracy():
    found = pick(Rule("cheapest-above-accuracy", required_accuracy=0.86), CURVE)
    assert NAMES[found.row] == "P09k"
    missed = pick(Rule("cheapest-above-accuracy", required_accuracy=0.9), CURVE)
    assert (missed.met, NAMES[missed.row]) == (False, "P12")


def test_rules_about_money_leave_unpriced_panels_out():
    unpriced = Curve(CURVE.metric, SIZE, np.where(SIZE == 9, np.nan, COST), 1 / 9)
    found = pick(Rule("cheapest-within-margin", margin=0.02), unpriced)
    assert NAMES[found.row] == "P08"
