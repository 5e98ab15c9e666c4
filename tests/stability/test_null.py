"""Shuffles: who changes places with whom, and what p-values are made of it."""

import numpy as np
import pytest

from panelkit.errors import FitError, UsageError
from panelkit.fits import ArraySource
from panelkit.records import NullShortlist
from panelkit.runtime import MemoryStore
from panelkit.stability import (
    NullDesign,
    ShortlistRules,
    permutation_p,
    shuffle_null,
    shuffled_outcome,
)

# four features, nine shuffles; exact fractions (Phipson & Smyth 2010, SAGMB 9:39;
# Westfall & Young 1993 for the largest of all features)
OBSERVED = np.array([0.95, 0.60, 0.40, 0.80])
NULL = np.array(
    [
        [0.30, 0.25, 0.40, 0.35],
        [0.55, 0.20, 0.10, 0.45],
        [0.15, 0.65, 0.30, 0.20],
        [0.40, 0.35, 0.50, 0.25],
        [0.25, 0.30, 0.20, 0.60],
        [0.45, 0.10, 0.35, 0.30],
        [0.20, 0.50, 0.25, 0.15],
        [0.35, 0.40, 0.45, 0.55],
        [0.10, 0.15, 0.30, 0.40],
    ]
)


def test_p_of_each_feature_and_of_the_largest():
    marginal = [
        float(permutation_p(o, n)) for o, n in zip(OBSERVED, NULL.T, strict=True)
    ]
    assert marginal == pytest.approx([0.1, 0.2, 0.4, 0.1], abs=1e-12)
    adjusted = permutation_p(OBSERVED, NULL.max(axis=1))
    assert adjusted == pytest.approx([0.1, 0.3, 1.0, 0.1], abs=1e-12)


def test_p_is_never_zero():
    assert permutation_p(np.array([1.0]), np.zeros(999))[0] == pytest.approx(0.001)
    null = np.concatenate([np.zeros(195), np.ones(4)])
    assert permutation_p(np.array([1.0]), null)[0] == pytest.approx(0.025)


def test_limit_of_the_largest_is_an_order_statistic():
    # of nine shuffles the tenths are the order statistics themselves: the 9th is 0.65
    nothing = np.full(4, np.nan)
    null = NullShortlist(
        np.zeros(9, int), NULL.max(axis=1), NULL.max(axis=1), 0, 0.95, 0.95, 0.1, 0.1,
        0.1, nothing, nothing, nothing,
    )  # fmt: skip
    assert null.limit(0.9) == 0.65
    assert null.limit(0.5) == np.median(NULL.max(axis=1))


def shuffled(seed, outcome, subjects=None, within=(), family="binomial"):
    n = len(outcome[0] if family == "cox" else outcome)
    own = np.arange(n) if subjects is None else subjects
    draws = np.random.default_rng(seed)
    return shuffled_outcome(outcome, family, np.arange(n), own, within, draws)


def test_people_keep_one_outcome_and_classes_their_size():
    subjects = np.array([5, 5, 1, 7, 7, 7, 2, 3])
    y = np.array([1, 1, 0, 0, 0, 0, 1, 0], float)
    seen = set()
    for seed in range(40):
        moved = shuffled(seed, y, subjects)
        for subject in np.unique(subjects):
            assert len(set(moved[subjects == subject])) == 1
        first = np.unique(subjects, return_index=True)[1]
        assert sorted(moved[first]) == sorted(y[first])
        seen.add(moved.tobytes())
    assert len(seen) == 10  # two cases among five people


def test_nobody_leaves_site_or_matched_set():
    y = np.array([1, 0, 1, 1, 0, 0, 0, 1], float)
    site = np.array(["a", "a", "a", "a", "b", "b", "b", "b"], object)
    matched = np.array([0, 0, 1, 1, 2, 2, 3, 3])
    seen = set()
    for seed in range(30):
        by_site = shuffled(seed, y, within=(site,))
        assert by_site[:4].sum() == 3
        by_set = shuffled(seed, y, within=(site, matched))
        assert by_set[:2].sum() == 1
        assert by_set[2:6].tolist() == [1, 1, 0, 0]
        seen.add(by_set.tobytes())
    assert len(seen) == 4


def test_time_and_event_stay_together():
    time, event = np.arange(12.0), (np.arange(12) % 3 == 0) * 1.0
    moved_time, moved_event = shuffled(1, (time, event), family="cox")
    assert moved_time.tolist() != time.tolist()
    assert moved_event.tolist() == event[moved_time.astype(int)].tolist()


