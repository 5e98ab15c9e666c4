"""Findings about values and design, on data that shows them and data that does not."""

from dataclasses import replace
from types import SimpleNamespace

import numpy as np
import pytest

from panelkit.errors import InputDataError
from panelkit.ingest.checks import check_cohort
from panelkit.ingest.cohort_reader import read_cohort
from panelkit.records.findings import Findings


def read(small, **options):
    return read_cohort(
        small.matrix, small.sheet, outcome="group", positive="case", **options
    )


def found(cohort, code):
    return [item for item in cohort.findings if item.code == code]


def test_clean_cohort_has_nothing_but_information(small):
    cohort = read(small, site="clinic")
    assert [item.code for item in cohort.findings] == [
        "ids-with-inner-blanks",  # the cohort has '0001' and 'd 4' on purpose
        "ids-with-leading-zeros",
        "ids-with-leading-zeros",
        "scale-guess",
        "class-sizes",
    ]
    assert {item.severity for item in cohort.findings} == {"info"}


def test_checks_of_a_read_cohort_add_nothing(small):
    small.matrix.iloc[:, 1] = small.matrix.iloc[:, 0]
    cohort = read(small)
    assert list(check_cohort(cohort)) == list(cohort.findings)
    bare = replace(cohort, findings=Findings())
    assert list(check_cohort(bare)) == list(cohort.findings)


def test_what_stops_comes_first(small):
    small.sheet["batch"] = np.where(small.sheet["group"] == "case", "b1", "b2")
    small.sheet.loc[3, "clinic"] = ""
    severities = [
        i.severity for i in read(small, batch="batch", site="clinic").findings
    ]
    rank = ["stop", "warning", "info"]
    assert severities == sorted(severities, key=rank.index)
    assert set(severities) == set(rank)


def test_missing_constant_and_copied_features(small):
    small.matrix.iloc[:13, 0] = np.nan
    small.matrix.iloc[:, 1] = 3.0
    small.matrix.iloc[:2, 2] = [0.0, np.nan]
    small.matrix["copy"] = small.matrix["C-3"]
    small.matrix.iloc[0, 6] = -0.0
    cohort = read(small)
    [missing] = found(cohort, "values-missing")
    assert "8.93 %" in missing.message
    [mostly] = found(cohort, "features-mostly-missing")
    assert "1 of 7 features" in mostly.message
    assert "'007'" in mostly.message
    [constant] = found(cohort, "features-constant")
    assert "'B_2'" in constant.message
    [copied] = found(cohort, "features-copied")
    assert "1 feature has" in copied.message
    assert "'copy = C-3'" in copied.message


def test_sample_without_values_is_named(small):
    small.matrix.iloc[5] = np.nan
    [finding] = found(read(small, site="clinic"), "samples-mostly-missing")
    assert "'0006'" in finding.message


def test_confounded_batch_stops(small):
    small.sheet["batch"] = np.where(small.sheet["group"] == "case", "b1", "b2")
    [finding] = found(read(small, batch="batch"), "outcome-tied-to-batch")
    assert finding.severity == "stop"
    assert "Cramer's V 1," in finding.message
    assert "0 of 24 samples sit in a batch with both classes" in finding.message


def test_tied_site_warns_with_both_forms_of_the_coefficient(small):
    small.sheet["clinic"] = ["a", "b"] * 9 + ["b", "a"] * 3
    [finding] = found(read(small, site="clinic"), "outcome-tied-to-site")
    assert finding.severity == "warning"
    # n 24, table 9/3 and 3/9: chi-square 6, V 0.5;
    # corrected: (1/4 - 1/23) / (1 - 1/23), its root 0.4647
    assert "Cramer's V 0.5, bias-corrected 0.465" in finding.message
    assert "24 of 24" in finding.message
    assert "'a' 9/3" in finding.message


def test_matched_pairs_in_small_batches_are_not_confounded(small):
    small.sheet["batch"] = np.repeat([f"b{i}" for i in range(12)], 2)
    assert not found(read(small, batch="batch"), "outcome-tied-to-batch")


def test_each_sample_a_batch_of_its_own_stops(small):
    small.sheet["batch"] = small.sheet["sample_id"]
    [finding] = found(read(small, batch="batch"), "outcome-tied-to-batch")
    assert finding.severity == "stop"


def test_numbers_of_a_nuisance_column_are_cut_into_quarters(small):
    small.sheet = small.sheet.sort_values("group").reset_index(drop=True)
    small.sheet["storage"] = [str(day / 2) for day in range(24)]
    [finding] = found(read(small, nuisance=["storage"]), "outcome-tied-to-nuisance")
    assert finding.severity == "stop"
    assert "'quarter 1' 6/0" in finding.message
    assert "AUC 0 (0 to 0." in finding.message
    assert not found(read(small), "outcome-tied-to-nuisance")


def test_study_names_further_nuisance_columns(small):
    small.sheet["storage"] = small.sheet["group"]
    cohort = read(small)
    study = SimpleNamespace(cohort=SimpleNamespace(nuisance=["storage"]))
    codes = [item.code for item in check_cohort(cohort, study)]
    assert "outcome-tied-to-nuisance" in codes
    study.cohort.nuisance = ["storrage"]
    with pytest.raises(InputDataError) as caught:
        check_cohort(cohort, study)
    assert caught.value.code == "unknown-column"
    assert "'storage'" in caught.value.accepted


def test_blank_entries_of_site_and_covariates_are_named(small):
    small.sheet.loc[4, "clinic"] = ""
    small.sheet.loc[5, "age"] = "NA"
    cohort = read(small, site="clinic", covariates=["age"])
    assert "'0005'" in found(cohort, "site-blank")[0].message
    assert "'0006'" in found(cohort, "covariate-blank")[0].message


def test_shifted_site_is_noticed_by_its_height(small):
    small.matrix.iloc[12:] += 1.0
    assert not found(read(small), "site-shift")
    [finding] = found(read(small, site="clinic"), "site-shift")
    assert finding.severity == "warning"
    assert "'south' lies" in finding.message


def test_shift_of_counts_is_information(small):
    draws = np.random.default_rng(1)
    small.matrix[:] = draws.poisson(100, (24, 6))
    small.matrix.iloc[12:] = draws.poisson(300, (12, 6))
    [finding] = found(read(small, site="clinic"), "site-shift")
    assert finding.severity == "info"
    assert found(read(small), "scale-guess")[0].message.startswith(
        "the values seem to be counts"
    )
