"""Frequencies, bound, shortlist and candidates."""

import numpy as np
import pytest

from panelkit.errors import FitError
from panelkit.fits import ArraySource, fit_paths
from panelkit.stability import worst_case_bound


def first_pick(X, y, rows):
    """Return the column of the largest |z'(y - mean)|: what enters a path first."""
    Z = (X[rows] - X[rows].mean(0)) / X[rows].std(0)
    return int(np.abs(Z.T @ (y[rows] - y[rows].mean())).argmax())


def test_frequencies_count_first_picks_that_are_known(draw):
    # with one marker a subsample the pick is the largest correlation: closed form
    drawn = draw(1, 40, 30, signals=3, difference=0.8)
    found = drawn.select(markers_per_subsample=1)
    expected = [first_pick(drawn.X, drawn.y, rows) for rows in drawn.plan.rows]
    assert [picks.tolist() for picks in found.picks] == [[j] for j in expected]
    counts = np.bincount(expected, minlength=30) / 40
    assert found.frequency.tolist() == counts.tolist()
    assert len(set(expected)) > 2  # otherwise any constant answer would pass
    assert found.bound.realised == 1.0


def test_frequency_is_the_share_of_subsamples_that_picked(draw):
    drawn = draw(2, 40, 60, signals=3)
    found = drawn.select(markers_per_subsample=6)
    counts = np.zeros(60)
    for picks in found.picks:
        assert len(set(picks.tolist())) == len(picks) <= 6
        counts[picks] += 1
    assert max(len(picks) for picks in found.picks) == 6
    assert found.frequency == pytest.approx(counts / 40, abs=1e-15)


def test_picks_are_those_of_the_paths(draw):
    drawn = draw(3, 40, 60, signals=3)
    found = drawn.select(markers_per_subsample=4, n_penalties=25, penalty_floor=0.05)
    paths = fit_paths(
        drawn.X,
        drawn.y,
        subsamples=drawn.plan.rows,
        max_markers=4,
        n_penalties=25,
        penalty_floor=0.05,
    )
    for one, other in zip(found.picks, paths.entry_order, strict=True):
        assert one.tolist() == other.tolist()


def test_planted_markers_are_the_shortlist(draw):
    # standardised differences of 2 among 397 features of noise
    found = draw(4, 100, 400, signals=3, difference=2.0).select()
    assert sorted(found.shortlist.tolist()) == [0, 1, 2]
    assert (found.positive_share[:3] == 1.0).all()
    assert set(found.candidates[:3].tolist()) == {0, 1, 2}


def test_signs_follow_the_direction(draw):
    drawn = draw(5, 80, 100, signals=2, difference=2.0)
    X = drawn.X.copy()
    X[:, 1] *= -1.0
    found = drawn.select(X)
    assert found.positive_share[:2].tolist() == [1.0, 0.0]
    assert found.t[0] > 0.0 > found.t[1]


def test_shortlist_is_what_reaches_the_threshold_most_frequent_first(draw):
    drawn = draw(6, 60, 80, signals=4, difference=1.2)
    for threshold in (0.55, 0.75, 1.0):
        found = drawn.select(threshold=threshold, markers_per_subsample=5)
        reached = np.flatnonzero(found.frequency >= threshold - 1e-12)
        assert sorted(found.shortlist.tolist()) == reached.tolist()
        assert (np.diff(found.frequency[found.shortlist]) <= 0.0).all()


def test_shortlist_may_be_empty(draw):
    found = draw(7, 40, 200).select(threshold=0.9, markers_per_subsample=2)
    assert found.shortlist.tolist() == []
    assert len(found.candidates) > 0


def test_bound_is_that_of_the_realised_number_of_markers(draw):
    drawn = draw(8, 60, 300, signals=2)
    found = drawn.select(threshold=0.75, false_markers=1.0)
    # q = floor(sqrt(0.5 * 300)) = 12, below half of the 30 rows of a subsample
    assert found.bound.asked == 12
    assert found.bound.n_features == 300
    assert found.bound.realised == np.mean([len(picks) for picks in found.picks])
    assert found.bound.worst_case == worst_case_bound(found.bound.realised, 0.75, 300)
    assert found.bound.worst_case <= 1.0


def test_markers_are_at_most_half_the_rows_of_a_subsample(draw):
    found = draw(9, 40, 3000).select(threshold=0.75, false_markers=5.0, n_penalties=10)
    assert found.bound.asked == 10


def test_features_left_out_do_not_count_in_the_bound(draw):
    drawn = draw(10, 40, 100)
    source = ArraySource(drawn.X)
    source.included[:40] = False
    found = drawn.select(source, markers_per_subsample=4)
    assert found.bound.n_features == 60
    assert (found.frequency[:40] == 0.0).all()
    assert not np.isin(np.arange(40), found.candidates).any()


def test_intervals_lie_around_their_frequency(draw):
    found = draw(11, 50, 60, signals=4).select(markers_per_subsample=6)
    assert len(np.unique(found.frequency)) > 10
    assert (found.low <= found.frequency + 1e-12).all()
    assert (found.high >= found.frequency - 1e-12).all()
    assert (found.low >= 0.0).all()
    assert (found.high <= 1.0).all()
    wide = found.high - found.low
    assert wide.max() < 0.45  # at least 20 pairs: Wilson's widest for n = 20 is 0.41