def test_rows_that_do_not_teach_keep_theirs():
    y = np.arange(10.0)
    rows = np.arange(6)
    moved = shuffled_outcome(
        y, "gaussian", rows, np.arange(10), (), np.random.default_rng(0)
    )
    assert moved[6:].tolist() == [6, 7, 8, 9]
    assert sorted(moved[:6]) == [0, 1, 2, 3, 4, 5]


def test_nothing_to_shuffle():
    y = np.array([1, 1, 0, 0], float)
    with pytest.raises(FitError) as caught:
        shuffled(0, y, within=(np.array([0, 0, 1, 1]),))
    assert caught.value.code == "nothing-to-shuffle"


@pytest.fixture
def null(draw):
    def run(
        drawn, n_shuffles=10, store=None, threads=1, listener=lambda _: None, **how
    ):
        n = len(drawn.y)
        rules = ShortlistRules(
            markers_per_subsample=4, threshold=0.75, false_markers=None, n_penalties=15
        )
        source, rows = ArraySource(drawn.X), np.arange(n)
        return shuffle_null(
            source,
            drawn.y,
            rows,
            rows,
            np.ones(n),
            rules,
            drawn.select(markers_per_subsample=4, n_penalties=15),
            n_shuffles=n_shuffles,
            seed=3,
            inputs="these",
            store=MemoryStore() if store is None else store,
            threads=threads,
            listener=listener,
            **how,
        )

    return run


def test_a_signal_stands_out_and_noise_does_not(draw, null):
    signal = null(draw(31, 60, 80, signals=2, difference=2.0, n_pairs=10), 19)
    assert signal.p_top == pytest.approx(0.05)
    assert signal.observed_length >= 1
    assert "No shuffle" in signal.sentence()
    noise = null(draw(32, 60, 80, n_pairs=10), 19)
    assert noise.p_top > 0.05
    assert "Noise does as well" in noise.sentence()
    assert np.isnan(noise.feature_p).all()
    assert (noise.adjusted_p >= noise.p_top - 1e-12).all()
    assert noise.adjusted_p.min() == noise.p_top


def test_shuffles_are_remembered_told_and_the_same_for_any_threads(draw, null):
    drawn = draw(33, 40, 50, signals=1, n_pairs=5)
    store, told = MemoryStore(), []
    first = null(drawn, 12, store, listener=told.append)
    assert [(event.done, event.total) for event in told] == [(1, 3), (2, 3), (3, 3)]
    told.clear()
    again = null(drawn, 12, store, listener=told.append)
    assert all(event.remembered for event in told)
    other = null(drawn, 12, threads=2)
    for found in (again, other):
        assert found.top_frequency.tobytes() == first.top_frequency.tobytes()
        assert found.length.tolist() == first.length.tolist()


def test_more_shuffles_go_on_from_those_that_are_there(draw, null):
    drawn, store, told = draw(34, 40, 50, n_pairs=5), MemoryStore(), []
    few = null(drawn, 10, store)
    many = null(drawn, 20, store, listener=told.append)
    assert sum(event.remembered for event in told) == 2
    assert many.top_frequency[:10].tolist() == few.top_frequency.tolist()


@pytest.mark.slow
def test_from_a_thousand_every_feature_has_its_p(draw, null):
    drawn = draw(35, 40, 30, signals=1, difference=2.5, n_pairs=5)
    found = null(drawn, 1000, threads=2)
    assert found.feature_p[0] == pytest.approx(1 / 1001)
    assert (found.feature_p > 0.0).all()
    assert (found.feature_p <= found.adjusted_p + 1e-12).all()
    assert np.median(found.feature_p[1:]) > 0.2
    assert found.feature_q[0] <= 30 / 1001 + 1e-12
    assert (found.feature_q >= found.feature_p - 1e-12).all()


def test_halves_of_shuffles_can_be_stratified_by_site(draw, null):
    drawn = draw(36, 48, 40, n_pairs=5)
    site = np.repeat(["a", "b"], 24).astype(object)
    found = null(drawn, 5, design=NullDesign(within=(site,), pair_site=site))
    assert found.n_shuffles == 5


def test_no_shuffles(draw, null):
    with pytest.raises(UsageError):
        null(draw(37, 40, 30, n_pairs=5), 0)
