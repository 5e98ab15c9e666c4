"""The exact cover and the choice of kits against brute force; what is refused."""

from decimal import Decimal
from fractions import Fraction
from itertools import combinations

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from panelkit import cheapest_cover
from panelkit.config import (
    kit_sections,
    platform_section,
    programme_section,
    read_kits,
)
from panelkit.costing import PanelPricer, programme_cost
from panelkit.costing import cover as cover_module
from panelkit.costing.kits import kit_units
from panelkit.errors import NoPanelError, StudyFileError, UsageError
from panelkit.records import AssayPrice, PriceList

MARKERS = "ABCDEF"


@st.composite
def cover_problems(draw):
    wanted = draw(st.lists(st.sampled_from(MARKERS), min_size=1, unique=True))
    kits = [
        {
            "id": f"K{number}",
            "markers": sorted(markers),
            "cost": draw(st.integers(0, 12)),
        }
        for number, markers in enumerate(
            draw(
                st.lists(
                    st.sets(st.sampled_from([*MARKERS, "Y", "Z"]), min_size=1),
                    max_size=6,
                )
            )
        )
    ]
    singles = {
        name: draw(st.integers(0, 9))
        for name in wanted
        if draw(st.booleans()) or not any(name in kit["markers"] for kit in kits)
    }
    return wanted, kits, singles


def every_cover(wanted, kits, singles):
    options = [(k["id"], set(k["markers"]), k["cost"], True) for k in kits]
    options += [(name, {name}, cost, False) for name, cost in singles.items()]
    for size in range(len(options) + 1):
        for taken in combinations(options, size):
            if set(wanted) <= set().union(*(each[1] for each in taken)):
                yield taken


def key_of(taken, wanted, step=0):
    unwanted = sum(len(each[1] - set(wanted)) for each in taken)
    cost = sum(each[2] for each in taken) + step
    return cost, len(taken), unwanted, tuple(sorted(each[0] for each in taken))


@settings(max_examples=300, deadline=None)
@given(cover_problems())
def test_cover_is_the_first_of_all_covers(problem):
    """Cost, then units, unwanted analytes and ids: all four keys of section 3a."""
    wanted, kits, singles = problem
    best = min(key_of(taken, wanted) for taken in every_cover(*problem))
    cover = cheapest_cover(wanted, kits, singles)
    assert cover.proved
    assert cover.cost == best[0] == cover.bound
    assert tuple(sorted(cover.kits + cover.singles)) == best[3]
    assert len(cover.unwanted) == best[2]
    assert cover.greedy_cost is None or cover.greedy_cost >= cover.cost
    fewer = wanted[1:]
    assert not fewer or cheapest_cover(fewer, kits, singles).cost <= cover.cost


