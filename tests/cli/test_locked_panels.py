"""`panelkit lock`, `score`, `validate`, `recalibrate`: files, JSON, exit codes."""

import numpy as np
import pandas as pd
import pytest


@pytest.fixture
def panel(panelkit, run_folder, tmp_path):
    path = tmp_path / "panel.json"
    assert panelkit("lock", run_folder, "--out", path).code == 0
    return path


@pytest.fixture
def later(run_folder, tmp_path):
    """New people: those of the run measured again with an error, under other names."""
    table = pd.read_csv(run_folder.parent / "expression.csv", index_col=0)
    sheet = pd.read_csv(run_folder.parent / "samples.csv", index_col=0)
    table += np.random.default_rng(8).normal(0.0, 0.3, table.shape).round(4)
    names = pd.Index([f"N{k}" for k in range(len(table))], name="sample_id")
    table.set_axis(names).to_csv(tmp_path / "table.csv")
    sheet.set_axis(names).to_csv(tmp_path / "sheet.csv")
    return tmp_path / "table.csv", tmp_path / "sheet.csv"


def test_the_way_from_run_to_verdict(panelkit, read_json, panel, later, tmp_path):
    table, sheet = later
    scores = tmp_path / "scores.csv"
    answer = panelkit("score", panel, table, "--out", scores, "--json")
    assert answer.code == 0
    assert read_json(answer.out)["samples"] == 40
    assert len(pd.read_csv(scores)) == 40

    out = tmp_path / "out"
    answer = panelkit("validate", panel, table, sheet, "--out", out, "--json")
    assert answer.code == 0
    content = read_json(answer.out)
    assert content["verdict"] == "exploratory"
    assert content == read_json((out / "validation.json").read_text())
    assert (out / "scores.csv").read_bytes() == scores.read_bytes()

    new = tmp_path / "new.json"
    answer = panelkit("recalibrate", panel, table, sheet, "--out", new, "--json")
    assert answer.code == 0
    assert read_json(answer.out)["parent_sha256"] == content["panel_sha256"]


def test_what_is_shown_says_research_use(panelkit, run_folder, panel, later, tmp_path):
    table, sheet = later
    for arguments in (
        ("lock", run_folder, "--out", tmp_path / "a.json"),
        ("score", panel, table, "--out", tmp_path / "a.csv"),
        ("validate", panel, table, sheet, "--out", tmp_path / "a"),
        ("recalibrate", panel, table, sheet, "--out", tmp_path / "b.json"),
    ):
        answer = panelkit(*arguments)
        assert answer.code == 0
        assert "For research and planning only" in answer.out


def test_lock_as_json(panelkit, read_json, run_folder, tmp_path):
    answer = panelkit(
        "lock", run_folder, "--out", tmp_path / "p.json", "--json",
        "--cutoff", "sensitivity=0.8", "--cutoff", "net-benefit=0.3",
    )  # fmt: skip
    names = [cut["name"] for cut in read_json(answer.out)["cutoffs"]]
    assert names == ["sensitivity=0.8", "net-benefit=0.3"]


@pytest.mark.parametrize(
    ("arguments", "code"),
    [
        (("lock", "RUN", "--out", "x.json", "--cutoff", "best"), 2),
        (("lock", "RUN", "--out", "x.json", "--panel", "none-1"), 2),
        (("lock", "RUN", "--out", "x.json", "--cutoff",
          "sensitivity-lower-limit=0.95"), 2),
        (("lock", "nowhere", "--out", "x.json"), 7),
        (("score", "nothing.json", "TABLE", "--out", "x.csv"), 6),
        (("score", "TABLE", "TABLE", "--out", "x.csv"), 6),
        (("score", "PANEL", "nothing.csv", "--out", "x.csv"), 3),
        (("score", "PANEL", "SHEET", "--out", "x.csv"), 3),
        (("validate", "PANEL", "--out", "x"), 2),
        (("validate", "PANEL", "TABLE", "SHEET", "--outcome", "no", "--out", "x"), 3),
        (("validate", "PANEL", "TABLE", "SHEET", "--plan", "no.toml", "--out", "x"), 2),
        (("recalibrate", "PANEL", "TABLE", "SHEET", "--out", "PANEL"), 2),
    ],
)  # fmt: skip
def test_exit_codes(
    panelkit, run_folder, panel, later, tmp_path, monkeypatch, arguments, code
):
    monkeypatch.chdir(tmp_path)
    names = {"RUN": run_folder, "PANEL": panel, "TABLE": later[0], "SHEET": later[1]}
    answer = panelkit(*(names.get(each, each) for each in arguments))
    assert answer.code == code, answer.err
    assert len(answer.err.strip().splitlines()) == 1
    assert not (tmp_path / "x.json").exists()
