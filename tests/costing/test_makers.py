"""Makers propose panels from the candidates, first choice first."""

import dataclasses
from itertools import combinations

import numpy as np
import pytest

from panelkit.costing import MAKERS, Evidence, maker_named, register_maker
from panelkit.costing.makers.price_weighted import price_weights
from panelkit.errors import StudyFileError, UsageError


@pytest.fixture
def evidence():
    # candidates 8, 3, 5, 2: 3 and 5 tie in frequency, 2 and 8 tie in everything;
    # feature 0 beats them all and is no candidate
    frequency = np.zeros(10)
    t = np.zeros(10)
    frequency[[0, 8, 3, 5, 2]] = 1.0, 0.4, 0.9, 0.9, 0.4
    t[[0, 8, 3, 5, 2]] = 99.0, -2.0, 1.0, -3.0, 2.0
    return Evidence(
        np.array([8, 3, 5, 2]),
        frequency,
        t,
        price=np.full(10, 7.0),
        own=np.array([3, 2, 8, 5]),
    )


@pytest.mark.parametrize(
    ("name", "expected"),
    [
        ("frequency", [5, 3, 2, 8]),  # frequency, then |t|, then column
        ("univariate", [5, 2, 8, 3]),  # |t|, then column
    ],
)
def test_order_of_choice(name, expected, evidence):
    maker = maker_named(name)
    for size, panel in zip(range(1, 5), maker(evidence, range(1, 5)), strict=True):
        assert panel.tolist() == expected[:size]


@pytest.mark.parametrize("name", MAKERS)
def test_no_more_than_the_candidates(name, evidence):
    assert len(MAKERS[name](evidence, [50])[0]) == 4


@pytest.mark.parametrize("name", MAKERS)
def test_order_of_candidates_does_not_matter(name, evidence):
    other = dataclasses.replace(evidence, candidates=evidence.candidates[::-1])
    found = [
        [panel.tolist() for panel in MAKERS[name](e, [1, 3])] for e in (other, evidence)
    ]
    assert found[0] == found[1]


@pytest.mark.parametrize("name", ["frequency", "univariate", "groups"])
def test_smaller_panels_are_the_beginning_of_larger_ones(name, evidence):
    *smaller, largest = MAKERS[name](evidence, range(5))
    for size, panel in enumerate(smaller):
        assert panel.tolist() == largest[:size].tolist()


def test_unknown_maker_is_refused_with_the_known_ones():
    with pytest.raises(StudyFileError) as caught:
        maker_named("oracle")
    assert caught.value.code == "unknown-maker"
    assert "'oracle'" in caught.value.what
    assert "frequency" in caught.value.accepted


# companion groups


@pytest.fixture
def grouped(evidence):
    # 5 and 2 are companions; 3 is alone; 8 was not grouped
    group = np.full(10, -1)
    group[[5, 2, 3]] = 0, 0, 1
    shares = np.zeros(10)
    shares[[5, 2, 3]] = 0.95, 0.95, 0.9
    return dataclasses.replace(evidence, group=group, group_frequency=shares)


def by_groups(evidence, size=4):
    return MAKERS["groups"](evidence, [size])[0].tolist()


def test_one_member_of_each_group_before_any_second_one(grouped):
    assert by_groups(grouped) == [5, 3, 8, 2]


def test_among_companions_the_most_reliable_then_the_cheapest_leads(grouped):
    reliability = np.full(10, np.nan)
    reliability[[5, 2]] = 0.6, 0.9
    assert by_groups(dataclasses.replace(grouped, reliability=reliability), 1) == [2]
    price = np.full(10, 7.0)
    price[5] = 8.0
    assert by_groups(dataclasses.replace(grouped, price=price), 1) == [2]


# conditional choice


def additive(panels, worth):
    return np.array([-sum(worth[j] for j in panel) for panel in panels], float)


def test_forward_choice_and_swaps_find_the_pair_that_only_works_together():
    # alone 8 is best; 3 and 5 are worth most together
    def objective(panels):
        loss = additive(panels, {8: 3.0, 3: 1.0, 5: 1.0, 2: 0.5})
        return loss - 5.0 * np.array([{3, 5} <= set(p.tolist()) for p in panels])

    evidence = Evidence(
        np.array([8, 3, 5, 2]), np.zeros(10), np.zeros(10), objective=objective
    )
    one, two, three = MAKERS["forward"](evidence, [1, 2, 3])
    assert one.tolist() == [8]
    assert set(three.tolist()) == {3, 5, 8}
    assert set(two.tolist()) <= {8, 3, 5}  # no single swap leads to the pair


def test_trying_all_is_the_minimum_over_every_panel():
    draws = np.random.default_rng(0)
    table = {}

    def objective(panels):
        keys = [tuple(sorted(p.tolist())) for p in panels]
        for key in keys:
            if key not in table:
                table[key] = draws.normal()
        return np.array([table[key] for key in keys])

    features = np.arange(7)
    evidence = Evidence(features, np.ones(7), np.zeros(7), objective=objective)
    found = MAKERS["exhaustive"](evidence, [1, 2, 3])
    for size, panel in zip((1, 2, 3), found, strict=True):
        every = {key: table[key] for key in combinations(range(7), size)}
        assert tuple(sorted(panel.tolist())) == min(every, key=every.get)


# prices as penalties


@pytest.mark.parametrize(
    ("power", "expected"),
    [
        (0.0, [1, 1, 1, 1]),
        (0.5, [2.3784, 0.8409, 0.8409, 0.5946]),
        (1.0, [5.6569, 0.7071, 0.7071, 0.3536]),
    ],
)
def test_weights_follow_prices_around_their_geometric_mean(power, expected):
    # worked by hand: prices 80, 10, 10, 5 around 14.1421
    found = price_weights(np.array([80.0, 10, 10, 5]), power, clip=10.0)
    assert found == pytest.approx(expected, abs=5e-5)


def test_orthonormal_columns_enter_in_order_of_strength_over_weight():
    # soft threshold: |z| / w is 0.4204, 1.0703, 0.5946, 0.7568 at power 0.5
    strength = np.array([1.0, 0.9, 0.5, 0.45])

    def entry_order(weights):
        return np.argsort(-strength / weights, kind="stable")

    evidence = Evidence(
        np.arange(4),
        np.zeros(4),
        np.zeros(4),
        price=np.array([80.0, 10, 10, 5]),
        entry_order=entry_order,
    )
    assert MAKERS["price-weighted"](evidence, [4])[0].tolist() == [1, 3, 2, 0]


def test_unknown_and_free_markers_are_clipped_never_ignored():
    found = price_weights(np.array([4.0, 1.0, np.nan, 0.0, 4000.0]))
    assert found[2] == 1.0
    assert found[3] == 0.25
    assert found.max() == 4.0


def test_a_maker_that_weighs_prices_refuses_without_them(evidence):
    unpriced = dataclasses.replace(evidence, price=None)
    with pytest.raises(StudyFileError, match="nothing is priced"):
        MAKERS["price-weighted"](unpriced, [2])


def test_a_maker_from_outside_is_known_by_its_name():
    def first_columns(evidence, sizes):
        return [np.sort(evidence.candidates)[:size] for size in sizes]

    register_maker("first-columns", first_columns)
    try:
        assert maker_named("first-columns") is first_columns
        with pytest.raises(UsageError, match="already"):
            register_maker("first-columns", first_columns)
    finally:
        del MAKERS["first-columns"]
