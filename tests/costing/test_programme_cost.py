"""The cost of one panel on one platform, against the panelkit cost model."""

import json
import math
from dataclasses import replace
from decimal import Decimal
from fractions import Fraction
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from panelkit.config.programme import (
    FAMILY_PRESETS,
    PlatformSection,
    ProgrammeSection,
    platform_section,
    programme_section,
    read_platform_file,
    read_programme_file,
)
from panelkit.costing.pricing import (
    programme_cost,
    purchase_cost,
    samples_run_and_results,
)
from panelkit.errors import InputDataError, NoPanelError, StudyFileError, UsageError
from panelkit.ingest.price_list import read_price_list
from panelkit.records.prices import AssayPrice

DATA = Path(__file__).parent / "data"
CASES = {case["id"]: case for case in json.loads((DATA / "cases.json").read_text())}


def rows_of(groups):
    """Return the rows that the short form of a case stands for."""
    rows = []
    for group in groups:
        rest = {k: v for k, v in group.items() if k not in ("prefix", "count")}
        rows += [
            {"marker": f"{group['prefix']}{number:02d}", **rest}
            for number in range(1, group["count"] + 1)
        ]
    return rows


def lines_of(cost):
    return {line.name: str(line.amount) for line in cost.lines}


def vary(name, *, programme=None, platform=None, counts=None):
    """Return the cost of a case with some keys changed."""
    case = CASES[name]
    groups = [
        {**group, "count": (counts or {}).get(group["prefix"], group["count"])}
        for group in case["markers"]
    ]
    return programme_cost(
        {**case["programme"], **(programme or {})},
        {**case["platform"], **(platform or {})},
        rows_of(groups),
    )


def test_all_cases_are_accounted_for():
    assert len(CASES) == 19


@pytest.mark.parametrize("name", CASES)
def test_case(name):
    # panelkit cost model, the example that the id names
    case = CASES[name]
    cost = programme_cost(case["programme"], case["platform"], rows_of(case["markers"]))
    assert {
        "samples_run": cost.samples_run,
        "results": str(cost.results),
        "pools": cost.pools,
        "groups": list(cost.groups),
        "samples_per_run": list(cost.samples_per_run),
        "runs": cost.runs,
        "filled": cost.filled_positions,
        "control_positions": cost.control_positions,
        "preps": cost.preparations,
        "lines": lines_of(cost),
        "total": str(cost.total),
        "cost_per_result": str(cost.cost_per_result),
    } == case["expect"]
    assert cost.total_high == cost.total
    assert cost.missing_quotes == ()


def test_the_two_files():
    # panelkit cost model, worked example EX23
    programme = read_programme_file(DATA / "ex01.toml")
    platform = read_platform_file(DATA / "ex01.toml")["qpcr384"]
    prices = read_price_list(DATA / "ex01_prices.csv")
    panel = prices.for_panel([f"m{i:02d}" for i in range(1, 25)], "qpcr384")
    cost = programme_cost(programme, platform, panel)
    assert (str(cost.total), str(cost.cost_per_result)) == ("51391.40", "102.95")
    assert cost.platform == "qpcr384"
    assert round(float(cost.fill), 4) == 0.9811
    assert len(cost.findings) == 0
    frame = cost.to_frame()
    assert list(frame["line"]) == list(lines_of(cost))
    assert frame["amount"].sum() == cost.total


@pytest.mark.parametrize(
    ("groups", "samples", "runs", "controls", "total"),
    [
        (2, 12, 84, 2272, "49682.82"),
        (3, 20, 78, 1404, "48903.33"),
        (4, 26, 77, 1044, "48627.49"),
        (5, 31, 79, 858, "48575.38"),
    ],
)
def test_spread_over_plates(groups, samples, runs, controls, total):
    # panelkit cost model, worked example EX1, table of spreads
    cost = vary("EX1-one", platform={"groups": groups})
    assert cost.samples_per_run[0] == samples
    assert (cost.runs, cost.control_positions) == (runs, controls)
    assert str(cost.total) == total


