"""Every figure of a run follows from its own tables, by another library."""

import math
import statistics

import numpy as np
import pandas as pd
import pytest
from sklearn.linear_model import LogisticRegression
from sklearn.metrics import roc_auc_score

LASSO = ("lasso-on-all", "lasso-on-all-one-se")


def areas(predictions):
    """Return the area within each test fold, repeats by folds."""
    folds = predictions.groupby(["repeat", "fold"])
    by_fold = folds.apply(
        lambda fold: roc_auc_score(
            fold["outcome"], fold["score"], sample_weight=fold["weight"]
        ),
        include_groups=False,
    )
    return by_fold.unstack("fold").to_numpy()


@pytest.fixture(scope="module")
def procedures(finished):
    """Out-of-fold predictions by maker and size."""
    table = finished.table("predictions.csv")
    weights = finished.table("folds.csv").drop_duplicates("sample")
    table = table.merge(weights[["sample", "weight"]], on="sample")
    return {key: rows for key, rows in table.groupby(["maker", "size"])}


def test_every_procedure_is_there(finished, procedures):
    frontier = finished.table("frontier.csv")
    expected = set(zip(frontier["maker"], frontier["size"], strict=True))
    assert len(expected) == 6
    assert set(procedures) == expected | {
        (name, 0)
        for name in ("primary-rule", "ridge-on-all", "control-features", *LASSO)
    }


def test_frontier_recomputes(finished, procedures):
    """Pooling the folds instead would differ: each fold has its own level."""
    differs = 0
    for row in finished.table("frontier.csv").itertuples():
        rows = procedures[row.maker, row.size]
        within = areas(rows)
        assert within.shape == (2, 3)
        assert row.metric == pytest.approx(within.mean(axis=1).mean(), abs=1e-12)
        assert row.metric_low < row.metric < row.metric_high
        pooled = [
            roc_auc_score(repeat["outcome"], repeat["score"])
            for _, repeat in rows.groupby("repeat")
        ]
        differs += abs(np.mean(pooled) - row.metric) > 1e-6
    assert differs


def test_standard_errors_recompute(finished, procedures):
    """Nadeau & Bengio: 1/J and test to training rows, here 1 to 2."""
    for row in finished.table("frontier.csv").itertuples():
        within = areas(procedures[row.maker, row.size])
        deviation = within.std(ddof=1)
        naive = deviation / math.sqrt(within.size)
        corrected = deviation * math.sqrt(1.0 / within.size + 1.0 / 2.0)
        assert row.metric_se_naive == pytest.approx(naive, abs=1e-12)
        assert row.metric_se_corrected == pytest.approx(corrected, abs=1e-12)


def test_slopes_recompute(finished, procedures):
    """Tolerance 1e-3: the other library stops by its own gradient rule."""
    for row in finished.table("frontier.csv").itertuples():
        slopes = []
        for _, rows in procedures[row.maker, row.size].groupby("repeat"):
            log_odds = np.log(rows["score"] / (1.0 - rows["score"])).to_numpy()
            model = LogisticRegression(C=np.inf, tol=1e-10)
            model.fit(log_odds[:, None], rows["outcome"], rows["weight"])
            slopes.append(model.coef_[0, 0])
        assert row.slope == pytest.approx(np.mean(slopes), rel=1e-3)


def test_headline_recomputes(finished, procedures):
    headline = finished.json("choice.json")["headline"]
    within = areas(procedures["primary-rule", 0])
    assert headline["metric"] == pytest.approx(within.mean(), abs=1e-12)
    assert headline["metric_low"] < headline["metric"] < headline["metric_high"]
    assert f"{headline['metric']:.3f}" in headline["sentence"]
    assert headline["declared"] is True


def test_comparators_recompute(finished, procedures):
    table = finished.table("comparators.csv").set_index("name")
    expected = {
        "ridge on all features": ("ridge-on-all", 0),
        "one marker, the most different in each fold": ("univariate", 1),
        "lasso on all features, smallest loss": ("lasso-on-all", 0),
        "lasso on all features, one SE": ("lasso-on-all-one-se", 0),
    }
    for name, key in expected.items():
        value = areas(procedures[key]).mean()
        assert table.loc[name, "metric"] == pytest.approx(value, abs=1e-12)
    assert table.loc["no feature at all", "metric"] == 0.5


def test_differences_to_the_primary_rule_recompute(finished, procedures):
    """Comparator minus primary rule, mean over folds; only models have one."""
    table = finished.table("comparators.csv").set_index("kind")
    primary = areas(procedures["primary-rule", 0])
    for kind, name in (
        ("ridge", "ridge-on-all"),
        ("lasso", "lasso-on-all"),
        ("controls", "control-features"),
    ):
        gap = areas(procedures[name, 0]) - primary
        row = table.loc[kind]
        assert row["difference"] == pytest.approx(gap.mean(), abs=1e-12)
        assert row["difference_low"] <= row["difference"] <= row["difference_high"]
    assert table.loc["random-headline", "p"] >= 1 / 201
    assert np.isnan(table.loc["no-feature", "difference"])


