"""What the chosen panel loses, gains and depends on."""

from dataclasses import replace

import numpy as np
import pytest
from scipy.stats import norm

from panelkit.costing import (
    BinaryTask,
    Judge,
    Primary,
    Procedure,
    Rule,
    added_value_of,
    apply_rule,
    compare,
    comparisons_for,
    draw_everything,
    estimate_accuracy,
    fragility_of,
    handling_of,
    learn_roles,
    learning_curve,
    stand_ins_of,
    subgroups_of,
    tune_on_everyone,
)
from panelkit.costing.comparisons import RandomPanels
from panelkit.costing.primary import choose_for_everyone
from panelkit.costing.subgroups import bands
from panelkit.preparation import Recipe
from panelkit.records import FoldPlan, OutOfFold
from panelkit.runtime import MemoryStore
from panelkit.stability import ShortlistRules

RULE = Rule("smallest-within-one-se")
ANYBODY = np.random.default_rng(5)


def judge_of(y, folds, subjects=None):
    n = len(y)
    return Judge(
        BinaryTask(y),
        np.arange(n) if subjects is None else subjects,
        np.ones(n),
        folds,
        0.95,
    )


@pytest.fixture(scope="module")
def done(drawn_cohort):
    """A cohort whose feature 1 is a near copy of feature 0, the only strong marker."""
    cohort = drawn_cohort(7, 60, 120)
    cohort.base[0] += 1.8 * cohort.y
    cohort.base[1] = cohort.base[0] + 0.15 * ANYBODY.normal(size=60)
    age = 50.0 + 4.0 * cohort.y + 8.0 * ANYBODY.normal(size=60)
    data = cohort.data(covariates=age[None, :])
    procedure = Procedure(
        Recipe(("filter", "median-fill")),
        ShortlistRules(markers_per_subsample=5, n_penalties=10, candidates=8),
        makers=("univariate",),
        sizes=(1, 3),
    )
    draws = draw_everything(
        data,
        seed=3,
        n_folds=4,
        n_repeats=2,
        n_inner=3,
        subsamples=8,
        inner_subsamples=6,
    )
    random = RandomPanels.drawn(
        (1, 3), np.arange(120), 20, 40, np.random.default_rng(1)
    )
    store = MemoryStore()
    accuracy = estimate_accuracy(
        procedure,
        data,
        draws,
        "done",
        store,
        comparisons=comparisons_for(data, random),
    )
    everyone = tune_on_everyone(procedure, data, draws, "done", store)
    nested, chosen = apply_rule(RULE, procedure, accuracy, draws.folds)
    taken = choose_for_everyone(RULE, procedure, everyone)
    primary = Primary(RULE, True, nested, chosen, taken)
    judge = judge_of(cohort.y, draws.folds)
    return cohort, data, procedure, draws, accuracy, primary, judge, store


def roles_of(done, row=0):
    _, data, procedure, draws, accuracy, *_, store = done
    return learn_roles(procedure, data, draws, accuracy, row, "done", store)


def test_a_companion_stands_in_where_losing_the_marker_loses_everything(done):
    _, data, procedure, draws, accuracy, _, judge, _ = done
    selected = procedure.select(data, draws.everyone)
    panel = selected.panels[0]
    rows = stand_ins_of(
        roles_of(done),
        accuracy.panels[0],
        panel,
        selected,
        np.array([f"F{j}" for j in range(120)], object),
        judge,
        None,
    )
    maker, companion = rows
    assert {maker.marker, companion.stand_in} == {"F0", "F1"}
    assert companion.correlation > 0.98
    assert abs(companion.loss) < 0.05
    assert companion.loss_low < companion.loss < companion.loss_high
    assert companion.same_in_folds > 0.5
    assert companion.kind == "by role"
    lost, imputed = fragility_of(roles_of(done), accuracy.panels[0], ["F0"], judge)
    assert (lost.metric, imputed.metric) == (0.5, 0.5)  # nothing is left
    assert lost.loss == pytest.approx(judge.metric(accuracy.panels[0]).mean - 0.5)