def test_fewer_markers():
    # panelkit cost model, worked example EX2
    twelve, eight = vary("EX2-k12"), vary("EX2-k8")
    assert twelve.total - eight.total == Decimal("16356.80")
    assert str(twelve.recurring) == "102556.00"
    assert twelve.per_year - eight.per_year == Decimal("14956.80")
    assert twelve.one_off + twelve.recurring == twelve.total
    ten, nine = (vary("EX2-k12", counts={"m": k}) for k in (10, 9))
    assert ten.total - nine.total == Decimal("4374.01")
    thirteen = vary("EX2-k12", counts={"m": 13})
    assert thirteen.total - twelve.total == Decimal("3346.40")
    halved = vary("EX2-k12", programme={"horizon_months": 24})
    assert str(halved.per_year) == "51278.00"


@pytest.mark.parametrize(
    ("markers", "pools", "runs", "total"),
    [(14, 2, 16, "32624.00"), (25, 3, 24, "53280.00")],
)
def test_another_pool(markers, pools, runs, total):
    # panelkit cost model, worked example EX3
    cost = vary("EX3-k13", counts={"m": markers})
    assert (cost.pools, cost.runs, str(cost.total)) == (pools, runs, total)


@pytest.mark.parametrize(
    ("sizes", "plex", "pools"),
    [((7, 4, 2), 8, 3), ((3, 2, 1), 4, 3)],
)
def test_classes_do_not_share_a_pool(sizes, plex, pools):
    # panelkit cost model, worked example EX4, the rows without conflicts
    rows = [
        {"marker": f"{name}{i}", "class": name, "dev": 0, "test": 0}
        for name, size in zip("abc", sizes, strict=True)
        for i in range(size)
    ]
    cost = programme_cost(
        {"currency": "EUR", "samples": 1}, {"positions": 96, "plex": plex}, rows
    )
    assert cost.pools == pools


def test_slots_of_one_size_fill_pools():
    # panelkit cost model, worked example EX4: slots 4, 4, 4 on plex 6
    rows = [{"marker": m, "slots": 4, "dev": 0, "test": 0} for m in "abc"]
    programme = {"currency": "EUR", "samples": 1}
    assert programme_cost(programme, {"positions": 9, "plex": 6}, rows).pools == 3


TIERS = "1:2.00;500:1.60;1000:1.30"


@pytest.mark.parametrize(
    ("units", "with_buy_up", "incremental"),
    [
        # panelkit cost model, worked example EX9
        (399, "798.00", "798.00"),
        (450, "800.00", "900.00"),
        (500, "800.00", "999.60"),
        (812, "1299.20", "1498.80"),
        (813, "1300.00", "1500.40"),
        (1200, "1560.00", "2059.30"),
    ],
)
def test_tiers(units, with_buy_up, incremental):
    row = AssayPrice.from_row({"marker": "m", "tiers": TIERS}, where="row")
    assert purchase_cost(row, units) == Fraction(with_buy_up)
    text = f"incremental;{TIERS}"
    row = AssayPrice.from_row({"marker": "m", "tiers": text}, where="row")
    assert purchase_cost(row, units) == Fraction(incremental)
    assert row.as_row()["tiers"] == text


@pytest.mark.parametrize(
    ("lot_months", "assays", "lots"),
    [
        # panelkit cost model, worked example EX10
        (24, "900.00", "0.00"),
        (12, "1080.00", "250.00"),
        (9, "1080.00", "500.00"),
        (6, "1440.00", "750.00"),
        (0, "900.00", "0.00"),
    ],
)
def test_minimum_order_and_lot_life(lot_months, assays, lots):
    cost = programme_cost(
        {"currency": "EUR", "samples": 4800, "horizon_months": 24},
        {"positions": 96, "lot_months": lot_months, "lot_cost": 250},
        [{"marker": "m", "dev": 0, "pack": 1000, "pack_price": 180}],
    )
    lines = lines_of(cost)
    assert (lines["assays"], lines["lots"]) == (assays, lots)


