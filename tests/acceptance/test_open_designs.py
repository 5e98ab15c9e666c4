"""Open cohorts with other designs: survival, pairs, several outcomes.

Figures come from the cohorts' own descriptions: people and deaths of the carcinoma
cohort, pairs of the colorectal one, deaths of the lymphoma one.
"""

import tomllib
from pathlib import Path

import numpy as np
import pytest
from scipy.stats import CensoredData, ecdf

from panelkit import check_study, draft_study, read_cohort
from panelkit.config import read_study
from panelkit.errors import InputDataError

CARCINOMA = Path(__file__).parents[1] / "data" / "acc_mirna"
FILES = CARCINOMA / "expression.csv.gz", CARCINOMA / "samples.csv"


def codes_of(cohort, severity=None):
    return {f.code for f in cohort.findings if severity in (None, f.severity)}


def test_survival_of_adrenocortical_carcinoma():
    """Zheng et al. 2016, Cancer Cell 29:723: 80 people, 29 deaths in these data."""
    cohort = read_cohort(
        *FILES, time="os_days", event="os_event", time_unit="days", subject="patient"
    )
    outcome = cohort.outcome
    assert (len(outcome.values), outcome.event.sum()) == (80, 29)
    assert (np.median(outcome.values), outcome.values.max()) == (1182.5, 4673.0)
    assert codes_of(cohort, "stop") == set()
    time, event = outcome.values, outcome.event
    curve = ecdf(CensoredData(uncensored=time[~event], right=time[event])).sf
    median = curve.quantiles[np.argmax(curve.probabilities <= 0.5)]
    said = next(f.message for f in cohort.findings if f.code == "events")
    assert f"median follow-up {median:,.0f} days" in said


def test_a_drafted_survival_study_checks(tmp_path):
    path = tmp_path / "study.toml"
    path.write_text(draft_study(*FILES, folder=tmp_path))
    cohort = read_study(path).cohort
    assert (cohort.time, cohort.event) == ("os_days", "os_event")
    assert (cohort.time_unit, cohort.outcome) == ("days", None)
    assert (cohort.subject, cohort.site) == ("patient", "tss_site")
    assert check_study(path).outcome.event.sum() == 29


def test_a_stage_is_an_outcome_of_several_classes():
    stages = [f"stage {number}" for number in ("i", "ii", "iii", "iv")]
    cohort = read_cohort(*FILES, outcome="pathologic_stage", classes=stages)
    assert cohort.outcome.classes == tuple(stages)
    assert (
        cohort.n_samples
        == np.isin(cohort.sample_columns["pathologic_stage"], stages).sum()
    )


def test_age_is_an_outcome_that_is_a_number():
    cohort = read_cohort(*FILES, outcome="age", kind="number", unit="years")
    assert cohort.n_samples == 80
    assert codes_of(cohort, "stop") == set()


@pytest.mark.cohorts
def test_pairs_of_tumour_and_normal_tissue(open_cohort):
    """Kostic et al. 2012, Genome Res 22:292: 97 people, 93 of them with both."""
    files = open_cohort("crc_kostic")
    asked = {"outcome": "tissue", "positive": "tumour"}
    cohort = read_cohort(*files, **asked, matched_set="patient", design="matched")
    assert len(cohort.design.matched_set_ids) == 97
    assert codes_of(cohort, "stop") == set()
    said = next(f.message for f in cohort.findings if f.code == "matched-set-one-class")
    assert said.startswith("4 of 97 matched sets")
    wrong = read_cohort(*files, **asked, subject="patient")
    assert "subject-in-both-classes" in codes_of(wrong, "stop")


@pytest.mark.cohorts
def test_pairs_are_drafted_as_matched_sets(open_cohort):
    drafted = tomllib.loads(draft_study(*open_cohort("crc_kostic")))
    assert drafted["cohort"]["matched_set"] == "patient"
    assert drafted["design"]["kind"] == "matched"
    assert "subject" not in drafted["cohort"]
    assert drafted["cohort"]["features"].endswith("features.csv")


@pytest.mark.cohorts
def test_survival_of_lymphoma(open_cohort):
    """Rosenwald et al. 2002, N Engl J Med 346:1937: 240 people, 138 deaths."""
    files = open_cohort("dlbcl_rosenwald")
    drafted = tomllib.loads(draft_study(*files))["cohort"]
    assert (drafted["time"], drafted["event"]) == ("time", "event")
    cohort = read_cohort(*files, time="time", event="event", time_unit="years")
    assert (cohort.n_samples, cohort.outcome.event.sum()) == (240, 138)


@pytest.mark.cohorts
def test_histology_of_lung_tumours(open_cohort):
    """Classes of one to four samples are refused by name, those that suffice read."""
    files = open_cohort("lung_garber")
    cohort = read_cohort(*files, outcome="histology", classes=["Adeno", "SCC", "node"])
    assert np.bincount(cohort.outcome.values.astype(int)).tolist() == [39, 13, 6]
    with pytest.raises(InputDataError) as caught:
        read_cohort(*files, outcome="histology", kind="classes")
    assert caught.value.code == "too-few-subjects"
    assert "'fetal' (1)" in caught.value.what
