"""One record of every class, made by hand."""

from decimal import Decimal
from fractions import Fraction
from pathlib import Path

import numpy as np
import pytest

from panelkit import records

REPOSITORY = Path(__file__).parents[2]
N_SAMPLES, N_FEATURES = 4, 3


def objects(*values):
    return np.array(values, dtype=object)


def floats(*shape):
    return np.linspace(0.1, 0.9, int(np.prod(shape))).reshape(shape)


def whole(*shape):
    return np.arange(int(np.prod(shape)), dtype=np.int64).reshape(shape)


def sizing_series():
    return records.SizingSeries("line", (1.0, 2.0), (0.4, 0.6))


def findings():
    return records.Findings(
        (
            records.Finding("few-subjects", "warning", "samples", "seen", "Do it."),
            records.Finding("class-sizes", "info", "samples", "seen", "Do it."),
        )
    )


def outcome():
    return records.Outcome(
        "binary", "response", "no", "yes", np.array([0.0, 1.0, 0.0, 1.0])
    )


def design():
    return records.Design(
        subject=np.array([0, 1, 2, 2]),
        subject_ids=objects("P0", "P1", "P2"),
        weights=floats(N_SAMPLES),
        site=objects("north", "north", "south", "south"),
        batch=None,
    )


def cohort():
    return records.Cohort(
        values=floats(N_FEATURES, N_SAMPLES),
        features=objects("F0", "F1", "F2"),
        samples=objects("S0", "S1", "S2", "S3"),
        outcome=outcome(),
        design=design(),
        sample_columns={"age": objects("31", "32", "33", "34")},
        feature_columns={"role": objects("marker", "marker", "control")},
        findings=findings(),
        dropped=(records.Dropped("sample", "S9", "matching", "no row"),),
        flow=(records.Flow("yes", 3, 2, 2, 2, 2),),
        sources={"expression": "0" * 64},
        replicates=replicates(),
    )


def replicates():
    return records.Replicates(
        samples=objects("S0b", "S2b"),
        of=np.array([0, 2]),
        values=floats(N_FEATURES, 2),
    )


def replicate_agreement():
    return records.ReplicateAgreement(
        features=objects("F0", "F1", "F2"),
        n_samples=whole(N_FEATURES),
        n_measurements=whole(N_FEATURES),
        mean=floats(N_FEATURES),
        icc=floats(N_FEATURES),
        within_sd=floats(N_FEATURES),
        cv=floats(N_FEATURES),
        difference=floats(N_FEATURES),
        difference_low=floats(N_FEATURES),
        difference_high=floats(N_FEATURES),
        in_log2=True,
    )


def bound():
    return records.ErrorBound(
        0.75, 3, 2.5, N_FEATURES, 0.8, 0.4, np.nan, "worst-case", 2, 0.5
    )


def stability():
    return records.Stability(
        frequency=floats(N_FEATURES),
        low=floats(N_FEATURES),
        high=floats(N_FEATURES),
        simultaneous=floats(N_FEATURES),
        positive_share=floats(N_FEATURES),
        picks=(whole(2), whole(1)),
        bound=bound(),
        shortlist=whole(1),
        candidates=whole(2),
        group=whole(N_FEATURES),
        group_frequency=floats(N_FEATURES),
        t=floats(N_FEATURES),
    )


def shortlist_table():
    kinds = {
        "feature": objects("F0", "F1"),
        "sign": objects("+", "-"),
        "group": whole(2),
        "picked": np.array([True, False]),
        "candidate": np.array([True, True]),
        "symbol": objects("", "ABL1"),
        "assayable": objects("wells", ""),
    }
    names = records.ShortlistTable.__dataclass_fields__
    return records.ShortlistTable(**{n: kinds.get(n, floats(2)) for n in names})


def agreement():
    return records.Agreement(0.4, 0.3, 0.5, np.nan, 0.2, 4)


def convergence():
    return records.Convergence(
        whole(2) + 1, whole(1), floats(2, 1), whole(2), whole(1), 0.75, 0.1, 0.1, 72
    )


def path_frequencies():
    return records.PathFrequencies(
        np.array([1.0, 0.5]), whole(2), floats(2, 2), floats(2), floats(2)
    )


def companions():
    return records.Companions(
        *(whole(2) for _ in range(3)),
        *(floats(2) for _ in range(5)),
        np.array([True, False]),
    )


def null_shortlist():
    return records.NullShortlist(
        whole(4), floats(4), floats(4), 1, 0.9, 0.9, 0.2, 0.2, 0.2,
        floats(N_FEATURES), floats(N_FEATURES), floats(N_FEATURES),
    )  # fmt: skip