@pytest.mark.parametrize(
    ("samples", "rate", "mode", "run", "results"),
    [
        # panelkit cost model, worked example EX11
        (500, "0.10", "once", 550, 495),
        (500, "0.10", "until", 556, 500),
        (500, "0.10", "none", 500, 450),
        (200, "0.10", "once", 220, 198),  # ceil(200 * 1.1) of floats is 221
        (465, "0.07", "until", 500, 465),  # of floats 501
    ],
)
def test_repeats(samples, rate, mode, run, results):
    assert samples_run_and_results(samples, Fraction(rate), mode) == (run, results)


def test_exact_ceilings_differ_from_those_of_floats():
    # panelkit cost model, worked example EX11: why floats are refused
    wrong = sum(
        samples_run_and_results(n, Fraction("0.1"), "once")[0] != math.ceil(n * 1.1)
        for n in range(1, 2001)
    )
    assert wrong > 0


@pytest.mark.parametrize(
    ("markers", "run"), [(4, 1040), (8, 1059), (12, 1078), (24, 1132)]
)
def test_larger_panels_repeat_more_often(markers, run):
    # panelkit cost model, worked example EX11
    rows = [
        {"marker": f"m{i}", "dev": 0, "test": 0, "fail_rate": "0.005"}
        for i in range(markers)
    ]
    cost = programme_cost(
        {"currency": "EUR", "samples": 1000, "repeat_rate": "0.02"},
        {"positions": 96, "plex": 24},
        rows,
    )
    assert cost.samples_run == run


@pytest.mark.parametrize(
    ("markers", "samples", "runs", "total"),
    [(12, 246, 3, "24470.88"), (28, 121, 5, "27191.20")],
)
def test_run_budget(markers, samples, runs, total):
    # panelkit cost model, worked example EX17
    cost = vary("EX17-k11", counts={"m": markers})
    assert (cost.samples_per_run, cost.runs) == ((samples,), runs)
    assert str(cost.total) == total


def test_steps_of_the_run_budget():
    # panelkit cost model, worked example EX17: where one more run is needed
    runs = {k: vary("EX17-k11", counts={"m": k}).runs for k in range(11, 57)}
    steps = [k for k in range(12, 57) if runs[k] > runs[k - 1]]
    assert steps == [12, 20, 28, 35, 42, 49, 56]


def test_second_injection():
    # panelkit cost model, worked example EX18
    cost = vary("EX18-k20", counts={"m": 62})
    assert (cost.filled_positions, str(cost.total)) == (373, "88697.10")
    assert str(cost.cost_per_result) == "295.92"


@pytest.mark.parametrize(
    ("deliveries", "runs", "total", "fill"),
    [(1, 87, "51391.40", 98.1), (4, 88, "51461.06", 97.2), (12, 96, "52028.13", 90.2)],
)
def test_deliveries(deliveries, runs, total, fill):
    # panelkit cost model, worked example EX20
    cost = vary("EX1-one", programme={"deliveries": deliveries})
    assert (cost.runs, str(cost.total)) == (runs, total)
    assert round(float(100 * cost.fill), 1) == fill


@pytest.mark.parametrize(
    ("deliveries", "groups", "total"),
    [(1, 27, "48186.66"), (12, 7, "48613.40"), (52, 2, "50739.00")],
)
def test_best_spread_depends_on_deliveries(deliveries, groups, total):
    # panelkit cost model, worked example EX20
    cost = vary("EX1-auto", programme={"deliveries": deliveries})
    assert (len(cost.groups), str(cost.total)) == (groups, total)


@pytest.mark.parametrize(("markers", "total"), [(19, "16424.00"), (43, "19928.00")])
def test_position_tiers(markers, total):
    # panelkit cost model, worked example EX21 (a)
    assert str(vary("EX21-k12", counts={"m": markers}).total) == total


def test_position_tiers_are_those_of_each_pool():
    # By hand: 10 samples; pools of 2 and 1 slots at 1 and 3 a position; 5 controls
    # of the run are paid like the fullest pool.
    cost = programme_cost(
        {"currency": "EUR", "samples": 10},
        {
            "positions": 96,
            "plex": 2,
            "groups": 1,
            "controls_per_run": 5,
            "position_cost": [[1, 1], [2, 3]],
        },
        [{"marker": m, "dev": 0, "test": 0} for m in "abc"],
    )
    assert lines_of(cost)["positions"] == f"{10 * 3 + 10 * 1 + 5 * 3}.00"


