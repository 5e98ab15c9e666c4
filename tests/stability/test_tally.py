"""Worked pairs, convergence, and how many pairs are enough."""

import numpy as np
import pytest

from panelkit.errors import StudyFileError
from panelkit.stability import pairs_needed, record_convergence
from panelkit.stability.tally import frequency_intervals

# Shah & Samworth 2013, JRSS-B 75:55, definitions of the two shares: four features,
# three pairs ({1,2},{1,3}), ({1,2},{1,2}), ({1,4},{2,3}); exact arithmetic
PAIRS = np.array(
    [
        [1, 1, 0, 0],
        [1, 0, 1, 0],
        [1, 1, 0, 0],
        [1, 1, 0, 0],
        [1, 0, 0, 1],
        [0, 1, 1, 0],
    ],
    bool,
)


def test_worked_pairs():
    frequency = frequency_intervals(PAIRS)[0]
    assert frequency == pytest.approx([5 / 6, 2 / 3, 1 / 3, 1 / 6], abs=1e-15)
    both = (PAIRS[0::2] & PAIRS[1::2]).mean(axis=0)
    assert both == pytest.approx([2 / 3, 1 / 3, 0, 0], abs=1e-15)
    assert (both >= 2 * frequency - 1 - 1e-12).all()


def test_simultaneous_share_is_kept(draw):
    found = draw(51, 50, 60, signals=3).select(markers_per_subsample=5)
    both = found.picked[0::2] & found.picked[1::2]
    assert found.simultaneous.tolist() == both.mean(axis=0).tolist()
    assert (found.simultaneous >= 2 * found.frequency - 1 - 1e-12).all()


@pytest.mark.parametrize(
    ("threshold", "precision", "expected"),
    # z^2 t (1 - t) / d^2: the usual number of draws for a share (common practice)
    [(0.75, 0.1, 73), (0.9, 0.1, 35), (0.6, 0.05, 369), (1.0, 0.1, 2)],
)
def test_pairs_needed(threshold, precision, expected):
    assert pairs_needed(threshold, precision) == expected


def test_pairs_needed_are_known_before_any_fit():
    """Pairs whose halves agree are binomial draws: the interval is as wide as said."""
    n_pairs = pairs_needed(0.75, 0.1)
    picked = np.zeros((2 * n_pairs, 1), bool)
    picked[: 2 * round(0.75 * n_pairs)] = True
    frequency, low, high = frequency_intervals(picked)
    assert frequency[0] == pytest.approx(0.75, abs=0.01)
    assert 0.5 * (high - low)[0] == pytest.approx(0.1, abs=0.004)


@pytest.mark.parametrize("precision", [0.0, 1.0, -0.1])
def test_no_precision(precision):
    with pytest.raises(StudyFileError):
        pairs_needed(0.75, precision)


def test_convergence_ends_at_the_frequencies(draw):
    drawn = draw(52, 60, 100, signals=4, difference=1.0, n_pairs=30)
    found = drawn.select(markers_per_subsample=6)
    record = record_convergence(found)
    assert record.pairs[0] >= 1
    assert record.pairs[-1] == 30
    expected = found.frequency[record.features]
    assert record.frequency[-1] == pytest.approx(expected, abs=1e-15)
    half = found.picked[: 2 * record.pairs[3]].mean(axis=0)
    assert record.frequency[3] == pytest.approx(half[record.features], abs=1e-15)
    assert record.shortlist_size[-1] == len(found.shortlist)
    undecided = (found.low < 0.75) & (found.high >= 0.75)
    assert sorted(record.undecided) == np.flatnonzero(undecided).tolist()


def test_words_of_convergence(draw):
    clear = draw(53, 100, 60, signals=1, difference=5.0, n_pairs=40)
    settled = record_convergence(clear.select(markers_per_subsample=1))
    assert settled.enough
    assert "are enough" in settled.sentence()
    few = draw(54, 60, 60, signals=5, difference=1.0, n_pairs=4)
    open_still = record_convergence(few.select(markers_per_subsample=5))
    assert len(open_still.undecided)
    assert not open_still.enough
    assert "before the next run" in open_still.sentence()
