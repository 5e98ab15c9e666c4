"""Shortlists of open cohorts: one marker, none, eight that stand in for one another."""

import csv

import numpy as np
import pandas as pd
import pytest

from panelkit import run_shortlist
from panelkit.fits import ArraySource
from panelkit.records import RESEARCH_USE
from panelkit.stability import (
    ShortlistRules,
    describe_companions,
    draw_pairs,
    select_markers,
)
from panelkit.workflow import shortlist_content

STUDY = """seed = {seed}
[cohort]
expression = "{expression}"
samples = "{samples}"
outcome = "{outcome}"
positive = "{positive}"
{more}
[shortlist]
shuffles = {shuffles}
"""
# known markers of sex, symbols from memory: RPS4Y1, DDX3Y, KDM5D, USP9Y, UTY, EIF1AY,
# ZFY, NLGN4Y
Y_GENES = {
    "ENSG00000129824", "ENSG00000067048", "ENSG00000012817", "ENSG00000114374",
    "ENSG00000183878", "ENSG00000198692", "ENSG00000067646", "ENSG00000165246",
}  # fmt: skip


@pytest.fixture
def study(tmp_path, request):
    """Return a function that writes a study of the committed leukaemia cohort."""
    data = request.path.parents[1] / "data" / "all_leukemia"

    def write(outcome, positive, more="", seed=1, shuffles=20):
        path = tmp_path / "study.toml"
        text = STUDY.format(
            expression=(data / "expression.csv.gz").as_posix(),
            samples=(data / "samples.csv").as_posix(),
            outcome=outcome,
            positive=positive,
            more=more,
            seed=seed,
            shuffles=shuffles,
        )
        path.write_text(text)
        return path

    return write


def rows(path):
    with path.open(newline="", encoding="utf-8") as file:
        return list(csv.DictReader(file))


@pytest.mark.parametrize("seed", [1, 2])
def test_one_fusion_one_probe(study, seed, tmp_path):
    """Chiaretti et al. 2004, Blood 103:2771; 1636_g_at reads ABL1 (from memory)."""
    path = study(
        "mol_biol", "BCR/ABL", 'negative = "NEG"\nkeep = { lineage = ["B"] }', seed
    )
    run = run_shortlist(path, tmp_path / "run")
    table = rows(run.path / "shortlist.csv")
    assert table[0]["feature"] == "1636_g_at"
    assert float(table[0]["frequency"]) > 0.9
    assert 1 <= sum(row["picked"] == "true" for row in table) <= 2
    found = run.results
    assert found.n_candidates_asked == 25
    candidates = sum(row["candidate"] == "true" for row in table)
    assert 25 <= candidates <= 50
    assert found.null.p_top == pytest.approx(1 / 21)
    assert found.bound.unimodal < found.bound.worst_case < 1.0
    # 39 people in a half: separated long before the markers asked for are reached
    assert "path order only" in " ".join(found.sentences())
    content = shortlist_content(run)
    assert "1636_g_at" in content["shortlist"]
    assert content["research_use"] == RESEARCH_USE


def test_relapse_has_no_marker_and_the_words_say_so(study, tmp_path):
    """Relapse of the same people is close to unpredictable from these arrays."""
    run = run_shortlist(
        study("relapse", "True", 'negative = "False"'), tmp_path / "run"
    )
    found = run.results
    assert found.null.p_top > 0.05
    assert found.shortlist.frequency[0] < 0.6
    assert not found.shortlist.picked.any()
    said = found.sentences()
    assert said[0].startswith("The shortlist is empty")
    assert any("Noise does as well as this outcome" in each for each in said)


@pytest.mark.cohorts
def test_eight_markers_of_sex_are_one_group(open_cohort):
    """Lappalainen et al. 2013, Nature 501:506; log2 counts per million plus one."""
    expression, samples = open_cohort("geuvadis_sex")
    counts = pd.read_csv(expression, index_col=0)
    sheet = pd.read_csv(samples, index_col=0).loc[counts.index]
    y = (sheet["sex"] == "Male").to_numpy(float)
    depth = counts.sum(axis=1).to_numpy()[:, None]
    X = np.log2(counts.to_numpy() / depth * 1e6 + 1.0)
    rows_ = np.arange(len(y))
    plan = draw_pairs(rows_, rows_, y, 50, np.random.default_rng(1))
    source = ArraySource(X)
    source.included[:] = np.ptp(X, axis=0) > 0.0
    found = select_markers(
        source, y, rows_, rows_, np.ones(len(y)), plan,
        ShortlistRules(companion_correlation=0.9), threads=2,
    )  # fmt: skip
    places = [k for k, name in enumerate(counts.columns) if name in Y_GENES]
    assert len(places) == 8
    assert len(set(found.group[places])) == 1
    assert found.group[places[0]] >= 0
    group = np.flatnonzero(found.group == found.group[places[0]])
    assert sorted(group.tolist()) == sorted(places)
    assert found.group_frequency[places[0]] == 1.0
    told = describe_companions(source, rows_, found)
    inside = told.group == found.group[places[0]]
    assert inside.sum() == 28
    assert np.abs(told.pearson[inside]).min() >= 0.9
