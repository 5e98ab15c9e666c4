"""A run with invented ids, some of them hostile, written out by hand."""

from dataclasses import replace
from decimal import Decimal
from fractions import Fraction

import numpy as np
import pytest

from panelkit.records import (
    AddedValue,
    Aftermath,
    Choice,
    Comparator,
    CostLine,
    CostOfFolds,
    ErrorBound,
    Finding,
    Findings,
    Flow,
    Fragility,
    Frontier,
    FrontierRow,
    Handling,
    Headline,
    LearningPoint,
    PanelCost,
    RuleChoice,
    RunSummary,
    ShortlistTable,
    StandIn,
    Subgroup,
)

SCRIPT = "<script>alert('x')</script>"
QUOTES = 'Q"1\' onmouseover="x'
BACKWARDS = "AB\u202eDC\u2066"
HEBREW = "גן-12"
LONG = "contig" + "7" * 194
FORMULA = '=HYPERLINK("a")'
MATHS = "$\\frac{1}{0}$ & 50%"
FEATURES = (
    "VELMA2",
    SCRIPT,
    "ORNIX",
    QUOTES,
    BACKWARDS,
    LONG,
    FORMULA,
    HEBREW,
    "-TARN4",
    MATHS,
    "中文",
    *(f"PLIM{number:03d}" for number in range(1, 42)),
)
SIZES = (1, 2, 3, 5, 8, 11)


def shortlist():
    n = len(FEATURES)
    frequency = np.round(0.97 * np.exp(-np.arange(n) / 14.0), 3)
    spread = 0.02 + 0.2 * frequency * (1.0 - frequency)
    frequency_low = np.clip(frequency - spread, 0.0, 1.0)
    frequency_low[3] = np.nan
    frequency_high = np.clip(frequency + spread, 0.0, 1.0)
    frequency_high[3] = np.nan
    difference = np.round(1.1 * frequency * np.where(np.arange(n) % 3, 1.0, -1.0), 4)
    return ShortlistTable(
        feature=np.array(FEATURES, dtype=object),
        frequency=frequency,
        frequency_low=frequency_low,
        frequency_high=frequency_high,
        sign=np.array(["+" if d > 0 else "-" for d in difference], dtype=object),
        sign_share=np.ones(n),
        group=np.arange(n) // 2,
        group_frequency=np.clip(frequency + 0.05, 0.0, 1.0),
        picked=frequency >= 0.75,
        candidate=np.arange(n) < 25,
        mean_level=np.full(n, 7.5),
        difference=difference,
        difference_low=difference - 0.3,
        difference_high=difference + 0.3,
        single_marker_auc=0.5 + 0.3 * frequency,
        missing_share=np.where(np.arange(n) == 2, 0.031, 0.0),
        below_limit_share=np.full(n, np.nan),
        replicate_icc=np.full(n, np.nan),
        symbol=np.full(n, "", object),
        assayable=np.full(n, "wells", object),
    )


def frontier_rows():
    rows = []
    for maker, top in (("frequency", 0.80), ("univariate", 0.83)):
        for size in SIZES:
            metric = top - 0.17 / size - (0.004 * size if maker == "frequency" else 0.0)
            rows.append(
                FrontierRow(
                    panel=f"{maker}-{size}",
                    maker=maker,
                    size=size,
                    markers=FEATURES[:size],
                    metric_of="procedure",
                    metric=metric,
                    metric_low=metric - 0.055,
                    metric_high=metric + 0.045,
                    metric_se_naive=0.0091,
                    metric_se_corrected=0.0214,
                    slope=0.93 - 0.06 * size if size < 11 else np.nan,
                    cost_total=Decimal(30000 + 3150 * size).quantize(Decimal("0.01")),
                    cost_per_result=Decimal("16.20") + Decimal("1.70") * size,
                    cost_total_high=Decimal(30000 + 3200 * size).quantize(
                        Decimal("0.01")
                    ),
                    platform="plate-384",
                    on_frontier=maker == "univariate",
                    chosen_by={
                        "univariate-8": "smallest-within-one-se",
                        "univariate-11": "best-under-budget",
                    }.get(f"{maker}-{size}", ""),
                )
            )
    return tuple(rows)