def selector_result():
    return records.SelectorResult("lasso", bound(), whole(1), 0, 0.9, agreement())


def shortlist_results():
    return records.ShortlistResults(
        study="study.toml",
        outcome="response: yes against no",
        n_samples=N_SAMPLES,
        n_subjects=3,
        features=cohort().features,
        n_candidates_asked=2,
        findings=findings(),
        bound=bound(),
        shortlist=shortlist_table(),
        paths=path_frequencies(),
        convergence=convergence(),
        companions=companions(),
        null=null_shortlist(),
        selectors=(selector_result(),),
        agreement=agreement(),
    )


def frontier_row(maker="frequency", size=2):
    return records.FrontierRow(
        panel=f"{maker}-{size}",
        maker=maker,
        size=size,
        markers=("F0", "F1")[:size],
        metric_of="procedure",
        metric=0.8,
        metric_low=0.7,
        metric_high=0.9,
        metric_se_naive=0.02,
        metric_se_corrected=0.03,
        slope=0.9,
        cost_total=Decimal("1200.50"),
        cost_per_result=Decimal("12.01"),
        cost_total_high=None,
        platform="wells",
        on_frontier=True,
        chosen_by="smallest-within-one-se",
    )


def frontier():
    return records.Frontier((frontier_row(), frontier_row("univariate", 1)))


def headline(low=0.7):
    return records.Headline("the procedure", 0.8, low, 0.9, True, "A sentence.")


def choice():
    rule = records.RuleChoice(
        "smallest-within-one-se", True, "frequency-2", {"metric": 0.8}, "A sentence."
    )
    return records.Choice(headline(), (rule,))


def comparator():
    return records.Comparator("majority class", 0, 0.5, np.nan, np.nan, "A sentence.")


def assay():
    return records.AssayPrice(
        marker="F0", platform="wells", tiers=((1, Decimal("2.50")), (9, Decimal(2)))
    )


def panel_cost():
    return records.PanelCost(
        currency="EUR",
        platform="wells",
        lines=(records.CostLine("reagents", Decimal("9.50"), Decimal("10.00")),),
        **dict.fromkeys(
            (
                "total",
                "total_high",
                "cost_per_result",
                "cost_per_result_high",
                "one_off",
                "recurring",
                "per_year",
            ),
            Decimal("9.50"),
        ),
        samples_run=10,
        results=Fraction(19, 2),
        pools=1,
        groups=(1,),
        samples_per_run=(96,),
        runs=1,
        positions_per_run=96,
        filled_positions=12,
        control_positions=2,
        preparations=0,
    )


def path_set():
    return records.PathSet(
        family="gaussian",
        n_features=N_FEATURES,
        penalties=floats(2, 2),
        largest_penalty=floats(2),
        certificate=floats(2, 2),
        entry_order=(whole(2), whole(1)),
        entries=(whole(2), whole(1)),
        intercepts=floats(2, 2),
        coefficient_features=(whole(2), whole(1)),
        coefficient_values=(floats(2), floats(1)),
        coefficient_borders=np.array([[0, 1, 2], [0, 0, 1]]),
        covariate_coefficients=floats(2, 2, 1),
    )


def cost_of_folds():
    return records.CostOfFolds(Decimal(20), Decimal(10), Decimal(30), 6, 6)


def run_summary():
    return records.RunSummary(
        study="study.toml",
        outcome="response: yes against no",
        n_samples=N_SAMPLES,
        n_subjects=3,
        n_features=N_FEATURES,
        confidence=0.95,
        scheme="2 folds",
        preparation=("filter",),
        findings=findings(),
        flow=cohort().flow,
        bound=bound(),
        shortlist=shortlist_table(),
        frontier=frontier(),
        choice=choice(),
        comparators=(comparator(),),
        costs=(panel_cost(),),
        statement={},
        provenance={},
        aftermath=records.Aftermath((), (), (), (), (), ()),
        metric="auc",
        metric_words="area under the ROC curve",
        no_skill=0.5,
        fold_costs=cost_of_folds(),
    )


TEN = Decimal("10.00")


def break_even():
    crossing = records.Crossing(2, "B", TEN)
    return records.BreakEven(2, (crossing,), 2, 3, (1, 2), (TEN, TEN), (TEN, TEN))


def cost_sheet():
    row = records.SheetAssay(
        "F0", "marker", 1, TEN, TEN, None, None, (), False, Decimal(0), 1
    )
    return records.CostSheet(
        "A", panel_cost(), 2, (("samples", 10),), ((0, TEN),), (1,), (row,)
    )


