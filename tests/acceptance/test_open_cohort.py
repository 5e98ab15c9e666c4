"""The main job on real data, from its files, with a ten-line study.

Open cohort of Chiaretti et al. 2004 (tests/data/all_leukemia/README.md). That probe
1636_g_at reads ABL1, one half of the fusion which defines the class, is common
knowledge, from memory.
"""

import csv
import json
from pathlib import Path

import pytest

from panelkit.workflow import run_study

STUDY = Path(__file__).parents[1] / "data" / "all_leukemia" / "study.toml"


@pytest.fixture(scope="module")
def run_folder(tmp_path_factory):
    return run_study(STUDY, tmp_path_factory.mktemp("leukemia") / "run").path


def rows(path):
    with path.open(newline="", encoding="utf-8") as file:
        return list(csv.DictReader(file))


def test_study_has_ten_lines():
    assert len(STUDY.read_text(encoding="utf-8").splitlines()) == 10


def test_people_and_features_are_those_of_the_publication(run_folder):
    # 37 BCR/ABL and 42 NEG among 95 B-lineage people
    analysed = {
        r["outcome_class"]: int(r["analysed"]) for r in rows(run_folder / "flow.csv")
    }
    assert analysed["BCR/ABL"] == 37
    assert analysed["NEG"] == 42
    samples = {r["sample"] for r in rows(run_folder / "folds.csv")}
    assert "01005" in samples  # leading zeros survive
    assert len(samples) == 79


def test_the_probe_of_the_fusion_comes_first(run_folder):
    table = rows(run_folder / "shortlist.csv")
    assert table[0]["feature"] == "1636_g_at"
    assert float(table[0]["frequency"]) > 0.9
    assert table[0]["picked"] == "true"
    assert table[0]["sign"] == "+"
    assert sum(r["picked"] == "true" for r in table) <= 2


def test_one_probe_is_honestly_accurate(run_folder):
    ones = [r for r in rows(run_folder / "frontier.csv") if r["size"] == "1"]
    assert {r["maker"] for r in ones} == {"frequency", "univariate"}
    for row in ones:
        assert 0.88 <= float(row["metric"]) <= 0.95
        assert (
            float(row["metric_low"]) < float(row["metric"]) < float(row["metric_high"])
        )
        assert row["markers"] == "1636_g_at"
        assert row["metric_of"] == "procedure"


def test_smallest_within_one_standard_error_is_one_probe(run_folder):
    choice = json.loads((run_folder / "choice.json").read_text(encoding="utf-8"))
    first = choice["rules"][0]
    assert first["rule"] == "smallest-within-one-se"
    assert first["figures"]["size"] == 1
    assert choice["headline"]["declared"] is True
    assert 0.85 <= choice["headline"]["metric"] <= 0.95


def test_reading_everything_is_no_better_and_the_figures_are_said(run_folder):
    table = {r["name"]: r for r in rows(run_folder / "comparators.csv")}
    ridge = table["ridge on all features"]
    single = table["one marker, the most different in each fold"]
    assert float(ridge["metric"]) < float(single["metric"]) - 0.02
    assert f"({float(ridge['metric']):.3f} against" in ridge["sentence"]
    assert "more accurate" not in ridge["sentence"]


def test_chosen_markers_beat_random_ones(run_folder):
    table = {r["name"]: r for r in rows(run_folder / "comparators.csv")}
    for size in (1, 5, 25):
        sentence = table[f"random panels of {size} from all features"]["sentence"]
        assert "200 panels" in sentence
        assert "p = 0.00498" in sentence  # 1 / 201: no random panel came near
        assert "no better" not in sentence
