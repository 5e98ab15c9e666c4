"""What is locked: the refit, its shrinkage, the intercept, and what is refused."""

import csv
import json

import numpy as np
import pandas as pd
import pytest
from scipy.optimize import minimize

from panelkit import LockedPanel, lock_panel, run_study
from panelkit.errors import StudyFileError, UsageError
from panelkit.metrics import auc, calibration_in_the_large, recalibration


def rows(path):
    with path.open(newline="", encoding="utf-8") as file:
        return list(csv.DictReader(file))


@pytest.fixture
def panel(locked):
    return LockedPanel.read(locked.panel).content


def training(locked, panel):
    """Return prepared marker values and the outcome, by pandas."""
    frame = pd.read_csv(locked.folder / "expression.csv", index_col=0)
    sheet = pd.read_csv(locked.folder / "samples.csv", index_col=0)
    logs = np.log2(frame + 1.0)
    X = logs.fillna(logs.median())[[m.feature for m in panel.markers]].to_numpy()
    return X, (sheet["response"] == "yes").to_numpy(float)


def test_coefficients_are_a_shrunken_ridge_fit(locked, panel):
    """The objective written out and minimised by scipy, on standardised values."""
    X, y = training(locked, panel)
    scale = X.std(axis=0)
    Z = (X - X.mean(axis=0)) / scale

    def loss(at):
        eta = at[0] + Z @ at[1:]
        penalty = 0.5 * panel.ridge_penalty * (at[1:] ** 2).sum()
        return (np.logaddexp(0.0, eta) - y * eta).mean() + penalty

    found = minimize(loss, np.zeros(1 + Z.shape[1]), tol=1e-12).x
    expected = panel.honest.shrinkage * found[1:] / scale
    own = [marker.coefficient for marker in panel.markers]
    assert own == pytest.approx(expected, rel=1e-4)
    chances = 1 / (1 + np.exp(-(panel.intercept + X @ np.array(own))))
    assert chances.mean() == pytest.approx(y.mean(), abs=1e-6)
    for k, marker in enumerate(panel.markers):
        assert marker.fill == pytest.approx(np.median(X[:, k]), abs=1e-5)
        means = [X[y == c, k].mean() for c in (0.0, 1.0)]
        assert marker.class_means == pytest.approx(means, abs=1e-5)
        assert marker.prepared_deviation == pytest.approx(scale[k], rel=1e-5)


def test_shrinkage_is_the_nested_slope(locked, panel):
    own = [r for r in rows(locked.run / "predictions.csv") if r["size"] == "0"
           and r["maker"] == "primary-rule"]  # fmt: skip
    p = np.array([float(r["score"]) for r in own])
    y = np.array([float(r["outcome"]) for r in own])
    slope = recalibration(np.log(p / (1 - p)), y).slope
    assert panel.honest.slope == pytest.approx(slope, abs=1e-9)
    assert panel.honest.shrinkage == pytest.approx(min(slope, 1.0), abs=1e-9)
    choice = json.loads((locked.run / "choice.json").read_text())
    assert panel.honest.metric == choice["headline"]["metric"]
    assert panel.honest.metric_of == choice["headline"]["metric_of"]


def test_a_run_writes_what_it_chose(locked, panel):
    chosen = {
        r["panel"]
        for r in json.loads((locked.run / "choice.json").read_text())["rules"]
    }
    written = {path.stem for path in (locked.run / "panels").glob("*.json")}
    assert written == chosen
    assert rows(locked.run / "panels" / "not_locked.csv") == []
    one = LockedPanel.read(locked.run / "panels" / f"{panel.name}.json").content
    assert one.markers == panel.markers
    assert one.training == panel.training


def test_refitting_on_the_study_gives_the_same_file(locked, tmp_path):
    lock_panel(
        locked.run,
        tmp_path / "again.json",
        study=locked.study,
        cutoffs=["youden", "sensitivity=0.9"],
    )
    assert (tmp_path / "again.json").read_bytes() == locked.panel.read_bytes()


def test_any_panel_of_the_frontier_can_be_locked(locked, tmp_path):
    names = [r["panel"] for r in rows(locked.run / "frontier.csv")]
    written = {path.stem for path in (locked.run / "panels").glob("*.json")}
    other = next(name for name in names if name not in written)
    with pytest.raises(UsageError, match="--study"):
        lock_panel(locked.run, tmp_path / "x.json", panel=other)
    found = lock_panel(locked.run, tmp_path / "x.json", panel=other, study=locked.study)
    assert found.name == other
    assert found.fallbacks == ()  # by-role figures are known of the primary panel only