# --- missing prices -------------------------------------------------------------

QUOTES = ["0.12", "0.18", "0.18", "0.30", "0.60", "0.22", None]
EX7_ROWS = [
    {"marker": f"m{i:02d}", "dev": 350, "test": test}
    for i, test in enumerate(QUOTES, start=1)
]
EX7_PLATFORM = {
    "positions": 384,
    "replicates": 2,
    "controls_per_pool": 2,
    "groups": 1,
    "run_cost": 35,
    "position_cost": "0.42",
    "overage": "0.10",
}


def price_ex7(markers, policy, rows=EX7_ROWS):
    return programme_cost(
        {
            "currency": "EUR",
            "samples": 500,
            "repeat_rate": "0.04",
            "missing_price": policy,
        },
        EX7_PLATFORM,
        [rows[i - 1] for i in markers],
        quotes=rows,
    )


def test_missing_price_is_bounded_or_imputed():
    # panelkit cost model, worked example EX7
    cost = price_ex7([1, 2, 3, 7], "bound")
    assert (str(cost.total), str(cost.total_high)) == ("4488.87", "5050.95")
    assert cost.missing_quotes == ("m07",)
    assert sum(line.amount_high for line in cost.lines) == cost.total_high
    assert cost.cost_per_result < cost.cost_per_result_high
    cost = price_ex7([1, 2, 3, 7], "impute")
    assert cost.total == cost.total_high == Decimal("4582.55")
    assert cost.missing_quotes == ("m07",)
    cost = price_ex7([1, 2, 4, 6], "bound")
    assert cost.total == cost.total_high == Decimal("4746.49")
    assert cost.missing_quotes == ()


def test_quotes_in_tiers_and_packs_are_compared_at_the_quantity_bought():
    # By hand: of 1,171 reactions (EX7) the pack is the cheapest, at 100 in all, and
    # the tiers are the dearest, at 0.80 each; neither has one price of a reaction.
    pack = {"marker": "m08", "dev": 350, "pack": 2000, "pack_price": 100}
    rows = [*EX7_ROWS, pack, {"marker": "m09", "dev": 350, "tiers": "1:1;1000:0.80"}]
    cost = price_ex7([1, 2, 3, 7], "bound", rows)
    flat = 1171 * (Decimal("0.12") + 2 * Decimal("0.18"))
    assert cost.lines[6].name == "assays"
    assert cost.lines[6].amount == flat + 100
    assert cost.lines[6].amount_high == flat + 1171 * Decimal("0.80")
    # Eight quotes: the median is the mean of 0.18 and 0.22 each.
    imputed = price_ex7([1, 2, 3, 7], "impute", rows)
    assert imputed.lines[6].amount == flat + 1171 * Decimal("0.20")


def test_missing_development_is_bounded():
    rows = [dict(row, dev=dev) for row, dev in zip(EX7_ROWS, [1, 2, 9], strict=False)]
    rows.append({"marker": "m09", "test": "0.20"})
    cost = price_ex7([1, 4], "bound", rows)
    assert cost.missing_quotes == ("m09",)
    assert cost.lines[2].amount == 2
    assert cost.lines[2].amount_high == 10


def test_zero_is_a_price():
    rows = [{"marker": "m", "dev": 0, "test": "0"}]
    cost = programme_cost(
        {"currency": "EUR", "samples": 10, "missing_price": "refuse"},
        {"positions": 96},
        rows,
    )
    assert cost.total == 0


@pytest.mark.parametrize(
    ("policy", "kind", "code", "exit_code"),
    [
        ("refuse", InputDataError, "price-missing", 3),
        ("exclude", NoPanelError, "marker-without-price", 5),
    ],
)
def test_missing_price_is_refused(policy, kind, code, exit_code):
    with pytest.raises(kind) as caught:
        price_ex7([1, 7], policy)
    assert (caught.value.code, caught.value.exit_code) == (code, exit_code)
    assert "m07" in str(caught.value)


