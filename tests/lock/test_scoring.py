"""Scores: the same bits however they are asked for, and what is refused."""

import hashlib
import json
import subprocess
import sys

import anndata
import numpy as np
import pandas as pd
import pytest

from panelkit import LockedPanel, score_table
from panelkit.errors import InputDataError


@pytest.fixture
def panel(locked):
    return LockedPanel.read(locked.panel)


@pytest.fixture
def table(people):
    return people()[0]


def bits(values):
    return np.asarray(values, np.float64).tobytes()


def test_by_hand(panel, table):
    """The panel's own numbers, in NumPy: log2, fill, weighted sum, logistic."""
    content, frame = panel.content, pd.read_csv(table, index_col=0)
    total = np.full(len(frame), content.intercept)
    for marker in content.markers:
        logs = np.log2(frame[marker.feature].to_numpy(np.float32).astype(float) + 1.0)
        total += marker.coefficient * np.where(np.isnan(logs), marker.fill, logs)
    scored = panel.score(table)
    assert scored.log_odds == pytest.approx(total, abs=1e-9)
    assert scored.chances == pytest.approx(1 / (1 + np.exp(-total)), abs=1e-12)


def test_contributions_add_up_to_the_score(panel, table):
    frame = panel.score(table).to_frame()
    parts = frame.filter(like="contribution ").sum(axis=1) + frame["intercept"]
    assert parts.to_numpy() == pytest.approx(frame["log_odds"].to_numpy())


def test_one_sample_has_the_bits_of_many(panel, table):
    frame = pd.read_csv(table, index_col=0)
    whole = panel.score(frame).log_odds
    alone = [panel.score(frame.iloc[[k]]).log_odds[0] for k in range(len(frame))]
    assert bits(whole) == bits(alone)
    turned = panel.score(frame.iloc[::-1, ::-1]).log_odds
    assert bits(whole) == bits(turned[::-1])


def test_csv_and_h5ad_have_the_same_bits(panel, table, tmp_path):
    frame = pd.read_csv(table, index_col=0)
    expected = bits(panel.score(table).log_odds)
    for kind in (np.float64, np.float32):
        path = tmp_path / f"{np.dtype(kind).name}.h5ad"
        data = anndata.AnnData(
            frame.to_numpy(kind),
            obs=pd.DataFrame(index=frame.index),
            var=pd.DataFrame(index=frame.columns),
        )
        data.write_h5ad(path)
        assert bits(panel.score(path).log_odds) == expected
    turned = tmp_path / "turned.csv"
    frame.T.to_csv(turned)
    assert bits(panel.score(turned).log_odds) == expected


@pytest.mark.parametrize("threads", ["1", "4"])
def test_a_fresh_process_gives_the_same_file(
    locked, table, tmp_path, threads, monkeypatch
):
    here, there = tmp_path / "here.csv", tmp_path / "there.csv"
    found = score_table(locked.panel, table, here)
    for name in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "NUMBA_NUM_THREADS"):
        monkeypatch.setenv(name, threads)
    command = [sys.executable, "-m", "panelkit", "score", locked.panel, table]
    subprocess.run([*command, "--out", there], check=True, capture_output=True)
    assert here.read_bytes() == there.read_bytes()
    assert hashlib.sha256(here.read_bytes()).hexdigest() == found["scores_sha256"]
    beside = json.loads((tmp_path / "there.csv.json").read_text())
    assert (
        beside["panel_sha256"] == LockedPanel.read(locked.panel).content.content_sha256
    )
    assert "research" in beside["research_use"]


def test_scores_hold_no_outcome(panel, table):
    columns = panel.score(table).to_frame().columns
    assert not {"outcome", "response"} & set(columns)


def test_out_of_range_and_filled_are_flagged(panel, table):
    frame = pd.read_csv(table, index_col=0).fillna(250.0)
    first, second = (marker.feature for marker in panel.content.markers[:2])
    frame.loc[frame.index[0], first] = panel.content.markers[0].measured_high * 1.01
    frame.loc[frame.index[1], second] = np.nan
    flags = panel.score(frame).flags
    assert f"{first}:above-training-range" in flags[0].split(";")
    assert f"{second}:filled" in flags[1].split(";")


def test_nothing_measured_gives_no_score(panel, table):
    frame = pd.read_csv(table, index_col=0)
    frame.iloc[0] = np.nan
    scored = panel.score(frame)
    assert np.isnan(scored.log_odds[0])
    assert not np.isnan(scored.log_odds[1:]).any()


def test_a_missing_marker_takes_the_fallback(panel, table):
    content, frame = panel.content, pd.read_csv(table, index_col=0)
    lost = content.markers[0].feature
    scored = panel.score(frame.drop(columns=lost))
    fallback = next(each for each in content.fallbacks if each.missing == lost)
    total = np.full(len(frame), fallback.intercept)
    for marker in content.markers[1:]:
        logs = np.log2(frame[marker.feature].to_numpy(np.float32).astype(float) + 1.0)
        weight = fallback.coefficients[marker.feature]
        total += weight * np.where(np.isnan(logs), marker.fill, logs)
    assert scored.log_odds == pytest.approx(total, abs=1e-9)
    assert all(f"{lost}:fallback" in flag for flag in scored.flags)
    assert np.isfinite(fallback.metric)


def test_two_missing_markers_are_refused(panel, table):
    lost = [marker.feature for marker in panel.content.markers[:2]]
    frame = pd.read_csv(table, index_col=0).drop(columns=lost)
    with pytest.raises(InputDataError, match=r"assays .* are missing"):
        panel.score(frame)


def test_a_missing_marker_without_fallback_is_refused(locked, panel, table):
    from dataclasses import replace

    bare = LockedPanel(replace(panel.content, fallbacks=()))
    lost = panel.content.markers[0].feature
    frame = pd.read_csv(table, index_col=0).drop(columns=lost)
    with pytest.raises(InputDataError, match="no fallback"):
        bare.score(frame)


def test_another_table_is_refused(panel):
    with pytest.raises(InputDataError, match="none of the panel's assays"):
        panel.score(pd.DataFrame({"X": [1.0]}, index=["S1"]))


@pytest.mark.parametrize("change", [np.log2, lambda v: 1e4 * v, lambda v: v / 1e4])
@pytest.mark.parametrize("rows", [slice(None), slice(0, 1)])
def test_another_scale_is_refused(panel, table, change, rows):
    frame = change(pd.read_csv(table, index_col=0).fillna(250.0)).iloc[rows]
    with pytest.raises(InputDataError, match="outside the ranges") as caught:
        panel.score(frame)
    assert caught.value.exit_code == 3


def test_values_without_a_logarithm_are_refused(panel, table):
    frame = pd.read_csv(table, index_col=0)
    with pytest.raises(InputDataError, match="cannot be on the scale"):
        panel.score(-frame)


def test_an_unknown_unit_is_refused(panel, table):
    with pytest.raises(InputDataError, match="another unit"):
        panel.score(table, unit="ng/mL")
    frame = pd.read_csv(table, index_col=0)
    data = anndata.AnnData(
        frame.to_numpy(),
        obs=pd.DataFrame(index=frame.index),
        var=pd.DataFrame({"unit": "ng/mL"}, index=frame.columns),
    )
    with pytest.raises(InputDataError, match="another unit"):
        panel.score(data)
