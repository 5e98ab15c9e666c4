"""The tree of seeds and the number of threads."""

from itertools import pairwise

import numpy as np
import pytest

from panelkit.errors import UsageError
from panelkit.runtime import generator, thread_count


def draws(*place):
    return generator(*place).integers(0, 2**62, 4).tolist()


def test_same_place_same_draws():
    assert draws(1, "folds", 0) == draws(1, "folds", 0)


@pytest.mark.parametrize(
    "other",
    [
        (2, "folds", 0),
        (1, "folds", 1),
        (1, "pairs", 0),
        (1, "folds"),
        (1, "folds", 0, 0),
        (1, 0, "folds"),
        (1, "folds", "0"),
        (1,),
    ],
)
def test_another_place_other_draws(other):
    assert not set(draws(*other)) & set(draws(1, "folds", 0))


def test_places_do_not_run_together():
    assert draws(1, "ab", "c") != draws(1, "a", "bc")
    places = [(1, "fold", r, k) for r in range(30) for k in range(30)]
    assert len({tuple(draws(*place)) for place in places}) == 900


def test_neighbouring_places_are_uncorrelated():
    # 4 standard errors over 50 pairs of 2,000 normal draws
    streams = np.array(
        [generator(1, "subsample", k).normal(size=2000) for k in range(51)]
    )
    r = np.array([np.corrcoef(a, b)[0, 1] for a, b in pairwise(streams)])
    assert np.abs(r).max() < 4.0 / np.sqrt(2000)


# pinned with numpy 2.4.6, PCG64 from SeedSequence: the tree must never change
# silently, or a study would not repeat
PINNED = [
    (
        (1, "folds", 0),
        [
            3788843728706644328,
            2470547292096025326,
            4439685118323083143,
            139213283701455540,
        ],
    ),
    (
        (20240229, "pairs", 3, "inner", 2),
        [
            2590943618201521407,
            2946417762458770087,
            1932266635809428834,
            274709391281458374,
        ],
    ),
]


@pytest.mark.parametrize(("place", "expected"), PINNED)
def test_tree_is_what_it_was(place, expected):
    assert draws(*place) == expected


def test_global_generator_is_not_touched():
    state = np.random.get_state()[1].copy()  # noqa: NPY002 - looked at, not used
    generator(1, "folds").normal(size=10)
    assert (np.random.get_state()[1] == state).all()  # noqa: NPY002


def test_numpy_integers_name_the_same_place():
    assert draws(1, "folds", np.int64(3)) == draws(1, "folds", 3)


def test_threads_asked_for_are_given():
    assert thread_count(3) == 3
    assert thread_count(1) == 1
    assert thread_count() >= 1


@pytest.mark.parametrize("asked", [0, -1])
def test_fewer_than_one_thread_is_refused(asked):
    with pytest.raises(UsageError) as caught:
        thread_count(asked)
    assert caught.value.code == "threads-out-of-range"


def test_threads_are_the_processors_of_this_process(monkeypatch):
    monkeypatch.setattr("os.sched_getaffinity", lambda _: {3, 5, 7}, raising=False)
    assert thread_count() == 3
    monkeypatch.delattr("os.sched_getaffinity", raising=False)
    monkeypatch.setattr("os.cpu_count", lambda: None)
    assert thread_count() == 1
