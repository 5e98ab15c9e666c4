"""How many assays to order: exact, against scipy and against all sets."""

from decimal import Decimal
from fractions import Fraction
from itertools import combinations, product

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import stats

from panelkit.costing import choose_spares, order_count
from panelkit.costing.attrition import chance_of_at_least, landing_distribution
from panelkit.errors import UsageError
from panelkit.records import AssayPrice

CHANCES = st.lists(
    st.fractions(min_value=0, max_value=1, max_denominator=20), max_size=7
)


@settings(max_examples=200, deadline=None)
@given(CHANCES)
def test_distribution_is_that_of_all_outcomes(chances):
    """The definition: the sum over every outcome of all assays."""
    by_hand = [Fraction(0)] * (len(chances) + 1)
    for outcome in product((False, True), repeat=len(chances)):
        weight = Fraction(1)
        for landed, chance in zip(outcome, chances, strict=True):
            weight *= chance if landed else 1 - chance
        by_hand[sum(outcome)] += weight
    assert list(landing_distribution(chances)) == by_hand


def test_of_one_chance_it_is_the_binomial():
    chances = [Fraction(17, 20)] * 12
    for wanted in range(13):
        expected = stats.binom.sf(wanted - 1, 12, 0.85)
        assert float(chance_of_at_least(chances, wanted)) == pytest.approx(expected)


@pytest.mark.parametrize(
    ("success", "wanted", "probability"),
    [("0.85", 8, "0.95"), ("0.9", 12, "0.99"), ("0.5", 1, "0.9"), ("1", 5, "1")],
)
def test_order_count_is_the_smallest(success, wanted, probability):
    chance, level = Fraction(success), Fraction(probability)
    number = order_count(chance, wanted, level)
    assert chance_of_at_least([chance] * number, wanted) >= level
    assert chance_of_at_least([chance] * (number - 1), wanted) < level


def test_out_of_reach():
    with pytest.raises(UsageError) as caught:
        order_count(Fraction(1, 2), 1, Fraction(1))
    assert caught.value.code == "probability-out-of-reach"


def assay(name, chance=None, dev=None, backup_of=""):
    return AssayPrice(
        name,
        dev=None if dev is None else Decimal(dev),
        design_success=None if chance is None else Decimal(chance),
        backup_of=backup_of,
    )


def works(slots, taken, need):
    """The chance of enough, over all outcomes of panel and spares."""
    total = 0.0
    everything = [*slots, *taken]
    for outcome in product((False, True), repeat=len(everything)):
        weight, landed = 1.0, set()
        for each, ok in zip(everything, outcome, strict=True):
            chance = float(each.design_success)
            weight *= chance if ok else 1 - chance
            if ok:
                landed.add(each.marker)
        names = {each.marker for each in slots}
        filled = {n for n in names if n in landed}
        filled |= {t.backup_of for t in taken if t.marker in landed and t.backup_of}
        others = sum(t.marker in landed and not t.backup_of for t in taken)
        total += weight * (len(filled) + others >= need)
    return total


@settings(max_examples=60, deadline=None)
@given(
    st.lists(st.sampled_from(["0.5", "0.7", "0.9"]), min_size=1, max_size=3),
    st.lists(
        st.tuples(
            st.sampled_from(["0.5", "0.8", "0.95"]),
            st.integers(1, 4),
            st.sampled_from(["", "", "p0"]),
        ),
        max_size=4,
    ),
    st.sampled_from([0.6, 0.8, 0.95]),
)
def test_spares_are_the_cheapest_set_that_suffices(panel, spares, probability):
    slots = [assay(f"p{i}", chance, 10) for i, chance in enumerate(panel)]
    others = [
        assay(f"s{i}", chance, dev, backup)
        for i, (chance, dev, backup) in enumerate(spares)
    ]
    found = choose_spares(slots, others, Decimal(1), "EUR", probability=probability)
    costs = [
        sum(each.dev for each in taken)
        for size in range(len(others) + 1)
        for taken in combinations(others, size)
        if works(slots, taken, len(slots)) >= probability - 1e-12
    ]
    chosen = [each for each in others if each.marker in found.spares]
    assert found.reached == pytest.approx(works(slots, chosen, len(slots)))
    assert found.reached_without == pytest.approx(works(slots, [], len(slots)))
    assert found.enough is bool(costs)
    if costs:
        assert found.spend == 10 * len(slots) + min(costs)
        assert found.proved
    assert found.spend_one_by_one <= found.spend
    assert found.order == len(slots) + len(chosen)


def test_expected_spend_of_one_spare():
    # By hand: two assays of 0.9; the spare, 500, is ordered when one of them fails
    panel = [assay("a", "0.9", 100), assay("b", "0.9", 100)]
    found = choose_spares(panel, [assay("s", "0.9", 500)], Decimal(1), "EUR",
                          probability=0.95)  # fmt: skip
    assert found.spares == ("s",)
    assert found.reached_without == pytest.approx(0.81)
    assert found.reached == pytest.approx(0.972)
    assert found.spend == 700
    assert found.spend_one_by_one == Decimal("295.00")  # 200 + 0.19 x 500


def test_a_platforms_chance_and_missing_quotes():
    panel = [assay("a"), assay("b", "1")]
    found = choose_spares(panel, [assay("s")], Decimal("0.9"), "EUR", probability=0.95)
    assert found.reached_without == pytest.approx(0.9)
    assert found.spares == ("s",)
    assert found.spend is None


@pytest.mark.parametrize(("wanted", "probability"), [(0, 0.9), (5, 0.9), (1, 0.0)])
def test_senseless_demands_are_refused(wanted, probability):
    with pytest.raises(UsageError) as caught:
        choose_spares([assay("a", "0.9", 1)], [], Decimal(1), "EUR", wanted=wanted,
                      probability=probability)  # fmt: skip
    assert caught.value.code == "spares-refused"
