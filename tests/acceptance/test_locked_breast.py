"""A panel locked on one breast cancer study meets another study on another array.

Oestrogen receptor status. Training: Hu et al. 2006, BMC Genomics 7:96 (GSE1992);
validation: GSE4335, another study on another array (both accessions from memory).
"""

import pandas as pd
import pytest

from panelkit import lock_panel, recalibrate_panel, run_study, validate_panel
from panelkit.workflow import SheetColumns

pytestmark = pytest.mark.cohorts
STUDY = """seed = 1
[cohort]
expression = "shared.csv"
samples = {samples}
outcome = "er_positive"
positive = "1"
negative = "0"
[panels]
sizes = [6]
[shortlist]
subsamples = 40
[accuracy]
folds = 5
repeats = 1
inner_folds = 3
inner_subsamples = 20
random_panels = 20
learning_curve = false
[choice]
primary = {{ rule = "smallest-within-one-se" }}
"""
COLUMNS = SheetColumns(outcome="er_status", positive="1", negative="0")


@pytest.fixture(scope="module")
def folder(tmp_path_factory):
    return tmp_path_factory.mktemp("breast")


def test_er_panel_holds_in_another_study(open_cohort, folder):
    table, samples = open_cohort("breast_gse1992")
    other, other_samples = open_cohort("breast_gse4335")
    first = pd.read_csv(table, index_col=0)
    there = set(pd.read_csv(other, index_col=0, nrows=0).columns)
    first[[name for name in first.columns if name in there]].to_csv(
        folder / "shared.csv"
    )
    (folder / "study.toml").write_text(STUDY.format(samples=f'"{samples}"'))
    run = run_study(folder / "study.toml", folder / "run").path
    panel = lock_panel(run, folder / "panel.json")
    assert len(panel.markers) <= 6
    found = validate_panel(
        folder / "panel.json", other, other_samples, out=folder / "out", columns=COLUMNS
    )
    area, slope = found.figure("auc"), found.figure("calibration-slope")
    assert area.value >= 0.75
    assert slope.value < 1.0
    sheet = pd.read_csv(other_samples, dtype=str)
    share = (sheet["er_status"].dropna() == "1").mean()
    assert found.figure("prevalence-difference").value == pytest.approx(
        share - panel.training.prevalence, abs=1e-9
    )
    assert found.figure("spread-ratio").value > 0.0
    assert all(each.spread_ratio > 0.0 for each in found.shifts)
    new = recalibrate_panel(
        folder / "panel.json",
        other,
        other_samples,
        folder / "new.json",
        changed="intercept and slope",
        columns=COLUMNS,
    )
    assert new.parent.slope < 1.0
    assert "On rows that did not fit it the log loss" in new.parent.sentence
