"""Complementary pairs: disjoint halves of the subjects, with all rows of each."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from panelkit.errors import FitError
from panelkit.stability import (
    draw_pairs,
    outcome_strata,
    resampling_units,
    unit_strata,
)


def drawn(seed, n_controls, n_cases, rows_per_subject, n_pairs=3, share=1.0):
    """Return rows, subjects, classes and the pairs drawn for them."""
    draws = np.random.default_rng(seed)
    classes = np.repeat([0.0, 1.0], [n_controls, n_cases])
    labels = draws.permutation(1000)[: len(classes)]  # codes with gaps
    counts = draws.integers(1, rows_per_subject + 1, len(classes))
    order = draws.permutation(counts.sum())
    subjects = np.repeat(labels, counts)[order]
    y = np.repeat(classes, counts)[order]
    kept = draws.permutation(len(y))[: int(np.ceil(share * len(y)))]
    rows = np.sort(kept)
    plan = draw_pairs(rows, subjects, y, n_pairs, np.random.default_rng(seed))
    return rows, subjects, y, plan


@settings(derandomize=True, deadline=None, max_examples=60, database=None)
@given(
    seed=st.integers(0, 10_000),
    n_controls=st.integers(4, 15),
    n_cases=st.integers(4, 15),
    rows_per_subject=st.integers(1, 3),
)
def test_what_holds_for_every_draw(seed, n_controls, n_cases, rows_per_subject):
    rows, subjects, y, plan = drawn(seed, n_controls, n_cases, rows_per_subject)
    assert plan.n_pairs == 3
    assert len(plan.rows) == 6
    of_class = [np.unique(subjects[rows][y[rows] == c]) for c in (0.0, 1.0)]
    for b in range(3):
        left, right = plan.rows[2 * b], plan.rows[2 * b + 1]
        sides = [np.unique(subjects[side]) for side in (left, right)]
        assert not np.intersect1d(*sides).size
        for side, own in zip((left, right), sides, strict=True):
            assert (np.diff(side) > 0).all()
            assert np.isin(side, rows).all()
            # every row of a subject that is in
            assert np.isin(subjects[rows], own).sum() == len(side)
            for members in of_class:
                assert np.isin(own, members).sum() == len(members) // 2


def test_rows_that_may_not_be_used_are_not():
    rows, _, _, plan = drawn(1, 12, 12, 3, share=0.7)
    assert np.isin(np.concatenate(plan.rows), rows).all()


def test_the_odd_one_out_changes_by_chance():
    rows, subjects, _, plan = drawn(2, 7, 9, 1, n_pairs=200)
    absent = {}
    for b in range(200):
        used = np.concatenate(plan.rows[2 * b : 2 * b + 2])
        for subject in np.setdiff1d(subjects[rows], subjects[used]):
            absent[int(subject)] = absent.get(int(subject), 0) + 1
    assert len(absent) == 16  # everybody sits out at times
    assert sum(absent.values()) == 400  # one of each class in each pair
    assert max(absent.values()) < 200 / 7 * 2


def test_every_subject_is_as_often_left_as_right():
    # a biased split (say, always the first half left) would show in the shares
    _, subjects, _, plan = drawn(3, 10, 10, 1, n_pairs=400)
    left = np.concatenate([subjects[side] for side in plan.rows[0::2]])
    counts = np.unique(left, return_counts=True)[1]
    assert len(counts) == 20
    assert abs(counts / 400 - 0.5).max() < 0.1  # 4 standard errors


def test_same_generator_same_pairs():
    one, other = drawn(4, 9, 9, 2)[3], drawn(4, 9, 9, 2)[3]
    for a, b in zip(one.rows, other.rows, strict=True):
        assert a.tolist() == b.tolist()


def test_pairs_differ_from_each_other():
    plan = drawn(5, 12, 12, 1, n_pairs=20)[3]
    assert len({side.tobytes() for side in plan.rows}) == 40


def test_four_subjects_of_each_class_are_needed():
    rows = np.arange(20)
    y = np.repeat([0.0, 1.0], [17, 3])
    with pytest.raises(FitError) as caught:
        draw_pairs(rows, rows, y, 2, np.random.default_rng(0))
    assert caught.value.code == "too-few-for-halves"
    assert "3 subjects" in caught.value.what
    y[16] = 1.0
    plan = draw_pairs(rows, rows, y, 2, np.random.default_rng(0))
    assert all(y[side].sum() == 2 for side in plan.rows)


def test_many_rows_of_few_subjects_do_not_pass_for_many():
    subjects = np.repeat([0, 1, 2, 3, 4, 5, 6], 10)
    y = np.repeat([0.0, 1.0], [40, 30])  # three subjects are cases
    with pytest.raises(FitError):
        draw_pairs(np.arange(70), subjects, y, 2, np.random.default_rng(0))


def test_units_of_both_classes_are_halved_on_their_own():
    """Matched sets, the healthy sample always first: by first rows none is a case."""
    subjects = np.repeat(np.arange(12), 2)
    y = np.tile([0.0, 1.0], 12)
    plan = draw_pairs(np.arange(24), subjects, y, 4, np.random.default_rng(0))
    for left, right in zip(plan.rows[::2], plan.rows[1::2], strict=True):
        assert y[left].mean() == y[right].mean() == 0.5
        assert len(left) == len(right) == 12
        assert not np.intersect1d(subjects[left], subjects[right]).size


def test_strata_of_units():
    strata, holding = unit_strata(np.array([5, 5, 7, 9, 9]), np.array([0, 1, 1, 0, 0]))
    assert [each.tolist() for each in strata] == [[9], [7], [5]]
    assert holding.tolist() == [2, 2]
    strata, _ = unit_strata(np.array([1, 2]), np.array([0.0, 1.0]))
    assert [each.tolist() for each in strata] == [[1], [2]]


def test_every_half_has_its_share_of_every_site():
    rows = np.arange(80)
    y = np.repeat([0.0, 1.0], 40)
    site = np.array(["a", "b", "c", "d", "d"], object)[np.arange(80) % 5]
    plan = draw_pairs(rows, rows, y, 20, np.random.default_rng(0), site=site)
    for side in plan.rows:
        for name, share in (("a", 4), ("b", 4), ("c", 4), ("d", 8)):
            for outcome in (0.0, 1.0):
                assert ((site[side] == name) & (y[side] == outcome)).sum() == share


def test_odd_ones_of_sites_are_halved_together():
    # five sites with three people of each class: only one of fifteen sits out
    rows, y = np.arange(30), np.repeat([0.0, 1.0], 15)
    site = np.arange(30) % 5
    plan = draw_pairs(rows, rows, y, 20, np.random.default_rng(1), site=site)
    for side in plan.rows:
        assert (y[side] == 0.0).sum() == (y[side] == 1.0).sum() == 7
        assert all((site[side] == k).sum() >= 2 for k in range(5))


def test_matched_sets_stay_whole():
    # pairs, and triples with two controls; each kind is halved
    matched = np.concatenate(
        [np.repeat(np.arange(8), 2), np.repeat(np.arange(8, 14), 3)]
    )
    first = np.unique(matched, return_index=True)[1]
    y = np.zeros(len(matched))
    y[first] = 1.0
    rows = np.arange(len(matched))
    plan = draw_pairs(rows, rows, y, 10, np.random.default_rng(2), matched_set=matched)
    for b in range(10):
        left, right = plan.rows[2 * b], plan.rows[2 * b + 1]
        assert not np.intersect1d(matched[left], matched[right]).size
        for side in (left, right):
            sets = np.unique(matched[side])
            assert np.isin(matched, sets).sum() == len(side)
            assert ((sets < 8).sum(), (sets >= 8).sum()) == (4, 3)


def test_sets_that_share_a_person_go_together():
    subjects = np.array([0, 1, 1, 2, 3, 4])
    matched = np.array([0, 0, 1, 1, 2, -1])
    units = resampling_units(subjects, matched)
    assert len(set(units[:4])) == 1
    assert len(set(units.tolist())) == 3


@pytest.mark.parametrize(
    ("family", "outcome", "expected"),
    [
        ("binomial", np.array([0.0, 1.0]), [0.0, 1.0]),
        ("multinomial", np.array(["a", "b"]), ["a", "b"]),
        ("cox", (np.array([3.0, 4.0]), np.array([1.0, 0.0])), [1.0, 0.0]),
        ("gaussian", np.array([0.3, 0.7]), [0.0, 0.0]),
    ],
)
def test_what_halves_are_stratified_by(family, outcome, expected):
    assert outcome_strata(outcome, family).tolist() == expected


def test_events_are_shared_out():
    # 4 events among 40 people: a random half has none in 5 of 100 draws
    # (hypergeometric: 0.0530145530)
    event = np.zeros(40)
    event[:4] = 1.0
    plan = draw_pairs(np.arange(40), np.arange(40), event, 50, np.random.default_rng(3))
    assert {int(event[side].sum()) for side in plan.rows} == {2}
