"""The worked examples of the panelkit cost model that need more than one panel's cost.

EX1 to EX3, EX9 to EX11, EX17, EX18, EX20, EX21 (a) and EX23 are in
test_programme_cost.py, EX16 and EX19 in tests/metrics/test_assay_performance.py.
"""

from decimal import Decimal
from fractions import Fraction
from functools import cache
from itertools import combinations
from math import sqrt

import numpy as np
import pytest
from scipy import stats

from panelkit import cheapest_cover, fit_paths
from panelkit.config import kit_sections, platform_section, programme_section
from panelkit.costing import (
    PanelPricer,
    VerificationPlan,
    break_even_hint,
    break_even_price,
    break_even_volume,
    cheapest_backups,
    development_cost,
    drivers,
    next_step_down,
    payback_months,
    programme_cost,
    staircase,
)
from panelkit.costing.attrition import spare_pays
from panelkit.costing.lost_markers import (
    expected_area,
    overtaking_chance,
    worst_single_loss,
)
from panelkit.costing.panel_rules import (
    PanelFigures,
    best_within_budget,
    cheapest_first,
    cost_accuracy_front,
    not_worse,
    price_of_accuracy,
    within_one_se,
)
from panelkit.metrics import corrected_se, naive_se
from panelkit.metrics.assay_noise import log2_sd_from_cv
from panelkit.records import AssayPrice, Conflict, Conflicts, PriceList


def rows(platform, names, **cells):
    return [
        AssayPrice.from_row(
            {"marker": name, "platform": platform, "status": "ok", **cells},
            where="row",
        )
        for name in names
    ]


def names(prefix, count):
    return [f"{prefix}{number:02d}" for number in range(1, count + 1)]


# --- EX3: steps -----------------------------------------------------------------

BEADS = {
    "positions": 96,
    "plex": 12,
    "replicates": 2,
    "controls_per_pool": 20,
    "groups": "each",
    "setup": 1000,
    "pool_setup": 1500,
    "run_cost": "420.00",
    "sample_cost": "6.00",
}


@pytest.fixture
def beads():
    programme = programme_section(
        {"currency": "EUR", "samples": 300, "repeat_mode": "none"}
    )
    prices = PriceList(tuple(rows("beads", names("p", 25), dev="600", test="1.10")))
    return PanelPricer(programme, {"beads": platform_section(BEADS)}, prices)


def test_marginal_costs_and_the_next_step_down(beads):
    # EX3 and F15 to F17
    stairs = staircase(beads, names("p", 25), "beads")
    assert [str(stairs[k - 1].total) for k in (11, 12, 13, 14, 24, 25)] == [
        "23456.00", "24892.00", "31188.00", "32624.00", "46984.00", "53280.00",
    ]  # fmt: skip
    marginal = {stair.size: str(stair.marginal) for stair in stairs}
    assert [marginal[k] for k in (12, 13, 14, 25)] == [
        "1436.00", "6296.00", "1436.00", "6296.00",
    ]  # fmt: skip
    assert [stair.size for stair in stairs if stair.step] == [13, 25]
    assert stairs[12].step == "1 pool, 8 runs"
    down = next_step_down(beads, names("p", 14), "beads")
    assert (down.remove, str(down.saving)) == (2, "7732.00")
    assert down.markers == ("p13", "p14")
    one = next_step_down(beads, names("p", 13), "beads")
    assert (one.remove, str(one.saving)) == (1, "6296.00")
    assert next_step_down(beads, names("p", 12), "beads") is None


def test_savings_are_no_shares(beads):
    # F16: 13 x 6,296.00 = 81,848.00 against a total of 31,188.00
    found = drivers(beads, names("p", 13), "beads")
    assert {str(each.saving) for each in found} == {"6296.00"}
    assert sum(each.saving for each in found) == Decimal("81848.00")
    assert {(str(e.own_one_off), str(e.own_reagent)) for e in found} == {
        ("600.00", "836.00")
    }


# --- EX4: pools -----------------------------------------------------------------