def scenario():
    return records.ScenarioAnswer(
        "A", ("F0",), (panel_cost(),), (), None, (), None, (), (), cost_sheet()
    )


def panel_content():
    nan = float("nan")
    return records.PanelContent(
        panel_format=1,
        content_sha256="0" * 64,
        name="frequency-1",
        study="study.toml",
        outcome="response",
        negative="no",
        positive="yes",
        design="cohort",
        prevalence=nan,
        steps=(records.AssayStep("log2", "log2", {"offset": 1.0}),),
        references=(records.PanelReference("R1", 8.0),),
        markers=(
            records.PanelMarker(
                "F1", "", "", 1.0, 8.0, 1.0, 9.0, 1.0, 9.0, 5.0, 1.0, (4.0, 6.0), 1.0
            ),
        ),
        intercept=-5.0,
        cutoffs=(
            records.CutOff(
                "youden", 0.5, 0.0, 0.4, 0.6, 0.45, 0.55, 0.8, 0.7, 0.9, 0.8, 0.7, 0.9,
                nan, nan, nan, 0.2, "words",
            ),
        ),
        fallbacks=(records.Fallback("F1", 0.0, {}, 0.7, 0.1, 0.0, 0.2, "words"),),
        ridge_penalty=0.1,
        honest=records.HonestFigures("procedure", 0.8, 0.7, 0.9, 0.9, 0.9, "words"),
        training=records.TrainingRows(
            10, 10, 5, 0.5, 0.0, 1.0, ("aa",), ("bb",), {"samples": "0" * 64}
        ),
        record_sha256="0" * 64,
        seed=1,
        versions={"panelkit": "0.1.0"},
        parent=records.Parent("0" * 64, "intercept", 0.1, 1.0, 10, 5, "words"),
        cautions=("research use",),
    )  # fmt: skip


def validation():
    return records.Validation(
        panel="frequency-1",
        panel_sha256="0" * 64,
        plan_sha256="",
        scores_sha256="0" * 64,
        verdict="exploratory",
        sentence="words",
        samples=10,
        subjects=10,
        cases=5,
        controls=5,
        left_out=0,
        figures=(
            records.ValidationFigure("auc", "all", 0.8, 0.7, 0.9, 10, 5, "DeLong", ""),
        ),
        shifts=(records.MarkerShift("F1", *[0.1] * 9),),
        platform_shift=0.1,
        notes=(),
        openings=0,
        research_use="words",
    )