def panel_cost(platform, factor):
    amounts = {
        "collection": Decimal("8000.00"),
        "setup": Decimal("1500.00") * factor,
        "samples": Decimal("12400.50"),
        "runs": Decimal("9120.00") * factor,
        "assays": Decimal("24180.25"),
    }
    lines = tuple(CostLine(name, value, value) for name, value in amounts.items())
    total = sum(amounts.values())
    return PanelCost(
        currency="EUR",
        platform=platform,
        lines=lines,
        total=total,
        total_high=total,
        cost_per_result=Decimal("29.80") * factor,
        cost_per_result_high=Decimal("29.80") * factor,
        one_off=Decimal("1500.00") * factor,
        recurring=total - Decimal("1500.00") * factor,
        per_year=Decimal("26850.38"),
        samples_run=1950,
        results=Fraction(9409, 5),
        pools=2,
        groups=(2,),
        samples_per_run=(23,),
        runs=85,
        positions_per_run=48,
        filled_positions=3978,
        control_positions=170,
        preparations=1,
        missing_quotes=(SCRIPT,) if factor == 2 else (),
    )


def random_panels(size):
    middle = 0.5 + 0.005 * size
    return Comparator(
        f"random panels of {size} from all features",
        size,
        middle,
        middle - 0.08,
        middle + 0.08,
        f"Lots of {size}.",
        "random-all",
        p=0.005,
    )


def lost(event, marker, loss, spread):
    return Fragility(
        event=event,
        marker=marker,
        level=np.nan,
        metric=0.8088 - loss,
        loss=loss,
        loss_low=loss - spread,
        loss_high=loss + spread,
        kind="by role",
        sentence=f"{marker} {event}.",
    )


def aftermath():
    """Eight markers, the first of them clearly missed; the fold's people in parts."""
    panel = FEATURES[:8]
    stand_ins = []
    for place, marker in enumerate(panel):
        loss = 0.004 * place
        stand_ins += [
            StandIn(marker, "PLIM001", "maker", 0.41, loss, loss - 0.02, loss + 0.02,
                    "by role", 0.24, Decimal("-310.20")),
            StandIn(marker, "", "companion", np.nan, 0.0, -0.02, 0.02, "by role", 0.0,
                    None),
        ]  # fmt: skip
    fragility = [
        lost(event, marker, (0.09 - 0.01 * place) * factor, 0.03)
        for event, factor in (("lost-refitted", 0.6), ("lost-imputed", 1.0))
        for place, marker in enumerate(panel)
    ]
    return Aftermath(
        stand_ins=tuple(stand_ins),
        fragility=tuple(fragility),
        subgroups=(
            Subgroup("ward", "Tarnbeck", 70, 25, 0.81, 0.70, 0.89, "Tarnbeck."),
            Subgroup("ward", SCRIPT, 52, 17, 0.76, 0.62, 0.86, "Script."),
            Subgroup("ward", "Isle", 6, 2, np.nan, np.nan, np.nan, "Isle: too few."),
            Subgroup("age", "20 to 45", 64, 21, 0.79, 0.66, 0.88, "Young."),
            Subgroup("age", "46 to 80", 64, 23, 0.78, 0.65, 0.87, "Old."),
        ),
        added_value=(
            AddedValue("loss", 0.671, 0.523, 0.148, 0.061, 0.235),
            AddedValue("brier", 0.238, 0.171, 0.067, 0.024, 0.110),
            AddedValue("net-benefit-at-0.2", 0.181, 0.214, 0.033, -0.004, 0.070),
            AddedValue("auc", 0.642, 0.801, 0.159, 0.071, 0.247),
        ),
        handling=(
            Handling("plate", "remission", 44, "epsilon-squared", 0.031, 0.58),
            Handling("hours", "relapse", 84, "spearman", -0.11, 0.32),
        ),
        learning_curve=(
            LearningPoint(0.4, 38.6, 0.71, 0.60, 0.80, 0.03, 0.07, -0.01, 0.15),
            LearningPoint(0.8, 77.4, 0.785, 0.69, 0.86, 0.02, -0.005, -0.04, 0.03),
            LearningPoint(1.0, 96.8, 0.78, 0.69, 0.85, 0.02),
        ),
    )