def test_a_rule_carries_its_panel_platform_and_cost(finished):
    frontier = finished.table("frontier.csv").set_index("panel")
    rules = finished.json("choice.json")["rules"]
    assert len(rules) == 3
    for rule in rules:
        row = frontier.loc[rule["panel"]]
        assert rule["markers"] == row["markers"].split(";")
        assert rule["platform"] == row["platform"]
        assert rule["currency"] == "EUR"
        assert float(rule["cost_total"]) == pytest.approx(row["cost_total"])
        assert float(rule["cost_per_result"]) == pytest.approx(row["cost_per_result"])


def test_cost_of_what_the_folds_chose(finished):
    """Median and range of the panels that the primary rule chose, on the page."""
    panels = finished.table("fold_panels.csv")
    costs = panels.loc[panels["chosen_by_primary"], "cost_total"].tolist()
    assert len(costs) == 6
    page = (finished.path / "report.html").read_text()
    middle = statistics.median_low(costs)
    assert (
        f"costs {middle:,.2f} EUR at the median, {min(costs):,.2f} to "
        f"{max(costs):,.2f}" in page
    )


def test_the_choice_recomputes(finished, procedures):
    """Smallest size whose paired difference to the best is within one corrected SE."""
    frontier = finished.table("frontier.csv")
    within = {
        row.panel: areas(procedures[row.maker, row.size]).ravel()
        for row in frontier.itertuples()
    }
    best = max(within, key=lambda panel: round(within[panel].mean(), 9))
    near = []
    for row in frontier.itertuples():
        gap = within[best] - within[row.panel]
        error = gap.std(ddof=1) * math.sqrt(1.0 / len(gap) + 1.0 / 2.0)
        if gap.mean() <= error + 1e-12:
            near.append(row)
    rules = {rule["rule"]: rule for rule in finished.json("choice.json")["rules"]}
    smallest = min(near, key=lambda row: (row.size, -round(row.metric, 9)))
    cheapest = min(near, key=lambda row: (row.cost_total, row.size, -row.metric))
    by_size, by_cost = (
        f"{kind}-within-one-se-on-curve" for kind in ("smallest", "cheapest")
    )
    assert rules[by_size]["panel"] == smallest.panel
    assert rules[by_cost]["panel"] == cheapest.panel
    chosen = frontier.set_index("panel")["chosen_by"].fillna("")
    assert by_size in chosen[smallest.panel].split(";")
    assert by_cost in chosen[cheapest.panel].split(";")
    primary = finished.json("choice.json")["rules"][0]
    assert primary["primary"] is True
    assert "smallest-within-one-se" in chosen[primary["panel"]].split(";")
    figures = rules[by_size]["figures"]
    gap = within[best] - within[smallest.panel]
    assert figures["difference_to_best"] == pytest.approx(gap.mean(), abs=1e-12)


def test_the_frontier_is_what_no_row_dominates(finished):
    rows = finished.table("frontier.csv")
    for row in rows.itertuples():
        better = rows[
            (rows["cost_total"] <= row.cost_total)
            & (rows["metric"].round(9) >= round(row.metric, 9))
            & (
                (rows["cost_total"] < row.cost_total)
                | (rows["metric"].round(9) > round(row.metric, 9))
            )
        ]
        assert row.on_frontier == better.empty


def test_costs_add_up_to_the_cent(finished):
    """The chosen panel's lines on its platform are its total on the frontier."""
    costs = finished.table("costs.csv")
    choice = finished.json("choice.json")["rules"][0]["panel"]
    row = finished.table("frontier.csv").set_index("panel").loc[choice]
    lines = costs[costs["platform"] == row["platform"]]
    assert lines["amount"].sum() == pytest.approx(row["cost_total"], abs=0.004)
    totals = costs.groupby("platform")["amount"].sum()
    assert len(totals) == 2
    assert totals.idxmin() == row["platform"]


def test_single_marker_figures_recompute(finished, study):
    """Area and Welch difference of each marker, from the files of the study."""
    values = pd.read_csv(study.parent / "expression.csv", index_col=0)
    sheet = pd.read_csv(study.parent / "samples.csv", index_col=0)
    sick = (sheet["response"] == "yes").to_numpy()
    weights = finished.table("folds.csv").drop_duplicates("sample").set_index("sample")
    share = weights["weight"].reindex(sheet.index).to_numpy()
    for row in finished.table("shortlist.csv").itertuples():
        column = values[row.feature]
        assert row.missing_share == pytest.approx(column.isna().mean())
        filled = column.fillna(column.median()).to_numpy()
        area = roc_auc_score(sick, filled, sample_weight=share)
        up = area if row.sign == "+" else 1.0 - area
        assert row.single_marker_auc == pytest.approx(up, abs=1e-12)
