"""What must hold for every programme (the panelkit cost model, section 4)."""

from dataclasses import replace
from decimal import Decimal
from fractions import Fraction

import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from panelkit.config import platform_section, programme_section
from panelkit.costing import PanelPricer, cheapest_split, programme_cost
from panelkit.errors import NoPanelError, StudyFileError
from panelkit.records import AssayPrice, PriceList

MANY = settings(max_examples=400, deadline=None)
CENTS = st.integers(0, 5000).map(lambda n: Decimal(n) / 100)
FINE = st.integers(0, 50_000).map(lambda n: Decimal(n) / 10_000)
RATES = st.integers(0, 40).map(lambda n: Decimal(n) / 100)

PROGRAMMES = st.fixed_dictionaries(
    {
        "currency": st.sampled_from(["EUR", "JPY", "BHD"]),
        "samples": st.integers(1, 700),
        "horizon_months": st.sampled_from([1, 12, 30]),
        "deliveries": st.integers(1, 9),
        "repeat_rate": RATES,
        "repeat_mode": st.sampled_from(["none", "once", "until"]),
        "collection_cost": CENTS,
    }
)
PLATFORMS = st.fixed_dictionaries(
    {
        "positions": st.integers(12, 400),
        "plex": st.integers(1, 8),
        "replicates": st.integers(1, 3),
        "controls_per_pool": st.integers(0, 3),
        "controls_per_run": st.integers(0, 3),
        "groups": st.sampled_from(["auto", "each", 1, 2]),
        "setup": CENTS,
        "pool_setup": CENTS,
        "run_cost": CENTS,
        "position_cost": FINE,
        "sample_cost": CENTS,
        "prep_positions": st.sampled_from([0, 5, 40]),
        "prep_cost": CENTS,
        "overage": RATES,
        "lot_months": st.sampled_from([0, 6]),
        "lot_cost": CENTS,
    }
)


@st.composite
def assays(draw, most=8):
    """Rows of every way to sell: flat, packs, tiers; classes and references."""
    rows = []
    for number in range(draw(st.integers(1, most))):
        row = {
            "marker": f"m{number}",
            "dev": draw(CENTS),
            "fail_rate": draw(RATES) / 10,
            "class": draw(st.sampled_from("aab")),
        }
        way = draw(st.sampled_from(["test", "test", "pack", "tiers"]))
        if way == "test":
            row["test"] = draw(FINE)
        elif way == "pack":
            row |= {"pack": draw(st.integers(1, 900)), "pack_price": draw(CENTS)}
        else:
            first = draw(st.integers(1, 500))
            row["tiers"] = f"1:{first / 100};400:{first / 125};900:{first / 200}"
        rows.append(AssayPrice.from_row(row, where="row"))
    if draw(st.booleans()):
        rows.append(
            AssayPrice.from_row(
                {"marker": "r", "role": "reference", "dev": 1, "test": draw(FINE)},
                where="row",
            )
        )
    return rows


def priced(programme, platform, rows):
    try:
        return programme_cost(programme, platform, rows)
    except (NoPanelError, StudyFileError):
        assume(False)  # a sample does not fit: nothing to compare
        raise


def check_more_never_costs_less(programme, platform, rows, more):
    """Invariant 1: samples, a marker at the end, deliveries."""
    cost = priced(programme, platform, rows)
    larger = {**programme, "samples": programme["samples"] + more}
    assert priced(larger, platform, rows).total >= cost.total
    last = AssayPrice.from_row(
        {"marker": "z", "dev": 0, "test": 0, "class": "b"}, where="row"
    )
    references = [row for row in rows if row.role == "reference"]
    own = [row for row in rows if row.role == "marker"]
    wider = priced(programme, platform, [*own, last, *references])
    assert wider.total >= cost.total
    once = priced({**programme, "deliveries": 1}, platform, rows)
    assert cost.total >= once.total


def check_auto_is_the_best_spread_and_lines_add_up(programme, platform, rows):
    """Invariants 2 and 4."""
    auto = priced(programme, {**platform, "groups": "auto"}, rows)
    for groups in ("each", 1, 2, 3):
        try:
            fixed = programme_cost(programme, {**platform, "groups": groups}, rows)
        except NoPanelError:
            continue
        assert auto.total <= fixed.total
    assert sum(line.amount for line in auto.lines) == auto.total
    assert auto.one_off + auto.recurring == auto.total
    half = Fraction(1, 2 * 10 ** -auto.total.as_tuple().exponent)
    gap = abs(Fraction(auto.cost_per_result) * auto.results - Fraction(auto.total))
    assert gap <= half * auto.results
    assert auto.control_positions <= auto.filled_positions
    assert 0 < auto.fill <= 1