def test_each_role_of_a_larger_panel_is_lost_in_turn(done):
    accuracy, judge = done[4], done[6]
    losses = roles_of(done, row=1)
    rows = fragility_of(losses, accuracy.panels[1], ["a", "b", "c"], judge)
    assert [row.event for row in rows] == 3 * ["lost-refitted"] + 3 * ["lost-imputed"]
    gravest = [row.loss for row in rows[:3]]
    assert gravest == sorted(gravest, reverse=True)
    # its near copy is in the panel too, so the refit hardly misses the best marker
    assert rows[0].loss < 0.15


def test_held_out_outcomes_reach_no_prediction_by_role(done):
    cohort, data, procedure, draws, accuracy, *_ = done
    from dataclasses import replace

    test = draws.folds.split(0, 1)[1]
    other = cohort.y.copy()
    other[test] = 1.0 - other[test]
    changed = replace(data, task=BinaryTask(other))
    again = learn_roles(
        procedure,
        changed,
        draws,
        accuracy,
        1,
        "other",
        MemoryStore(),
    )
    for key, one in roles_of(done, row=1).predictions.items():
        here = again.predictions[key].predicted[0, test]
        assert one.predicted[0, test].tobytes() == here.tobytes()


def test_covariates_with_the_panel_beat_covariates_alone(done):
    accuracy, primary, judge = done[4], done[5], done[6]
    rows = {row.measure: row for row in added_value_of(accuracy, primary, judge)}
    assert set(rows) == {
        "loss",
        "brier",
        *(f"net-benefit-at-{t:g}" for t in (0.1, 0.2, 0.3, 0.5)),
        "auc",
    }
    for name in ("loss", "brier", "auc"):
        assert rows[name].gain > 0.0  # a marker of effect 1.8 against age
        assert rows[name].gain_low < rows[name].gain < rows[name].gain_high
    assert rows["loss"].gain_low > 0.0
    assert rows["loss"].gain == pytest.approx(
        rows["loss"].covariates - rows["loss"].with_panel
    )
    assert rows["brier"].covariates > rows["brier"].with_panel


def test_the_learning_curve_ends_at_the_headline_of_the_first_repeat(done):
    _, data, procedure, draws, _, primary, judge, store = done
    points = learning_curve(
        procedure, data, draws, RULE, primary.predictions, judge, "done", store
    )
    assert [point.share for point in points] == [0.4, 0.6, 0.8, 1.0]
    assert [point.n_subjects for point in points] == pytest.approx(
        [18, 27, 36, 45], abs=1.0
    )
    first = judge_of(done[0].y, FoldPlan(draws.folds.test_fold[:1], 4))
    whole = OutOfFold("", 0, primary.predictions.predicted[:1])
    assert points[-1].metric == first.metric(whole).mean
    assert np.isnan(points[-1].gain)
    for point in points[:-1]:
        assert point.gain == pytest.approx(points[-1].metric - point.metric)
        assert point.gain_low < point.gain < point.gain_high


def compared(done, primary=None):
    _, _, _, _, accuracy, own, judge, _ = done
    rows = compare(accuracy, judge, primary or own, 120)
    return {(row.kind, row.size): row for row in rows}


def test_a_comparator_that_is_the_panel_itself_is_called_identical(done):
    accuracy, primary = done[4], done[5]
    one = next(each for each in accuracy.panels if each.size == 1)
    rows = compared(done, replace(primary, predictions=one))
    same = rows["one-marker", 1]
    assert "identical to the primary rule in every fold" in same.sentence
    assert "+0.000" not in same.sentence
    assert (same.difference, same.difference_low, same.difference_high) == (0, 0, 0)
    assert not [
        row
        for key, row in rows.items()
        if key[0] != "one-marker" and "identical" in row.sentence
    ]