def test_fallbacks_carry_the_figures_by_role(locked, panel):
    known = {
        r["marker"]: float(r["metric"])
        for r in rows(locked.run / "fragility.csv")
        if r["event"] == "lost-refitted"
    }
    assert {each.missing: each.metric for each in panel.fallbacks} == known


def test_study_of_another_run_is_refused(locked, study_with, tmp_path):
    other = study_with('site = "site"')
    with pytest.raises(Exception, match="are not those of") as caught:
        lock_panel(locked.run, tmp_path / "x.json", study=other)
    assert caught.value.exit_code == 7


@pytest.mark.parametrize("how", [{"rule": "none"}, {"panel": "none-1"}])
def test_unknown_names_are_refused(locked, tmp_path, how):
    with pytest.raises(UsageError, match="no such rule or panel"):
        lock_panel(locked.run, tmp_path / "x.json", **how)


def test_a_recipe_that_needs_whole_samples_is_not_locked(study_with, tmp_path):
    study = study_with('[preparation]\ndiscovery = ["log2", "quantile", "median-fill"]')
    run = run_study(study, tmp_path / "run", threads=1).path
    reasons = rows(run / "panels" / "not_locked.csv")
    assert reasons
    assert all(
        "'quantile' needs" in r["reason"] for r in reasons if "needs" in r["reason"]
    )
    assert list((run / "panels").glob("*.json")) == []
    with pytest.raises(UsageError, match="'quantile' needs"):
        lock_panel(run, tmp_path / "x.json")
    with pytest.raises(StudyFileError, match=r"'quantile' needs .* features"):
        lock_panel(run, tmp_path / "x.json", study=study)


def test_references_are_frozen_as_assays(study_with, tmp_path):
    """A common factor of a sample cancels; a missing reference is filled."""
    steps = '["log2", "reference-ratio", "median-fill"]'
    study = study_with(f"[preparation]\nassay = {steps}")
    run = run_study(study, tmp_path / "run", threads=1).path
    locked = LockedPanel(lock_panel(run, tmp_path / "p.json"))
    assert {each.feature for each in locked.content.references} == {"F28", "F29"}
    frame = pd.read_csv(study.parent / "expression.csv", index_col=0)
    more = (frame + 1.0) * 1.5 - 1.0  # log2(x + 1) moves by the same everywhere
    complete = ~frame[list(locked.content.features)].isna().any(axis=1).to_numpy()
    before, after = locked.score(frame), locked.score(more)
    assert after.log_odds[complete] == pytest.approx(
        before.log_odds[complete], abs=1e-4
    )
    frame.loc[frame.index[0], "F28"] = np.nan
    assert "F28:filled" in locked.score(frame).flags[0]


def test_case_control_chances_are_for_the_stated_prevalence(
    locked, panel, study_with, tmp_path
):
    study = study_with('[design]\nkind = "case-control"\nprevalence = 0.1')
    run = run_study(study, tmp_path / "run", threads=1).path
    found = lock_panel(run, tmp_path / "p.json", cutoffs=["youden"])
    assert [m.feature for m in found.markers] == [m.feature for m in panel.markers]
    # Anderson 1972, Biometrika 59:19: the intercept moves by the log odds ratio
    share = panel.training.prevalence
    moved = np.log(0.1 / 0.9) - np.log(share / (1 - share))
    assert found.intercept - panel.intercept == pytest.approx(moved, abs=1e-9)
    assert found.prevalence == 0.1
    cut, old = found.cutoffs[0], panel.cutoffs[0]
    assert cut.log_odds - old.log_odds == pytest.approx(moved, abs=1e-6)
    assert cut.positive_value < 0.1 + cut.sensitivity
    assert not np.isnan(cut.positive_value)
    assert np.isnan(old.positive_value)
    assert any("prevalence of 0.1" in line for line in found.cautions)


def test_out_of_fold_scale_and_panel_scale_are_one(locked, panel):
    """Recalibrated out-of-fold chances are right on average, as the panel's are."""
    X, y = training(locked, panel)
    own = panel.intercept + X @ np.array([m.coefficient for m in panel.markers])
    assert calibration_in_the_large(own, y)[0] == pytest.approx(0.0, abs=1e-5)
    assert auc(own, y) > panel.honest.metric - 0.1