def pools(cells, plex, conflicts=()):
    assays = [
        {"marker": f"m{i}", "dev": 0, "test": 0, **each} for i, each in enumerate(cells)
    ]
    pairs = Conflicts(tuple(Conflict(f"m{a}", f"m{b}") for a, b in conflicts))
    cost = programme_cost(
        {"currency": "EUR", "samples": 1},
        {"positions": 96, "plex": plex},
        assays,
        conflicts=pairs,
    )
    return cost.pools


CYCLE = [(0, 1), (1, 2), (2, 3), (3, 4), (4, 0)]


@pytest.mark.parametrize(
    ("cells", "plex", "conflicts", "expected"),
    [
        ([{"class": c} for c in "aaaaaaabbbbcc"], 8, (), 3),
        ([{"channel": c} for c in "AAABBC"], 4, (), 3),
        ([{}] * 5, 3, CYCLE, 3),
        ([{}] * 5, 3, CYCLE[:4], 2),
        ([{"slots": s} for s in (3, 3, 2, 2, 2)], 6, (), 2),
        ([{"slots": s} for s in (4, 4, 4)], 6, (), 3),
    ],
)
def test_pools_under_classes_channels_conflicts_and_slots(
    cells, plex, conflicts, expected
):
    # EX4, all rows
    assert pools(cells, plex, conflicts) == expected


# --- EX5 and EX8: kits ----------------------------------------------------------

KITS = [
    ("K1", "ABCD", 500, 900),
    ("K2", "ABE", 400, 700),
    ("K3", "CDF", 400, 725),
    *((f"single {m}", m, 700, 200) for m in "ABCD"),
    ("single E", "E", 900, 250),
    ("single F", "F", 950, 250),
]


def kits_of(table):
    return kit_sections(
        {
            "id": name,
            "markers": list(markers),
            "once": once,
            "unit_price": unit,
            "tests_per_unit": 40,
        }
        for name, markers, once, unit in table
    )


def kit_pricer(samples=150):
    programme = programme_section(
        {"currency": "EUR", "samples": samples, "repeat_mode": "none"}
    )
    nothing = [
        AssayPrice.from_row({"marker": m, "platform": "x", "status": "no"}, where="row")
        for m in "ABCDEF"
    ]
    return PanelPricer(
        programme,
        {"x": platform_section({"positions": 96})},
        PriceList(tuple(nothing)),
        kits_of(KITS),
    )