def check_order_doubling_and_currency(programme, platform, rows, random):
    """Invariants 5 to 8."""
    cost = priced(programme, platform, rows)
    assert priced(programme, platform, rows).to_frame().equals(cost.to_frame())
    alike = [
        replace(row, dev=Decimal(7), test=Decimal("0.13"), pack=None, pack_price=None,
                tiers=(), pool_class="", fail_rate=Decimal("0.01"))
        for row in rows
    ]  # fmt: skip
    mixed = alike[:]
    random.shuffle(mixed)
    there = priced(programme, platform, alike)
    assert priced(programme, platform, mixed).total == there.total

    def twice(section, keys):
        return {k: 2 * v if k in keys else v for k, v in section.items()}

    money = {"setup", "pool_setup", "run_cost", "position_cost", "sample_cost",
             "prep_cost", "lot_cost", "collection_cost"}  # fmt: skip
    doubled = [
        replace(
            row,
            dev=2 * row.dev,
            test=None if row.test is None else 2 * row.test,
            pack_price=None if row.pack_price is None else 2 * row.pack_price,
            tiers=tuple((q, 2 * p) for q, p in row.tiers),
        )
        for row in rows
    ]
    both = priced(twice(programme, money), twice(platform, money), doubled)
    unit = Decimal(1).scaleb(cost.total.as_tuple().exponent)
    if both.groups == cost.groups:
        for one, two in zip(cost.lines, both.lines, strict=True):
            assert abs(two.amount - 2 * one.amount) <= unit  # a half unit, twice
    yen = priced({**programme, "currency": "JPY"}, platform, rows)
    assert abs(yen.total - cost.total) <= Decimal(len(cost.lines))


CHECKS = [
    (check_more_never_costs_less, (st.integers(1, 60),)),
    (check_auto_is_the_best_spread_and_lines_add_up, ()),
    (check_order_doubling_and_currency, (st.randoms(use_true_random=False),)),
]


@pytest.mark.parametrize(("check", "more"), CHECKS)
def test_invariants(check, more):
    MANY(given(PROGRAMMES, PLATFORMS, assays(), *more)(check))()


@pytest.mark.slow
@pytest.mark.parametrize(("check", "more"), CHECKS)
def test_invariants_of_thousands(check, more):
    thousands = settings(max_examples=4000, deadline=None)
    thousands(given(PROGRAMMES, PLATFORMS, assays(), *more)(check))()


@settings(max_examples=120, deadline=None)
@given(PLATFORMS, PLATFORMS, assays(4), st.lists(FINE, min_size=4, max_size=4))
def test_a_split_is_the_best_of_all(one, two, rows, tests):
    """Against every assignment of markers to two platforms."""
    programme = programme_section(
        {"currency": "EUR", "samples": 40, "collection_cost": 3}
    )
    platforms = {"a": platform_section(one), "b": platform_section(two)}
    own = [row for row in rows if row.role == "marker"]
    prices = PriceList(
        tuple(
            [replace(row, platform="a") for row in own]
            + [
                AssayPrice(row.marker, "b", dev=row.dev, test=tests[i])
                for i, row in enumerate(own)
            ]
        )
    )
    pricer = PanelPricer(programme, platforms, prices)
    names = [row.marker for row in own]
    best = None
    for bits in range(2 ** len(names)):
        parts = []
        for place, wanted in (("a", 0), ("b", 1)):
            here = [n for i, n in enumerate(names) if bits >> i & 1 == wanted]
            if here:
                parts.append(pricer.attempt(here, place))
        if any(isinstance(part, Exception) for part in parts):
            continue
        total = sum(p.total for p in parts) - 120 * (len(parts) - 1)
        best = total if best is None else min(best, total)
    try:
        found = cheapest_split(pricer, names)
    except StudyFileError:
        return
    assert (found is None) is (best is None)
    if found is not None:
        assert found.total == best
        assert found.proved
        assert sorted(n for part in found.markers for n in part) == sorted(names)
        assert found.results <= 40
