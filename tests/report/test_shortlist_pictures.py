"""The pictures of a shortlist: well-formed, the same bytes, with their numbers."""

import csv
import io
from dataclasses import replace
from xml.etree import ElementTree

import numpy as np
import pytest

from panelkit.records import (
    Agreement,
    Companions,
    Convergence,
    Findings,
    NullShortlist,
    PathFrequencies,
    SelectorResult,
    ShortlistResults,
)
from panelkit.report import render_shortlist

ALL = {
    "companion_groups", "convergence", "frequency_along_path", "selection_frequency",
    "shuffles",
}  # fmt: skip


@pytest.fixture
def results(summary):
    draws = np.random.default_rng(5)
    table, bound = summary.shortlist, summary.bound
    features = np.array([str(name) for name in table.feature], object)
    running = np.clip(0.5 + 0.1 * draws.normal(size=(10, 8)).cumsum(axis=0), 0.0, 1.0)
    agreement = Agreement(0.2, 0.15, 0.25, np.nan, 0.1, 100)
    return ShortlistResults(
        study="study.toml",
        outcome=summary.outcome,
        n_samples=128,
        n_subjects=120,
        features=features,
        n_candidates_asked=25,
        findings=Findings(),
        bound=bound,
        shortlist=table,
        paths=PathFrequencies(
            np.logspace(0, -1, 10), np.arange(8), running, np.arange(10.0),
            np.linspace(0.0, 1.0, 10),
        ),
        convergence=Convergence(
            np.arange(10) * 5 + 5, np.arange(8), running, np.arange(10) // 4,
            np.array([1]), 0.75, 0.12, 0.1, 73,
        ),
        companions=Companions(
            np.array([0]), np.array([1]), np.array([0]), np.array([0.9]),
            np.array([0.88]), np.array([0.1]), np.array([0.4]), np.array([-5.0]),
            np.array([True]),
        ),
        null=NullShortlist(
            np.zeros(50, np.int64), 0.3 + 0.05 * draws.random(50), np.full(50, 0.4), 3,
            0.97, 0.98, 0.02, 0.02, 0.02, np.ones(len(features)),
            np.full(len(features), np.nan), np.full(len(features), np.nan),
        ),
        selectors=(SelectorResult("lasso", bound, np.arange(1), 0, 0.97, agreement),),
        agreement=agreement,
    )  # fmt: skip


def test_every_picture_has_its_numbers(results):
    files = render_shortlist(results)
    assert {f"figures/{name}.svg" for name in ALL} | {
        f"tables/{name}.csv" for name in ALL
    } == set(files)
    for name in ALL:
        ElementTree.fromstring(files[f"figures/{name}.svg"])
        rows = list(csv.reader(io.StringIO(files[f"tables/{name}.csv"].decode())))
        assert len(rows) > 2
        assert all(len(row) == len(rows[0]) for row in rows)


def test_same_results_same_bytes(results):
    assert render_shortlist(results) == render_shortlist(results)


def test_numbers_are_those_drawn(results):
    files = render_shortlist(results)
    rows = csv.DictReader(io.StringIO(files["tables/convergence.csv"].decode()))
    first = [row for row in rows if row["feature"].lstrip("'") == results.features[0]]
    found = [float(row["frequency"]) for row in first]
    assert found == results.convergence.frequency[:, 0].tolist()
    assert [int(row["subsamples"]) for row in first] == list(range(10, 101, 10))


def test_hostile_names_are_text_in_every_picture(results):
    """The ids of this folder's tests hold markup and formulas."""
    features = results.features.copy()
    features[0], features[1] = '<script>alert("1")</script>', "=1+1"
    table = replace(results.shortlist, feature=features)
    files = render_shortlist(replace(results, features=features, shortlist=table))
    for name in ALL:
        svg = ElementTree.fromstring(files[f"figures/{name}.svg"])
        tags = {element.tag.rpartition("}")[2] for element in svg.iter()}
        assert "script" not in tags
    for name in ("convergence", "frequency_along_path", "companion_groups"):
        cells = csv.reader(io.StringIO(files[f"tables/{name}.csv"].decode()))
        assert not any(cell.startswith("=") for row in cells for cell in row)


def test_what_there_is_not_is_not_drawn(results):
    nobody = np.full(len(results.shortlist.group), -1)
    alone = replace(results.shortlist, group=nobody)
    files = render_shortlist(replace(results, null=None, shortlist=alone))
    assert {name.split("/")[1].split(".")[0] for name in files} == ALL - {
        "shuffles",
        "companion_groups",
    }


def test_sentences_name_split_votes_and_what_noise_does(results):
    said = results.sentences()
    assert any("share the votes" in each for each in said)
    assert any("With people shuffled 50 times" in each for each in said)
    noisy = replace(results.null, p_top=0.4)
    told = replace(results, null=noisy).sentences()
    assert any("Noise does as well" in each for each in told)
