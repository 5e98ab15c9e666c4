"""Makers propose panels from the candidates, first choice first."""

import numpy as np
import pytest

from panelkit.costing import MAKERS, Evidence, maker_named
from panelkit.errors import StudyFileError


@pytest.fixture
def evidence():
    # candidates 8, 3, 5, 2: 3 and 5 tie in frequency, 2 and 8 tie in everything;
    # feature 0 beats them all and is no candidate
    frequency = np.zeros(10)
    t = np.zeros(10)
    frequency[[0, 8, 3, 5, 2]] = 1.0, 0.4, 0.9, 0.9, 0.4
    t[[0, 8, 3, 5, 2]] = 99.0, -2.0, 1.0, -3.0, 2.0
    return Evidence(np.array([8, 3, 5, 2]), frequency, t)


@pytest.mark.parametrize(
    ("name", "expected"),
    [
        ("frequency", [5, 3, 2, 8]),  # frequency, then |t|, then column
        ("univariate", [5, 2, 8, 3]),  # |t|, then column
    ],
)
def test_order_of_choice(name, expected, evidence):
    maker = maker_named(name)
    for size in range(1, 5):
        assert maker(evidence, size).tolist() == expected[:size]


@pytest.mark.parametrize("name", MAKERS)
def test_no_more_than_the_candidates(name, evidence):
    assert len(MAKERS[name](evidence, 50)) == 4


@pytest.mark.parametrize("name", MAKERS)
def test_order_of_candidates_does_not_matter(name, evidence):
    other = Evidence(evidence.candidates[::-1], evidence.frequency, evidence.t)
    for size in (1, 3):
        assert (
            MAKERS[name](other, size).tolist() == MAKERS[name](evidence, size).tolist()
        )


@pytest.mark.parametrize("name", MAKERS)
def test_smaller_panels_are_the_beginning_of_larger_ones(name, evidence):
    largest = MAKERS[name](evidence, 4).tolist()
    for size in range(5):
        assert MAKERS[name](evidence, size).tolist() == largest[:size]


def test_unknown_maker_is_refused_with_the_known_ones():
    with pytest.raises(StudyFileError) as caught:
        maker_named("oracle")
    assert caught.value.code == "unknown-maker"
    assert "'oracle'" in caught.value.what
    assert "frequency" in caught.value.accepted
