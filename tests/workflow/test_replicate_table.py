"""`replicates.csv` of a run, and that replicates leave everything else as it was."""

import numpy as np
import pandas as pd
import pytest

from panelkit import run_study


@pytest.fixture
def repeated(tiny):
    """The tiny study with five samples measured twice."""
    draws = np.random.default_rng(4)
    again = tiny.expression.iloc[:5] + draws.normal(0, 0.2, (5, 60))
    again.index = pd.Index([f"R{number}" for number in range(5)], name="sample_id")
    tiny.expression = pd.concat([tiny.expression, again])
    tiny.samples["again"] = ""
    rows = tiny.samples.iloc[:5].assign(sample_id=again.index)
    rows["again"] = tiny.samples["sample_id"].iloc[:5]
    tiny.samples = pd.concat([tiny.samples, rows])
    tiny.sections["cohort"]["replicate_of"] = "again"
    return tiny


def test_table_has_a_row_a_feature(repeated, tmp_path):
    out = run_study(repeated.write(), tmp_path / "out", threads=1).path
    table = pd.read_csv(out / "replicates.csv")
    assert list(table.columns) == [
        "feature", "n_samples", "n_measurements", "mean", "icc", "within_sd",
        "cv_percent", "difference", "difference_low", "difference_high",
    ]  # fmt: skip
    assert list(table["feature"]) == list(repeated.expression.columns)
    pairs = repeated.expression.to_numpy()
    difference = pairs[-5:, 0] - pairs[:5, 0]
    assert table["difference"][0] == pytest.approx(np.nanmean(difference), abs=1e-3)
    codes = pd.read_csv(out / "findings.csv")["code"]
    assert "replicates-agreement" in set(codes)


def test_without_replicates_there_is_no_table(finished):
    assert not (finished.path / "replicates.csv").exists()