MADE = {
    "AssayStep": lambda: panel_content().steps[0],
    "CutOff": lambda: panel_content().cutoffs[0],
    "Fallback": lambda: panel_content().fallbacks[0],
    "HonestFigures": lambda: panel_content().honest,
    "MarkerShift": lambda: validation().shifts[0],
    "PanelContent": panel_content,
    "PanelMarker": lambda: panel_content().markers[0],
    "PanelReference": lambda: panel_content().references[0],
    "Parent": lambda: panel_content().parent,
    "TrainingRows": lambda: panel_content().training,
    "Validation": validation,
    "ValidationFigure": lambda: validation().figures[0],
    "AssayMap": lambda: records.AssayMap(
        objects("F0", "F1"), objects("CLDN3", "CLDN3"), objects("A1", "A1")
    ),
    "Agreement": agreement,
    "AssayPrice": assay,
    "Choice": choice,
    "Cohort": cohort,
    "Comparator": comparator,
    "Companions": companions,
    "Convergence": convergence,
    "CostLine": lambda: panel_cost().lines[0],
    "Design": design,
    "Dropped": lambda: cohort().dropped[0],
    "ErrorBound": bound,
    "Finding": lambda: findings()[0],
    "Findings": findings,
    "Flow": lambda: cohort().flow[0],
    "FoldPanels": lambda: records.FoldPanels(
        "frequency", 2, whole(2, 2, 2), floats(2, 2)
    ),
    "FoldPlan": lambda: records.FoldPlan(whole(2, N_SAMPLES) % 2, 2),
    "Frontier": frontier,
    "FrontierRow": frontier_row,
    "Headline": headline,
    "Opening": lambda: records.Opening.of(["S1"], "the panel is locked"),
    "NullShortlist": null_shortlist,
    "OutOfFold": lambda: records.OutOfFold("frequency", 2, floats(2, N_SAMPLES)),
    "Outcome": outcome,
    "PanelCost": panel_cost,
    "PathFrequencies": path_frequencies,
    "PathSet": path_set,
    "PriceList": lambda: records.PriceList((assay(),), findings()),
    "RecipeContext": lambda: records.RecipeContext(
        features=objects("F1", "F2", "F3"), batch=objects("a", "a", "b", "b")
    ),
    "RecipeState": lambda: records.RecipeState(
        floats(N_FEATURES), np.ones(N_FEATURES, bool), objects("", "", "constant")
    ),
    "ReplicateAgreement": replicate_agreement,
    "Replicates": replicates,
    "RuleChoice": lambda: choice().rules[0],
    "RunRecord": lambda: records.RunRecord(
        1, "0.1.0", {"seed": 1}, {"samples": "0" * 64}, {"python": "3.11"}
    ),
    "RunSummary": run_summary,
    "SelectorResult": selector_result,
    "ShortlistResults": shortlist_results,
    "ShortlistTable": shortlist_table,
    "SizingAnswer": lambda: records.SizingAnswer(
        "question", "answer", {"people": 3}, {"width": 0.1}, ("words",), (), None, ()
    ),
    "SizingCurve": lambda: records.SizingCurve(
        "name", "title", "caption", "x", "y", (sizing_series(),), 0.5
    ),
    "SizingSeries": lambda: sizing_series(),
    "SizingTable": lambda: records.SizingTable(
        "name", "title", ("a", "b"), ((1, 2.0),)
    ),
    "Stability": stability,
    "StepState": lambda: records.StepState("log-cpm", {"library": floats(1)}),
    "SubsamplePlan": lambda: records.SubsamplePlan((whole(2), whole(2) + 2)),
    "AddedValue": lambda: records.AddedValue("brier", 0.2, 0.15, 0.05, 0.01, 0.09),
    "Aftermath": lambda: records.Aftermath((), (), (), (), (), ()),
    "CostOfFolds": cost_of_folds,
    "Fragility": lambda: records.Fragility(
        "lost-refitted", "F1", float("nan"), 0.8, 0.05, 0.0, 0.1, "by role", "words"
    ),
    "Handling": lambda: records.Handling("run", "1", 20, "spearman", 0.1, 0.6),
    "LearningPoint": lambda: records.LearningPoint(0.4, 20.0, 0.7, 0.6, 0.8, 0.05),
    "StandIn": lambda: records.StandIn(
        "F1", "F2", "maker", 0.9, 0.01, 0.0, 0.02, "by role", 0.5, None
    ),
    "Subgroup": lambda: records.Subgroup("site", "A", 20, 8, 0.8, 0.7, 0.9, "words"),
    "TunedChoice": lambda: records.TunedChoice(
        whole(2, 2), whole(2, 2), np.ones((2, 2), bool)
    ),
}


MADE |= {
    "Assumption": lambda: records.Assumption("samples", "10", "given"),
    "BreakEven": break_even,
    "Conflict": lambda: records.Conflict("F0", "F1"),
    "Conflicts": lambda: records.Conflicts((records.Conflict("F0", "F1"),)),
    "CostSheet": cost_sheet,
    "Crossing": lambda: break_even().crossings[0],
    "Driver": lambda: records.Driver("F0", TEN, TEN, None, ""),
    "KitPurchase": lambda: records.KitPurchase("K", 1, TEN, TEN, ("F0",), ()),
    "PriceAnswer": lambda: records.PriceAnswer("EUR", 10, 12, (scenario(),)),
    "PriceQuestion": lambda: records.PriceQuestion("F0", "wells", None, "Ask."),
    "ScenarioAnswer": scenario,
    "SheetAssay": lambda: cost_sheet().assays[0],
    "Spares": lambda: records.Spares(
        1, 0.95, 2, ("S",), 0.96, 0.8, TEN, TEN, True, True
    ),
    "SplitCost": lambda: records.SplitCost(
        (panel_cost(),), (("F0",),), TEN, TEN, Fraction(10), TEN, True
    ),
    "Stair": lambda: records.Stair(1, "F0", TEN, TEN, None, ""),
    "StepDown": lambda: records.StepDown(1, ("F0",), "1 pool", TEN),
    "Variation": lambda: records.Variation(
        "A", "samples", "10", "wells", TEN, TEN, 1, Fraction(1, 8), 1
    ),
}


@pytest.fixture(scope="session")
def make_record():
    """Make one record of a class by its name; see `record_names`."""
    return lambda name: MADE[name]()


@pytest.fixture(scope="session")
def record_names():
    return set(MADE)


@pytest.fixture(scope="session")
def repository():
    return REPOSITORY