@pytest.mark.parametrize("policy", ["bound", "impute"])
def test_two_quotes_bound_nothing(policy):
    # panelkit cost model, section 2.4
    rows = [EX7_ROWS[0], EX7_ROWS[1], EX7_ROWS[6]]
    with pytest.raises(InputDataError) as caught:
        price_ex7([1, 2, 3], policy, rows)
    assert caught.value.code == "quotes-too-few"
    rows.append({"marker": "*", "dev": 350, "test": "0.50"})  # counts as a quote
    assert str(price_ex7([1, 2, 3], policy, rows).missing_quotes) == "('m07',)"


# --- refusals -------------------------------------------------------------------

ONE = [{"marker": "m1", "status": "ok", "dev": 1, "test": 1}]
PROGRAMME = {"currency": "EUR", "samples": 10}


@pytest.mark.parametrize(
    ("keys", "code"),
    [
        ({"currency": "EURO"}, "currency-unknown"),
        ({"currency": "XTS"}, "currency-unknown"),
        ({"samples": 0}, "value-refused"),
        ({"samples": "1.5"}, "count-not-whole"),
        ({"repeat_rate": 0.04}, "amount-not-exact"),
        ({"repeat_rate": "1"}, "value-refused"),
        ({"repeat_rate": "-0.1"}, "value-refused"),
        ({"repeat_mode": "twice"}, "value-refused"),
        ({"collection_cost": "nan"}, "amount-implausible"),
        ({"collection_cost": "1e999999"}, "amount-implausible"),
        ({"collection_cost": "3,50"}, "amount-unreadable"),
        ({"horizon": 3}, "key-unknown"),
    ],
)
def test_programme_is_refused(keys, code):
    with pytest.raises(StudyFileError) as caught:
        programme_cost({**PROGRAMME, **keys}, {"positions": 96}, ONE)
    assert (caught.value.code, caught.value.exit_code) == (code, 2)
    assert next(iter(keys)) in caught.value.where


@pytest.mark.parametrize(
    ("keys", "kind", "code"),
    [
        ({"positions": 0}, StudyFileError, "value-refused"),
        ({"plex": 0}, StudyFileError, "value-refused"),
        ({"replicates": 0}, StudyFileError, "value-refused"),
        ({"run_cost": "-1"}, StudyFileError, "value-refused"),
        ({"position_cost": "-1"}, StudyFileError, "amount-negative"),
        ({"position_cost": [[1, "-1"]]}, StudyFileError, "amount-negative"),
        ({"position_cost": []}, StudyFileError, "position-tiers-not-rising"),
        (
            {"position_cost": [[2, 1], [2, 2]]},
            StudyFileError,
            "position-tiers-not-rising",
        ),
        ({"position_cost": [3]}, StudyFileError, "position-tier-unreadable"),
        ({"groups": "all"}, StudyFileError, "groups-refused"),
        ({"groups": 0}, StudyFileError, "groups-refused"),
        ({"groups": True}, StudyFileError, "groups-refused"),
        ({"family": "qpcr"}, StudyFileError, "value-refused"),
        ({"overhead": 3}, StudyFileError, "key-unknown"),
        ({"run_budget": 3}, StudyFileError, "slot-budget-missing"),
        ({"controls_per_pool": 96}, StudyFileError, "controls-leave-no-room"),
        ({"replicates": 97}, StudyFileError, "controls-leave-no-room"),
        ({"run_budget": 1, "slot_budget": 2}, NoPanelError, "run-budget-exceeded"),
        (
            {"replicates": 2, "max_positions_per_sample": 1},
            NoPanelError,
            "sample-volume-exceeded",
        ),
    ],
)
def test_platform_is_refused(keys, kind, code):
    with pytest.raises(kind) as caught:
        programme_cost(PROGRAMME, {"positions": 96, **keys}, ONE)
    assert caught.value.code == code
    assert type(caught.value) is kind


def test_a_platform_without_positions_is_refused():
    # panelkit cost model, section 1.10: this family has no usual number
    with pytest.raises(StudyFileError) as caught:
        programme_cost(PROGRAMME, {"family": "probe-count"}, ONE)
    assert caught.value.code == "key-missing"
    assert "positions" in caught.value.where