@pytest.mark.parametrize(
    ("samples", "total", "greedy"),
    [(150, "6500", "7950"), (40, "2225", None), (400, "15050", "16350")],
)
def test_greedy_is_wrong_and_exact_is_right(samples, total, greedy):
    # EX5; the cover and the pricer are different programs
    cost = kit_pricer(samples).costs(list("ABCDEF"))[0]
    assert cost.total == Decimal(total)
    assert [kit.kit for kit in cost.kits] == ["K2", "K3"]
    assert cost.proved
    units = -(-samples // 40)
    cover = cheapest_cover(
        "ABCDEF",
        [
            {"id": name, "markers": list(markers), "cost": once + unit * units}
            for name, markers, once, unit in KITS
        ],
    )
    assert (cover.cost, cover.proved) == (Decimal(total), True)
    assert cover.kits == ("K2", "K3")
    if greedy is not None:
        assert cover.greedy_cost == Decimal(greedy)


@pytest.mark.parametrize(
    ("left_out", "saving"),
    [("A", 0), ("B", 0), ("C", 0), ("D", 0), ("E", 450), ("F", 500), ("CD", 1350),
     ("CDF", 3300)],
)  # fmt: skip
def test_what_leaving_markers_out_saves(left_out, saving):
    # EX5: a kit keeps its price when one of its markers leaves the panel
    pricer = kit_pricer()
    rest = [m for m in "ABCDEF" if m not in left_out]
    saved = pricer.costs(list("ABCDEF"))[0].total - pricer.costs(rest)[0].total
    assert saved == saving
    if len(left_out) == 1:
        found = drivers(pricer, list("ABCDEF"), "x")
        assert {each.marker: each.saving for each in found}[left_out] == saving


@pytest.mark.parametrize(
    ("required", "table", "kits", "singles", "cost"),
    [
        ("ABCDEFGH", 2, ("K1",), "FGH", 10_900),
        ("ABCDEFGHI", 2, ("K1",), "FGHI", 11_600),
        ("ABCDEFGHIJ", 2, ("K1", "K2"), "FGH", 13_400),
        ("ABCDEFGHIJ", 1, ("K1",), "FGHIJ", 15_700),
    ],
)
def test_kits_beside_a_pool(required, table, kits, singles, cost):
    # EX5 (b)
    offered = [
        {"id": "K1", "markers": list("ABCDE"), "cost": 5000},
        {"id": "K2", "markers": list("IJ"), "cost": 2500},
    ][:table]
    cover = cheapest_cover(
        required,
        offered,
        dict.fromkeys(required, 700),
        pool_costs=[0, 3800, 7200, 10_400],
        pool_slots=4,
    )
    assert (cover.kits, cover.singles) == (kits, tuple(singles))
    assert (cover.cost, cover.status) == (cost, "proved optimal")


def test_ties_are_settled_in_a_fixed_order():
    # EX8
    table = [("K1", "AB", 450), ("K2", "CD", 450), ("K3", "AC", 450), ("K4", "BD", 450),
             ("K5", "ABCDE", 900), ("K6", "ABCD", 900)]  # fmt: skip
    offered = [{"id": i, "markers": list(m), "cost": c} for i, m, c in table]
    assert cheapest_cover("ABCD", offered).kits == ("K6",)
    assert cheapest_cover("ABCD", offered[:5]).kits == ("K5",)
    assert cheapest_cover("ABCD", offered[:4]).kits == ("K1", "K2")
    kits = kit_sections(
        {"id": i, "markers": list(m), "unit_price": c, "tests_per_unit": 1}
        for i, m, c in table
    )
    for n, expected in ((6, ["K6"]), (5, ["K5"]), (4, ["K1", "K2"])):
        cost = programme_cost(
            {"currency": "EUR", "samples": 1, "repeat_mode": "none"},
            {"positions": 96},
            [{"marker": m, "status": "no"} for m in "ABCD"],
            kits=kits[:n],
        )
        assert [kit.kit for kit in cost.kits] == expected
        assert cost.total == 900
    a = PanelFigures("m7 m8", 6, Decimal(12400), 0.861249)
    b = PanelFigures("m7 m9", 6, Decimal(12400), 0.861201)
    c = PanelFigures("c", 7, Decimal(12400), 0.8700)
    d = PanelFigures("d", 5, Decimal("12400.01"), 0.8800)
    assert cheapest_first([d, c, b, a]) == (a, b, c, d)


# --- EX6: break-even ------------------------------------------------------------


def test_break_even_crosses_several_times():
    # EX6
    def total_a(n):
        return Decimal(1800 + 660 * -(-n // 36) + 4 * n)

    def total_b(n):
        return Decimal(6000 + 420 * -(-n // 38) + 4 * n)

    found = break_even_volume(total_a, total_b, 1000)
    assert found.first == 541
    assert [(c.samples, c.cheaper) for c in found.crossings] == [
        (541, "B"), (571, "A"), (577, "B"), (609, "A"), (613, "B"),
    ]  # fmt: skip
    assert found.stays_from == 613
    assert {c.samples: c.difference for c in found.crossings} == {
        541: 60, 571: -360, 577: 300, 609: -120, 613: 540,
    }  # fmt: skip
    hint = break_even_hint(
        Fraction(1800), Fraction(660, 36) + 4, Fraction(6000), Fraction(420, 38) + 4
    )
    assert round(float(hint), 2) == 576.87


def test_no_crossing_is_missed():
    """Against every number of samples, on random step functions."""
    random = np.random.default_rng(3)
    for _ in range(40):
        curves = [np.cumsum(random.integers(0, 4, 300) ** 3) for _ in range(2)]
        found = break_even_volume(
            lambda n, c=curves: Decimal(int(c[0][n - 1])),
            lambda n, c=curves: Decimal(int(c[1][n - 1])),
            300,
        )
        signs = np.sign(curves[0] - curves[1])
        cheaper, changes = 0, []
        for n, sign in enumerate(signs, start=1):
            if sign and sign != cheaper:
                if cheaper:
                    changes.append((n, "B" if sign > 0 else "A"))
                cheaper = sign
        assert [(c.samples, c.cheaper) for c in found.crossings] == changes


# --- EX7: a marker without a quote ----------------------------------------------


def test_price_at_which_a_missing_quote_decides():
    # EX7
    quotes = ["0.12", "0.18", "0.18", "0.30", "0.60", "0.22", None]
    prices = PriceList(
        tuple(
            AssayPrice.from_row(
                {"marker": f"m{i:02d}", "platform": "q", "dev": 350, "test": quote},
                where="row",
            )
            for i, quote in enumerate(quotes, start=1)
        )
    )
    programme = programme_section(
        {"currency": "EUR", "samples": 500, "repeat_rate": "0.04"}
    )
    platform = platform_section(
        {
            "positions": 384,
            "replicates": 2,
            "controls_per_pool": 2,
            "groups": 1,
            "run_cost": 35,
            "position_cost": "0.42",
            "overage": "0.10",
        }
    )
    pricer = PanelPricer(programme, {"q": platform}, prices)
    x, y = ["m01", "m02", "m03", "m07"], ["m01", "m02", "m04", "m06"]
    other = pricer.costs(y)[0].total
    price = break_even_price(pricer, x, "q", "m07", other)
    assert price == Decimal("0.340000")
    # the price is what the definition says: no dearer there, dearer one cent above
    for step, dearer in ((Decimal(0), False), (Decimal("0.01"), True)):
        quoted = [*prices.rows[:-1], AssayPrice("m07", "q", dev=Decimal(350),
                  test=price + step)]  # fmt: skip
        total = pricer.repriced(PriceList(tuple(quoted))).costs(x)[0].total
        assert (total > other) is dearer
    assert break_even_price(pricer, x, "q", "m07", Decimal(4000)) < 0


# --- EX12: front, budget, rules -------------------------------------------------

CANDIDATES = [
    PanelFigures(name, k, Decimal(total), area, se, difference, difference_se)
    for name, k, area, se, total, difference, difference_se in [
        ("P02", 2, 0.781, 0.016, 18200, -0.090, 0.013),
        ("P03", 3, 0.812, 0.015, 20400, -0.059, 0.011),
        ("P04", 4, 0.836, 0.013, 22600, -0.035, 0.009),
        ("P05", 5, 0.849, 0.012, 24900, -0.022, 0.007),
        ("P06", 6, 0.857, 0.011, 27100, -0.014, 0.006),
        ("P08", 8, 0.864, 0.010, 31600, -0.007, 0.004),
        ("P09k", 9, 0.863, 0.010, 26300, -0.008, 0.0045),
        ("P10", 10, 0.868, 0.010, 36200, -0.003, 0.003),
        ("P12", 12, 0.871, 0.009, 40700, 0.0, 0.0),
        ("P13", 13, 0.870, 0.009, 47000, -0.001, 0.002),
    ]
]


def smallest(panels):
    return min(panels, key=lambda p: p.size).name


def cheapest(panels):
    return min(panels, key=lambda p: p.total).name


def test_front_budget_and_rules():
    # EX12
    front = cost_accuracy_front(CANDIDATES)
    assert [p.name for p in front] == [
        "P02", "P03", "P04", "P05", "P09k", "P08", "P10", "P12",
    ]  # fmt: skip
    assert [f"{price:.2f}" for price in price_of_accuracy(front)] == [
        "709.68", "916.67", "1769.23", "1000.00", "53000.00", "11500.00", "15000.00",
    ]  # fmt: skip
    chosen = [
        best_within_budget(CANDIDATES, Decimal(b)).name
        for b in (25_000, 30_000, 35_000, 50_000)
    ]
    assert chosen == ["P05", "P09k", "P08", "P12"]
    assert best_within_budget(CANDIDATES, Decimal(1)) is None
    near = within_one_se(CANDIDATES)
    assert [p.name for p in near] == ["P08", "P09k", "P10", "P12", "P13"]
    assert (smallest(near), cheapest(near)) == ("P08", "P09k")
    for margin, small in ((0.02, "P08"), (0.03, "P06")):
        passed = not_worse(CANDIDATES, margin, 9)
        assert (smallest(passed), cheapest(passed)) == (small, "P09k")


def test_the_naive_error_passes_what_the_corrected_one_refuses():
    # EX12, ten paired folds of a tenfold cross-validation
    folds = -np.array([20, 5, 12, 18, 9, 25, 3, 16, 11, 21]) / 1000
    t = stats.t.ppf(0.95, 9)
    assert round(naive_se(folds), 6) == 0.002275
    assert round(corrected_se(folds, 1 / 9), 6) == 0.003306
    assert round(folds.mean() - t * naive_se(folds), 5) == -0.01817
    assert round(folds.mean() - t * corrected_se(folds, 1 / 9), 5) == -0.02006


# --- EX13 to EX15: stand-ins, weights, losses -----------------------------------


def area_of(delta, correlation):
    """Area under the curve of two normal classes with one covariance."""

    @cache
    def area(markers):
        if not markers:
            return 0.5
        matrix = np.array(
            [
                [1.0 if a == b else correlation.get(frozenset((a, b)), 0.0)
                 for b in markers]
                for a in markers
            ]
        )  # fmt: skip
        shift = np.array([delta[m] for m in markers])
        return float(stats.norm.cdf(sqrt(shift @ np.linalg.solve(matrix, shift) / 2)))

    return area


def test_a_stand_in_is_judged_in_the_panel():
    # EX13: the less correlated stand-in loses less
    delta = {"m1": 1.0, "m2": 0.8, "m3": 0.6, "s1": 0.85, "s2": 0.82}
    text = "m1m2 .3 m1m3 .2 m2m3 .25 s1m1 .9 s1m2 .35 s1m3 .2 s2m1 .55 s2m2 .05"
    words = f"{text} s2m3 .1 s1s2 .5".split()
    pairs = dict(zip(words[::2], map(float, words[1::2]), strict=True))
    area = area_of(delta, {frozenset((k[:2], k[2:])): v for k, v in pairs.items()})
    whole = area(("m1", "m2", "m3"))
    assert round(whole, 4) == 0.7960
    assert round(worst_single_loss(("m1", "m2", "m3"), area), 4) == 0.7378
    first, second = area(("s1", "m2", "m3")), area(("s2", "m2", "m3"))
    assert (round(first, 4), round(second, 4)) == (0.7735, 0.7959)
    assert (round(whole - first, 4), round(whole - second, 4)) == (0.0226, 0.0001)


@pytest.mark.parametrize(
    ("power", "at_half", "order"),
    [
        (0.0, [0.5, 0.4, 0.0, 0.0], [0, 1, 2, 3]),
        (0.5, [0.0, 0.4796, 0.0796, 0.1527], [1, 3, 2, 0]),
    ],
)
def test_price_weighted_penalty(power, at_half, order):
    # EX14: orthonormal columns, so the solution has a closed form
    prices = np.array([80.0, 10.0, 10.0, 5.0])
    assert round(float(stats.gmean(prices)), 4) == 14.1421
    weights = (prices / stats.gmean(prices)) ** power
    z = np.array([1.0, 0.9, 0.5, 0.45])
    n = 16
    columns = np.kron(np.array([[1, 1], [1, -1]]), np.array([[1, 1], [1, -1]]))
    design = np.kron(np.eye(4), columns[:, 1:])[:, [0, 1, 3, 4]].astype(float)
    design = np.linalg.qr(design - design.mean(axis=0))[0] * sqrt(n)
    outcome = design @ z
    largest = float((z / weights).max())
    paths = fit_paths(
        design,
        outcome,
        family="gaussian",
        feature_weights=weights,
        penalties=np.array([largest, 0.5]),
    )
    intercept, found = paths.coef(0, 1)
    assert intercept == pytest.approx(0.0, abs=1e-9)
    # the path standardises by the SD of each column, which is 1 here
    assert found == pytest.approx(at_half, abs=2e-4)
    assert [int(j) for j in np.argsort(-z / weights, kind="stable")] == order


LOSSES = {"m1": 1.2, "m2": 1.1, "m3": 0.5, "m4": 0.5, "m5": 0.45}


def test_a_panel_that_survives_one_failure():
    # EX15
    area = area_of(LOSSES, {frozenset(("m1", "m2")): 0.8})
    panels = list(combinations(sorted(LOSSES), 3))
    nominal = max(panels, key=area)
    robust = max(panels, key=lambda panel: worst_single_loss(panel, area))
    assert nominal == ("m1", "m3", "m4")
    assert robust == ("m1", "m2", "m3")
    assert round(area(nominal), 4) == 0.8377
    assert round(area(robust), 4) == 0.8248
    assert round(worst_single_loss(nominal, area), 4) == 0.6915
    assert round(worst_single_loss(robust, area), 4) == 0.8036
    chances = (0.02, 0.05, 0.10, 0.20)
    assert [round(expected_area(nominal, area, q), 4) for q in chances] == [
        0.8340, 0.8285, 0.8189, 0.7981,
    ]  # fmt: skip
    assert [round(expected_area(robust, area, q), 4) for q in chances] == [
        0.8239, 0.8222, 0.8187, 0.8086,
    ]  # fmt: skip
    assert round(overtaking_chance(nominal, robust, area), 4) == 0.1015
    assert overtaking_chance(robust, nominal, area) is None


@pytest.mark.parametrize(
    ("cv", "sd", "ratio", "single", "double"),
    [
        (0.10, 0.1439, 0.0575, 0.8309, 0.8342),
        (0.20, 0.2857, 0.2268, 0.8131, 0.8247),
        (0.30, 0.4235, 0.4982, 0.7895, 0.8109),
    ],
)
def test_added_assay_noise(cv, sd, ratio, single, double):
    # EX15, biological SD 0.6 on the log2 scale
    assert round(log2_sd_from_cv(cv), 4) == sd
    assert round((log2_sd_from_cv(cv) / 0.6) ** 2, 4) == ratio
    shift = np.array([LOSSES[m] for m in ("m1", "m3", "m4")])
    for replicates, expected in ((1, single), (2, double)):
        noise = (log2_sd_from_cv(cv, replicates) / 0.6) ** 2
        area = stats.norm.cdf(sqrt((shift**2).sum() / (1 + noise) / 2))
        assert round(float(area), 4) == expected


# --- EX21 and EX22 --------------------------------------------------------------


def test_a_backup_for_every_cluster():
    # EX21 (b)
    costs = {"m1": 42, "m2": 9, "m3": 15, "m4": 20, "m5": 8, "m6": 12, "m7": 11}
    clusters = [("m1", "m2", "m3"), ("m4", "m5"), ("m5", "m6", "m7")]
    assert cheapest_backups(clusters, costs) == (("m2", "m3", "m4", "m5", "m7"), 63)
    assert cheapest_backups(clusters, costs, least=1) == (("m2", "m5"), 17)


def test_payback_and_a_spare():
    # EX21 (c) and (d)
    assert payback_months(Decimal(9000), Decimal("14956.80")) == 8
    assert payback_months(Decimal(9000), Decimal(0)) is None
    worth, chance = spare_pays(Decimal(2500), Decimal("0.08"), Decimal(40_000))
    assert worth
    assert chance == Decimal("0.0625")
    assert not spare_pays(Decimal(2500), Decimal("0.06"), Decimal(40_000))[0]


def test_development_from_a_verification_plan():
    # EX22
    plan = VerificationPlan(
        precision=50, blanks=60, low_samples=60, linearity=10, comparison=40, days=3
    )
    assert plan.results == 220
    platform = platform_section(
        {
            "positions": 384,
            "replicates": 2,
            "overage": "0.10",
            "position_cost": "0.42",
            "run_cost": 35,
        }
    )
    cost = development_cost(
        plan, platform, Fraction("0.18"), day_cost=Fraction(320), design=Fraction(60)
    )
    assert cost == Fraction("1380.40")
    assert 24 * cost == Fraction("33129.60")