def test_random_panels_are_held_against_the_headline_too(done):
    """p = (1 + panels at least as good) / (panels + 1), Phipson & Smyth 2010."""
    accuracy, primary, judge = done[4], done[5], done[6]
    rows = compared(done)
    size = accuracy.panels[primary.taken.row].size
    row = rows["random-headline", size]
    figures = accuracy.figures["random panels from all"]
    drawn = np.nanmean(figures[:, :, (1, 3).index(size)], axis=(0, 1))
    first = judge.metric(primary.predictions).per_fold[0].mean()
    better = (drawn >= first).sum()
    assert row.p == pytest.approx((1 + better) / (len(drawn) + 1))
    assert row.metric == rows["random-all", size].metric
    assert "better than random panels of the chosen size" in row.sentence
    assert np.isnan(rows["ridge", 120].p)


def test_thinned_folds_keep_test_rows_and_classes(done):
    from panelkit.costing.learning_curve import thinned

    cohort, data, _, draws, *_ = done
    split = draws.splits[0, 2]
    thin = thinned(split, data, 0.5, (50, 2), draws.rules)
    assert thin.test.tolist() == split.test.tolist()
    assert set(thin.training) < set(split.training)
    counts = [int((cohort.y[thin.training] == value).sum()) for value in (0, 1)]
    whole = [int((cohort.y[split.training] == value).sum()) for value in (0, 1)]
    assert counts == [round(0.5 * n) for n in whole]


# subgroups and handling


@pytest.fixture
def scored():
    """Scores that separate in clinic A and not in clinic B, and follow the run."""
    draws = np.random.default_rng(2)
    y = np.arange(240) % 2 * 1.0
    clinic = np.array(["A"] * 120 + ["B"] * 116 + ["C"] * 4, object)
    run = np.arange(240) % 60
    score = draws.normal(size=240) + 0.05 * run + np.where(clinic == "A", 2.0 * y, 0.0)
    folds = FoldPlan((np.arange(240)[None, :] // 2) % 4, 4)
    return y, clinic, run, score, folds


def test_accuracy_within_groups(scored):
    y, clinic, _, score, folds = scored
    judge = judge_of(y, folds)
    rows = {
        row.group: row
        for row in subgroups_of(
            OutOfFold("p", 0, score[None, :]), judge, {"clinic": clinic}
        )
    }
    spread = np.sqrt(2.0 * (1.0 + 0.05**2 * (60**2 - 1) / 12))
    expected = norm.cdf(2.0 / spread)  # two normal classes of equal spread
    assert rows["A"].metric == pytest.approx(expected, abs=0.06)
    assert rows["A"].metric_low < expected < rows["A"].metric_high
    assert rows["B"].metric == pytest.approx(0.5, abs=0.12)
    assert np.isnan(rows["C"].metric)
    assert "too few" in rows["C"].sentence
    assert (rows["C"].n_samples, rows["C"].n_events) == (4, 2)


def test_numbers_are_banded_and_texts_kept():
    thirds = bands(np.array([str(v) for v in range(30)], object))
    assert list(thirds) == ["0 to 9", "10 to 19", "20 to 29"]
    assert bands(np.array(["x"] * 5, object)) is None
    found = bands(np.array(["a", "", "b", "a"], object))
    assert {k: v.tolist() for k, v in found.items()} == {"a": [0, 3], "b": [2]}


def test_a_score_that_follows_the_run_order_is_found_within_classes(scored):
    y, _, run, score, folds = scored
    judge = judge_of(y, folds)
    columns = {
        "run": np.array([str(v) for v in run], object),
        "colour": np.array(["red", "blue", "red"] * 80, object),
    }
    rows = handling_of(OutOfFold("p", 0, score[None, :]), judge, columns)
    run_rows = [row for row in rows if row.column == "run"]
    assert {row.group for row in run_rows} == {"0", "1"}
    assert all(row.statistic == "spearman" and row.p < 1e-3 for row in run_rows)
    colours = [row for row in rows if row.column == "colour"]
    assert all(row.statistic == "epsilon-squared" for row in colours)
    assert all(row.value < 0.1 for row in colours)