def test_the_nearest_key_is_named():
    with pytest.raises(StudyFileError) as caught:
        platform_section({"positions": 96, "replicate": 2}, "study.toml, [platform.x]")
    assert caught.value.where == "study.toml, [platform.x], key 'replicate'"
    assert "'replicates' is meant" in caught.value.accepted


PLATES = {"positions": 8, "groups": 1}


@pytest.mark.parametrize(
    ("rows", "platform", "kind", "code"),
    [
        ([], PLATES, UsageError, "panel-empty"),
        ({"marker": "m"}, PLATES, UsageError, "rows-expected"),
        (["m"], PLATES, UsageError, "row-expected"),
        (ONE * 2, PLATES, UsageError, "marker-repeated"),
        ([ONE[0] | {"marker": "*"}], PLATES, UsageError, "marker-unnamed"),
        ([ONE[0] | {"role": "reference"}], PLATES, UsageError, "panel-empty"),
        ([ONE[0] | {"status": "no"}], PLATES, NoPanelError, "marker-cannot-be-assayed"),
        ([ONE[0] | {"price": 3}], PLATES, InputDataError, "column-unknown"),
        ([ONE[0] | {"test": 0.18}], PLATES, InputDataError, "binary-float"),
        ([ONE[0] | {"slots": 2}], PLATES, UsageError, "assay-exceeds-pool"),
        (
            [ONE[0], {"marker": "m2", "platform": "b"}],
            PLATES,
            UsageError,
            "platforms-mixed",
        ),
        (
            [*ONE, {"marker": "r", "role": "reference", "dev": 1, "test": 1}],
            PLATES | {"refs_scope": "pool"},
            StudyFileError,
            "no-room-in-pool",
        ),
        (
            [{"marker": f"m{i}", "dev": 1, "test": 1} for i in range(9)],
            PLATES,
            NoPanelError,
            "sample-exceeds-run",
        ),
        (
            [{"marker": f"m{i}", "dev": 1, "test": 1} for i in range(3)],
            PLATES | {"plex": 3, "position_cost": [[2, 1]]},
            StudyFileError,
            "position-tiers-too-short",
        ),
    ],
)
def test_panel_is_refused(rows, platform, kind, code):
    with pytest.raises(kind) as caught:
        programme_cost(PROGRAMME, platform, rows)
    assert caught.value.code == code


def test_auto_skips_spreads_that_do_not_fit():
    rows = [{"marker": f"m{i}", "dev": 1, "test": 1} for i in range(9)]
    cost = programme_cost(PROGRAMME, {"positions": 8}, rows)
    assert len(cost.groups) == 2
    assert cost.groups[0] == 5


def test_findings_of_a_panel():
    cost = programme_cost(
        PROGRAMME, {"family": "rt-qpcr"}, [ONE[0] | {"status": "unknown"}]
    )
    assert [item.code for item in cost.findings] == [
        "assay-status-unknown",
        "references-few",
    ]


# --- the sections ---------------------------------------------------------------


@pytest.mark.parametrize("family", FAMILY_PRESETS)
def test_a_preset_fills_only_what_was_left_out(family):
    # panelkit cost model, section 1.10
    section = platform_section({"family": family, "positions": 7, "overage": "0.25"})
    assert (section.positions, section.overage) == (7, Decimal("0.25"))
    assert "overage" not in section.from_preset
    for key in section.from_preset:
        preset = FAMILY_PRESETS[family][key]
        value = getattr(section, key)
        assert value == (Decimal(preset) if isinstance(value, Decimal) else preset)
    written = section.model_dump(exclude_unset=True)
    assert set(written) == {"family", "positions", "overage"}
    again = PlatformSection.model_validate(written)
    assert again == section
    assert again.from_preset == section.from_preset


@pytest.mark.parametrize(
    ("programme", "platform", "rate"),
    [
        ({}, {}, "0.04"),  # the preset's
        ({"repeat_rate": "0.01"}, {}, "0.01"),
        ({"repeat_rate": 0}, {}, "0"),
        ({"repeat_rate": "0.01"}, {"repeat_rate": "0.02"}, "0.02"),
    ],
)
def test_whose_repeat_rate_holds(programme, platform, rate):
    section = platform_section({"family": "rt-qpcr", **platform})
    whole = programme_section({**PROGRAMME, **programme})
    assert section.effective_repeat_rate(whole) == Decimal(rate)