@pytest.fixture(scope="session")
def summary():
    findings = (
        Finding(
            "outcome-tied-to-batch",
            "stop",
            "samples.csv, column 'plate'",
            "41 of 44 positive samples were measured on plate P2.",
            "Measure again in random order, or leave plate P2 out",
        ),
        Finding(
            "few-positive-samples",
            "warning",
            "samples.csv, column 'response'",
            "There are 44 positive samples; intervals will be wide.",
            "Plan a larger cohort",
        ),
        Finding(
            "scale-found",
            "info",
            f"expression.csv, feature {SCRIPT}",
            "Values look like base-2 logarithms.",
            "",
        ),
    )
    return RunSummary(
        study="lindow-remission.toml",
        outcome="column 'response': remission against relapse",
        n_samples=128,
        n_subjects=121,
        n_features=18432,
        confidence=0.95,
        scheme="5 folds, 10 repeats, stratified by outcome and grouped by subject.",
        preparation=(
            "missing values filled with the feature's median",
            "features missing in more than 20 % of samples left out",
        ),
        findings=Findings(findings),
        flow=(
            Flow("remission", 50, 48, 47, 46, 44),
            Flow("relapse", 95, 92, 90, 88, 84),
            Flow("", 3, 2, 0, 0, 0),
        ),
        bound=ErrorBound(
            threshold=0.75,
            asked=40,
            realised=39.6,
            n_features=17990,
            worst_case=0.174,
            unimodal=0.0889,
            r_concave=np.nan,
            decides="worst-case",
            n_pairs=50,
            full_share=0.98,
        ),
        shortlist=shortlist(),
        frontier=Frontier(frontier_rows()),
        choice=Choice(
            headline=Headline(
                metric_of="the whole procedure, choice of size and maker included",
                metric=0.7864,
                metric_low=0.7021,
                metric_high=0.8513,
                declared=True,
                sentence=(
                    "Learning a panel by these rules from another cohort of this kind "
                    "would give about this accuracy in new people of the same kind."
                ),
            ),
            rules=(
                RuleChoice(
                    "best-under-budget",
                    False,
                    "univariate-11",
                    {"budget": 70000.0, "cost_total": 64650.0},
                    "11 markers by univariate cost 64,650.00 EUR of 70,000.00.",
                ),
                RuleChoice(
                    "smallest-within-one-se",
                    True,
                    "univariate-8",
                    {"best": 0.8145, "corrected_se": 0.0214},
                    "8 markers by univariate are within one standard error.",
                ),
                RuleChoice(
                    "cheapest-above-accuracy", False, "", {}, "No panel reaches 0.900."
                ),
            ),
        ),
        comparators=(
            Comparator(
                "ridge on all features",
                17990,
                0.821,
                0.752,
                0.874,
                "Dense.",
                "ridge",
                0.035,
                -0.012,
                0.082,
            ),
            Comparator(
                "lasso on all features", 96, 0.79, 0.72, 0.85, "Sparse.", "lasso"
            ),
            Comparator("age and sex", 0, 0.64, 0.55, 0.72, "Covariates.", "covariates"),
            Comparator("plates", 0, 0.48, 0.41, 0.55, "Nuisance.", "nuisance"),
            Comparator("spikes", 0, 0.52, 0.45, 0.59, "Controls.", "controls"),
            *(random_panels(size) for size in SIZES),
            Comparator(
                "random panels of 8, the chosen size, against the headline",
                8,
                0.55,
                0.48,
                0.62,
                "Headline against lots.",
                "random-headline",
                p=0.005,
            ),
            Comparator("nothing", 0, 0.5, np.nan, np.nan, "Guessing.", "no-feature"),
        ),
        costs=(panel_cost("plate-384", 1), panel_cost("strip-8", 2)),
        statement={
            "intended_use": "Choose patients for early follow-up.",
            "specimen": "Whole blood in stabilising tubes.",
        },
        provenance={
            "panelkit": "0.1.0",
            "seed": "1",
            "study_hash": "9f2c" * 16,
        },
        aftermath=aftermath(),
        metric="auc",
        metric_words="area under the ROC curve",
        no_skill=0.5,
        fold_costs=CostOfFolds(
            Decimal("51200.25"), Decimal("42600.00"), Decimal("64650.00"), 50, 50
        ),
    )


@pytest.fixture(scope="session")
def unpriced(summary):
    rows = tuple(
        replace(
            row,
            cost_total=None,
            cost_per_result=None,
            cost_total_high=None,
            platform="",
        )
        for row in summary.frontier.rows
    )
    return replace(summary, frontier=Frontier(rows), costs=(), fold_costs=None)