@pytest.mark.parametrize(("n_pairs", "feature"), [(10, 0), (6, 5)])
def test_intervals_contain_their_frequency_to_the_last_bit(n_pairs, feature, draw):
    drawn = draw(12, 60, 20, signals=1, difference=20.0, n_pairs=n_pairs)
    found = drawn.select(markers_per_subsample=1)
    assert found.frequency[feature] in (0.0, 1.0)
    assert found.low[feature] <= found.frequency[feature] <= found.high[feature]


@pytest.mark.parametrize(
    ("n_pairs", "picked", "expected"),
    [
        # Wilson 1927 with 1.959963984540054; statsmodels 0.15.0 proportion_confint.
        # Pairs that agree: the pair is the unit, 10 of 10 and 0 of 20
        (10, 1.0, (0.72246720, 1.0)),
        (20, 0.0, (0.0, 0.16112516)),
    ],
)
def test_interval_of_pairs_that_agree_is_wilsons(n_pairs, picked, expected, draw):
    drawn = draw(12, 60, 20, signals=1, difference=20.0, n_pairs=n_pairs)
    found = drawn.select(markers_per_subsample=1)
    feature = 0 if picked else 5
    assert found.frequency[feature] == picked
    assert (found.low[feature], found.high[feature]) == pytest.approx(expected)


def test_signs_are_counted_over_picks_alone(draw):
    drawn = draw(13, 40, 200, signals=3)
    found = drawn.select(markers_per_subsample=3, n_penalties=4, penalty_floor=0.1)
    never = found.frequency == 0.0
    assert np.isnan(found.positive_share[never]).all()
    assert not np.isnan(found.positive_share[~never]).any()


def test_companions_share_a_group_and_its_frequency(draw):
    drawn = draw(14, 60, 80, signals=1, difference=1.5)
    X = drawn.X.copy()
    X[:, 1] = X[:, 0] + 0.05 * X[:, 1]  # a twin: the two share the picks
    found = drawn.select(X, markers_per_subsample=3)
    assert found.group[0] == found.group[1] >= 0
    assert found.group_frequency[0] == found.group_frequency[1]
    assert found.group_frequency[0] >= max(found.frequency[0], found.frequency[1])
    either = [bool({0, 1} & set(picks.tolist())) for picks in found.picks]
    assert found.group_frequency[0] == np.mean(either)


def test_only_one_member_of_a_group_leads_among_candidates(draw):
    drawn = draw(15, 60, 50, signals=2, difference=2.0)
    X = drawn.X.copy()
    X[:, 10:14] = X[:, [0]] + 0.01 * X[:, 10:14]
    found = drawn.select(X, markers_per_subsample=3, candidates=3)
    leaders = found.candidates[:2]
    assert found.group[leaders[0]] != found.group[leaders[1]]


def test_candidates_hold_the_most_frequent_the_most_different_and_the_forced(draw):
    drawn = draw(16, 40, 100, signals=3)
    found = drawn.select(candidates=5, always=np.array([99, 0]))
    order = np.argsort(-np.abs(found.t), kind="stable")
    assert set(order[:5].tolist()) <= set(found.candidates.tolist())
    assert 99 in found.candidates
    assert len(found.candidates) == len(set(found.candidates.tolist()))
    assert len(found.candidates) <= 5 + 5 + 2
    assert found.group[99] >= 0


def test_forced_candidates_change_no_frequency(draw):
    drawn = draw(17, 40, 100, signals=3)
    one, other = drawn.select(), drawn.select(always=np.array([77]))
    assert one.frequency.tobytes() == other.frequency.tobytes()
    assert one.shortlist.tolist() == other.shortlist.tolist()


def test_threads_change_no_bit(draw):
    drawn = draw(18, 40, 3000, signals=3)
    one, other = drawn.select(n_penalties=15), drawn.select(n_penalties=15, threads=2)
    for name in ("frequency", "low", "high", "candidates", "group_frequency", "t"):
        assert getattr(one, name).tobytes() == getattr(other, name).tobytes()


def test_float32_changes_no_bit(draw):
    drawn = draw(19, 40, 200, signals=3)
    X = drawn.X.astype(np.float32)
    one, other = drawn.select(X), drawn.select(X.astype(np.float64))
    for name in ("frequency", "candidates", "group", "group_frequency", "t"):
        assert getattr(one, name).tobytes() == getattr(other, name).tobytes()


def test_no_markers_at_all_is_an_error_not_an_empty_answer(draw):
    drawn = draw(20, 40, 20)
    drawn.y = np.zeros(40)
    with pytest.raises(FitError):
        drawn.select()


@pytest.mark.slow
@pytest.mark.parametrize(
    ("n", "p", "q", "threshold"), [(60, 200, 10, 0.6), (40, 100, 8, 0.6)]
)
def test_noise_stays_below_the_worst_case_bound(n, p, q, threshold, draw):
    # a global null: every feature has the average chance, so all of the shortlist
    # counts. Shah & Samworth 2013, theorem 1; 200 data sets, own simulation
    sizes, bounds = [], []
    for seed in range(200):
        found = draw([100, seed], n, p, n_pairs=25).select(
            threshold=threshold, markers_per_subsample=q
        )
        sizes.append(len(found.shortlist))
        bounds.append(found.bound.worst_case)
    assert 0.0 < np.mean(sizes) < np.mean(bounds)
    assert np.mean(bounds) == pytest.approx(q**2 / ((2 * threshold - 1) * p), rel=0.05)