def test_without_family_the_programme_gives_the_repeat_rate():
    section = platform_section({"positions": 96})
    assert section.effective_repeat_rate(programme_section(PROGRAMME)) == 0
    assert section.from_preset == ()


def test_sections_are_frozen_and_passed_on():
    programme = ProgrammeSection(currency="EUR", samples=10)
    assert programme_section(programme) is programme
    with pytest.raises(ValueError, match="frozen"):
        programme.samples = 3


@pytest.mark.parametrize(
    ("text", "code"),
    [
        ("[programme", "toml-unreadable"),
        ("x = 1e99999999999999999999", "toml-unreadable"),
        ("[program]\nsamples = 1", "key-unknown"),
        ("[platform]\n", "programme-missing"),
        ('[programme]\ncurrency = "EUR"\n', "key-missing"),
        ('[programme]\ncurrency = "EUR"\nsamples = 1.5\n', "count-not-whole"),
        (b"\xff", "file-unreadable"),
        (None, "file-unreadable"),
    ],
)
def test_programme_file_is_refused(tmp_path, text, code):
    path = tmp_path / "study.toml"
    if text is not None:
        path.write_bytes(text if isinstance(text, bytes) else text.encode())
    with pytest.raises(StudyFileError) as caught:
        read_programme_file(path)
    assert caught.value.code == code
    assert str(path) in caught.value.where


@pytest.mark.parametrize(
    ("text", "code"),
    [
        ("[programme]", "platform-missing"),
        ("[platform]\npositions = 3", "platform-missing"),
        ("[platform.a]\npositions = -3", "value-refused"),
    ],
)
def test_platform_file_is_refused(tmp_path, text, code):
    path = tmp_path / "study.toml"
    path.write_text(text)
    with pytest.raises(StudyFileError) as caught:
        read_platform_file(path)
    assert caught.value.code == code


def test_decimals_of_a_file_are_read_as_decimals(tmp_path):
    # panelkit cost model, section 2.1: the nearest binary float to 0.1 is above it
    path = tmp_path / "study.toml"
    path.write_text('[programme]\ncurrency = "EUR"\nsamples = 200\nrepeat_rate = 0.1\n')
    cost = programme_cost(read_programme_file(path), {"positions": 96}, ONE)
    assert cost.samples_run == 220


# --- invariants -----------------------------------------------------------------

COST = st.integers(0, 5000).map(lambda n: Decimal(n).scaleb(-2))


@st.composite
def reagents(draw):
    kind = draw(st.sampled_from(["test", "pack", "tiers"]))
    if kind == "test":
        return {"test": draw(COST)}
    if kind == "pack":
        return {"pack": draw(st.integers(1, 500)), "pack_price": draw(COST)}
    return {"tiers": f"1:{draw(COST)};{draw(st.integers(2, 400))}:{draw(COST)}"}


@st.composite
def assays(draw, markers=(1, 8), references=(0, 2)):
    rows = []
    for prefix, (least, most) in (("m", markers), ("r", references)):
        for number in range(draw(st.integers(least, most))):
            row = {
                "marker": f"{prefix}{number}",
                "role": "marker" if prefix == "m" else "reference",
                "dev": draw(COST),
                "class": draw(st.sampled_from(["", "", "a"])),
                "fail_rate": draw(st.sampled_from(["0", "0", "0.01"])),
                **draw(reagents()),
            }
            rows.append(AssayPrice.from_row(row, where=row["marker"]))
    return rows