@settings(max_examples=150, deadline=None)
@given(cover_problems(), st.integers(1, 3), st.lists(st.integers(0, 9), max_size=3))
def test_cover_with_steps_of_pools(problem, slots, rises):
    wanted, kits, singles = problem
    steps = [0]
    for rise in rises + [1] * 6:
        steps.append(steps[-1] + rise)
    least = min(
        key_of(taken, wanted, steps[-(-sum(not t[3] for t in taken) // slots)])
        for taken in every_cover(*problem)
    )
    cover = cheapest_cover(wanted, kits, singles, pool_costs=steps, pool_slots=slots)
    assert cover.proved
    assert cover.cost == least[0]
    assert cover.pools == -(-len(cover.singles) // slots)


@settings(max_examples=100, deadline=None)
@given(cover_problems(), st.integers(0, 8))
def test_cover_under_exclusions_and_volume(problem, volume):
    wanted, kits, singles = problem
    for number, kit in enumerate(kits):
        kit["volume"] = number + 1
    excluded = [("K0", "K1"), ("K1", "K2")]
    volumes = {kit["id"]: kit["volume"] for kit in kits}

    def allowed(taken):
        ids = {each[0] for each in taken if each[3]}
        apart = not any(set(pair) <= ids for pair in excluded)
        return apart and sum(volumes[name] for name in ids) <= volume

    keys = [key_of(t, wanted) for t in every_cover(*problem) if allowed(t)]
    if not keys:
        with pytest.raises(NoPanelError) as caught:
            cheapest_cover(wanted, kits, singles, excluded=excluded, volume=volume)
        assert caught.value.code == "no-cover"
        return
    cover = cheapest_cover(wanted, kits, singles, excluded=excluded, volume=volume)
    assert cover.cost == min(keys)[0]
    assert tuple(sorted(cover.kits + cover.singles)) == min(keys)[3]


def test_amounts_are_exact():
    cover = cheapest_cover(
        "AB", [{"id": "K", "markers": ["A"], "cost": "0.1"}], {"B": Decimal("0.2")}
    )
    assert cover.cost == Decimal("0.3")
    third = cheapest_cover("A", [], {"A": Fraction(1, 4)})
    assert third.cost == Decimal("0.25")


def test_a_cover_that_is_not_proved_says_so(monkeypatch):
    """The solver stops at its time limit with a cover in hand."""
    solve = cover_module.milp

    def stopped(*arguments, **options):
        answer = solve(*arguments, **options)
        answer.status, answer.mip_dual_bound = 1, 4000.0
        return answer

    monkeypatch.setattr(cover_module, "milp", stopped)
    kits = [{"id": "K", "markers": ["A", "B"], "cost": 6500}]
    cover = cheapest_cover("AB", kits, {"A": 5000, "B": 5000})
    assert (cover.proved, cover.status) == (False, "not proved")
    assert (cover.cost, cover.bound) == (6500, 4000)


def test_no_time_is_no_cover():
    with pytest.raises(NoPanelError) as caught:
        cheapest_cover("A", [], {"A": 1}, time_limit_s=0.0)
    assert caught.value.code == "no-cover"


@pytest.mark.parametrize(
    ("arguments", "kind", "code"),
    [
        ((["A"], [], {}), NoPanelError, "marker-not-sold"),
        ((["A"], [{"id": "K"}], {}), UsageError, "kit-incomplete"),
        ((["A"], [{"id": "K", "markers": "A", "cost": 1}], {}), UsageError,
         "kit-incomplete"),
        ((["A"], [], {"A": 0.1}), UsageError, "amount-not-exact"),
        ((["A"], [], {"A": -1}), UsageError, "amount-not-exact"),
        ((["A"], [], {"A": "cheap"}), UsageError, "amount-not-exact"),
        ((["A"], [], {"A": 10**16}), UsageError, "amounts-too-fine"),
        ((["A"], [{"id": "K", "markers": ["A"], "cost": 1}] * 2, {}), UsageError,
         "kit-twice"),
    ],
)  # fmt: skip
def test_covers_are_refused(arguments, kind, code):
    with pytest.raises(kind) as caught:
        cheapest_cover(*arguments)
    assert caught.value.code == code


def test_steps_need_a_size_of_pools():
    with pytest.raises(UsageError) as caught:
        cheapest_cover("A", [], {"A": 1}, pool_costs=[0, 5])
    assert caught.value.code == "pool-slots-missing"


# --- kits of a platform ---------------------------------------------------------


def kits_of(*tables):
    return kit_sections({"tests_per_unit": 10, **table} for table in tables)


@pytest.mark.parametrize(
    ("keys", "samples", "deliveries", "lots", "units"),
    [
        # F14 by hand: 100 samples, 40 tests
        ({}, 100, 1, 1, 3),
        ({}, 100, 4, 1, 4),  # 25 each: one unit a delivery
        ({}, 101, 4, 1, 4),
        ({"splittable": True}, 100, 4, 1, 3),
        ({"splittable": True}, 100, 4, 2, 4),  # two purchases of 50
        ({}, 100, 1, 2, 4),
    ],
)
def test_units_of_a_kit(keys, samples, deliveries, lots, units):
    kit = kit_sections(
        [{"id": "K", "markers": ["A"], "unit_price": 1, "tests_per_unit": 40, **keys}]
    )[0]
    assert kit_units(kit, samples, deliveries, lots) == units


def test_units_bought_up_and_shelf_life():
    # By hand: 12 units of 10 tests; from 15 on they cost 70 each, so 15 are bought
    cost = programme_cost(
        {"currency": "EUR", "samples": 120, "repeat_mode": "none"},
        {"positions": 96},
        [{"marker": "A", "status": "no"}],
        kits=kits_of(
            {"id": "K", "markers": ["A", "B"], "unit_price": [[1, 100], [15, 70]],
             "once": 7}
        ),
    )  # fmt: skip
    assert cost.total == 15 * 70 + 7
    assert (cost.kits[0].units, cost.kits[0].unwanted) == (12, ("B",))
    assert (cost.one_off, cost.recurring) == (7, 1050)
    assert cost.unwanted == ("B",)


@settings(max_examples=150, deadline=None)
@given(
    st.lists(
        st.tuples(
            st.sets(st.sampled_from("ABCDE"), min_size=1),
            st.integers(0, 30),
            st.integers(0, 4),
        ),
        max_size=5,
    ),
    st.integers(1, 3),
    st.integers(0, 30),
    st.lists(st.integers(0, 12), min_size=5, max_size=5),
)
def test_choice_of_kits_against_all_sets(table, plex, run_cost, tests):
    """Every set of kits, with the rest priced by itself: the definition."""
    kits = kits_of(
        *(
            {"id": f"K{i}", "markers": sorted(m), "unit_price": price, "once": once}
            for i, (m, price, once) in enumerate(table)
        )
    )
    programme = {"currency": "EUR", "samples": 25, "repeat_mode": "none"}
    platform = {"positions": 12, "plex": plex, "run_cost": run_cost, "setup": 11}
    rows = [
        {"marker": m, "dev": 3, "test": test}
        for m, test in zip("ABCDE", tests, strict=True)
    ]
    best = None
    for size in range(len(kits) + 1):
        for taken in combinations(kits, size):
            covered = set().union(*(kit.markers for kit in taken))
            left = [row for row in rows if row["marker"] not in covered]
            total = sum(3 * kit.unit_price + kit.once for kit in taken)
            if left:
                total += programme_cost(programme, platform, left).total
            if best is None or total < best:
                best = total
    cost = programme_cost(programme, platform, rows, kits=kits)
    assert cost.total == best
    assert cost.proved
    assert sum(line.amount for line in cost.lines) == cost.total
    covered = {name for kit in cost.kits for name in kit.covers}
    assert covered | set(cost.assays) == set("ABCDE")
    assert not covered & set(cost.assays)


def test_kits_that_exclude_each_other_and_volume():
    tables = [
        {
            "id": "K1",
            "markers": ["A"],
            "unit_price": 1,
            "volume": 3,
            "excludes": ["K2"],
        },
        {"id": "K2", "markers": ["B"], "unit_price": 1, "volume": 3},
        {"id": "K3", "markers": ["A", "B"], "unit_price": 9, "volume": 5},
    ]
    tables[0]["excludes"] = ["K2"]
    rows = [{"marker": m, "status": "no"} for m in "AB"]
    programme = {"currency": "EUR", "samples": 10, "repeat_mode": "none"}
    cost = programme_cost(programme, {"positions": 9}, rows, kits=kits_of(*tables))
    assert [kit.kit for kit in cost.kits] == ["K3"]
    tables[0].pop("excludes")
    cost = programme_cost(programme, {"positions": 9}, rows, kits=kits_of(*tables))
    assert [kit.kit for kit in cost.kits] == ["K1", "K2"]
    little = {**programme, "sample_volume": 5}
    cost = programme_cost(little, {"positions": 9}, rows, kits=kits_of(*tables))
    assert [kit.kit for kit in cost.kits] == ["K3"]
    with pytest.raises(NoPanelError) as caught:
        programme_cost({**programme, "sample_volume": 4}, {"positions": 9}, rows,
                       kits=kits_of(*tables))  # fmt: skip
    assert caught.value.code == "marker-cannot-be-assayed"


def test_pools_stay_within_the_volume():
    rows = [{"marker": m, "dev": 0, "test": 0} for m in "ABC"]
    programme = {"currency": "EUR", "samples": 1, "sample_volume": "2.5"}
    with pytest.raises(NoPanelError) as caught:
        programme_cost(programme, {"positions": 9, "pool_volume": 1}, rows)
    assert caught.value.code == "sample-volume-exceeded"
    cost = programme_cost(programme, {"positions": 9, "pool_volume": 1}, rows[:2])
    assert cost.pools == 2


@pytest.mark.parametrize(
    ("text", "code"),
    [
        ("[kit]\nid = 'K'", "kit-unreadable"),
        ("[[kit]]\nid = 'K'\nmarkers = ['A']\nunit_price = 1", "key-missing"),
        ("[[kit]]\nid = ''\nmarkers = ['A']", "value-refused"),
        ("[[kit]]\nid = 'K'\nmarkers = ['A', 'A']", "value-refused"),
        ("[[kit]]\nid = 'K'\nmarkers = []", "value-refused"),
        ("[[kit]]\nid = 'K'\nmarkers = ['A']\nunit_price = -1\ntests_per_unit = 1",
         "amount-negative"),
        ("[[kit]]\nid = 'K'\nmarkers = ['A']\nunit_price = 1\ntests_per_unit = 0",
         "value-refused"),
        ("[[kit]]\nid = 'K'\nmarkers = ['A']\nunit_price = 1\ntests_per_unit = 1\n" * 2,
         "kit-twice"),
        ("[[kit]]\nid = 'K'\nmarkers = ['A']\nunit_price = 1\ntests_per_unit = 1\n"
         "excludes = ['L']", "kit-unknown"),
        ("[[kit]]\nid = 'K'\nmarkers = ['A']\nunit_price = 1\ntests_per_unit = 1\n"
         "price = 1", "key-unknown"),
    ],
)  # fmt: skip
def test_kit_files_are_refused(tmp_path, text, code):
    path = tmp_path / "kits.toml"
    path.write_text(text)
    with pytest.raises(StudyFileError) as caught:
        read_kits(path)
    assert caught.value.code == code
    assert str(path) in caught.value.where


def test_lists_by_analyte():
    """Two probes of one analyte: each takes its row, and a kit of it holds both."""
    rows = (
        AssayPrice.from_row(
            {"marker": "GENE", "platform": "p", "dev": 5, "test": 1}, where="row"
        ),
        AssayPrice.from_row(
            {"marker": "probe2", "platform": "p", "dev": 7, "test": 1}, where="row"
        ),
    )
    analytes = {"probe1": "GENE", "probe2": "GENE", "probe3": "OTHER"}
    prices = PriceList(rows, analytes=analytes)
    found = prices.for_panel(["probe1", "probe2", "probe3"], "p")
    assert {row.marker: row.dev for row in found} == {
        "probe1": 5,
        "probe2": 7,  # its own row goes before that of its analyte
        "probe3": None,
    }
    kit = {"id": "K", "markers": ["GENE", "X"], "unit_price": 1, "tests_per_unit": 99}
    pricer = PanelPricer(
        programme_section({"currency": "EUR", "samples": 10, "repeat_mode": "none"}),
        {"p": platform_section({"positions": 96})},
        prices,
        kit_sections([kit]),
    )
    cost = pricer.costs(["probe1", "probe2"])[0]
    assert cost.total == 1
    assert set(cost.kits[0].covers) == {"probe1", "probe2"}
    assert cost.kits[0].unwanted == ("X",)