PROGRAMMES = st.fixed_dictionaries(
    {
        "currency": st.sampled_from(["EUR", "JPY", "KWD"]),
        "samples": st.integers(1, 600),
        "horizon_months": st.integers(1, 36),
        "repeat_rate": st.sampled_from(["0", "0.03", "0.10"]),
        "repeat_mode": st.sampled_from(["none", "once", "until"]),
        "collection_cost": COST,
    }
)
PLATFORMS = st.fixed_dictionaries(
    {
        "positions": st.integers(48, 384),
        "plex": st.integers(3, 6),
        "replicates": st.integers(1, 2),
        "controls_per_pool": st.integers(0, 3),
        "controls_per_run": st.integers(0, 3),
        "refs_scope": st.sampled_from(["panel", "pool"]),
        "setup": COST,
        "pool_setup": COST,
        "run_cost": COST,
        "position_cost": COST | COST.map(lambda c: [[2, c], [6, 2 * c]]),
        "sample_cost": COST,
        "prep_positions": st.sampled_from([0, 3, 8]),
        "prep_cost": COST,
        "overage": st.sampled_from(["0", "0.05", "0.1"]),
        "lot_months": st.sampled_from([0, 6, 9]),
        "lot_cost": COST,
    }
)
SPREADS = st.sampled_from([1, "each", "auto"])


@settings(max_examples=100, deadline=None)
@given(PROGRAMMES, PLATFORMS, assays(), SPREADS, st.integers(2, 20))
def test_total_does_not_fall(programme, platform, rows, groups, more):
    # panelkit cost model, invariant 1: more samples, one marker more, deliveries
    platform = {**platform, "groups": groups}
    base = programme_cost(programme, platform, rows).total
    larger = programme | {"samples": programme["samples"] + more}
    assert programme_cost(larger, platform, rows).total >= base
    split = programme | {"deliveries": more}
    assert programme_cost(split, platform, rows).total >= base
    added = [*rows, replace(rows[0], marker="last", role="marker")]
    assert programme_cost(programme, platform, added).total >= base


@settings(max_examples=100, deadline=None)
@given(PROGRAMMES, PLATFORMS, assays())
def test_auto_is_the_cheapest_spread(programme, platform, rows):
    # panelkit cost model, invariant 2
    auto = programme_cost(programme, {**platform, "groups": "auto"}, rows)
    fixed = [
        programme_cost(programme, {**platform, "groups": n}, rows)
        for n in range(1, auto.pools + 1)
    ]
    totals = [cost.total for cost in fixed]
    assert auto.total == min(totals)
    assert len(auto.groups) == totals.index(min(totals)) + 1


@settings(max_examples=100, deadline=None)
@given(PROGRAMMES, PLATFORMS, assays(), SPREADS)
def test_lines_add_up_and_prices_scale(programme, platform, rows, groups):
    # panelkit cost model, invariants 4 and 6
    platform = {**platform, "groups": groups}
    cost = programme_cost(programme, platform, rows)
    assert sum(line.amount for line in cost.lines) == cost.total
    assert cost.one_off + cost.recurring == cost.total
    unit = Fraction(1, 10 ** -cost.total.as_tuple().exponent)
    gap = abs(Fraction(cost.cost_per_result) * cost.results - Fraction(cost.total))
    assert gap <= unit * cost.results / 2

    # With a fixed spread, since rounding may tip the choice of "auto".
    spread = {**platform, "groups": len(cost.groups)}
    twice = programme_cost(
        doubled(programme, ("collection_cost",)),
        doubled(spread, MONEY_KEYS),
        [doubled_assay(row) for row in rows],
    )
    for line, double in zip(cost.lines, twice.lines, strict=True):
        assert abs(Fraction(double.amount) - 2 * Fraction(line.amount)) <= unit


MONEY_KEYS = (
    "setup",
    "pool_setup",
    "run_cost",
    "position_cost",
    "sample_cost",
    "prep_cost",
    "lot_cost",
)


def doubled(keys, names):
    changed = {}
    for name in names:
        value = keys[name]
        tiered = isinstance(value, list)
        changed[name] = [[s, 2 * c] for s, c in value] if tiered else 2 * value
    return {**keys, **changed}


def doubled_assay(row):
    return replace(
        row,
        dev=2 * row.dev,
        test=None if row.test is None else 2 * row.test,
        pack_price=None if row.pack_price is None else 2 * row.pack_price,
        tiers=tuple((quantity, 2 * price) for quantity, price in row.tiers),
    )
