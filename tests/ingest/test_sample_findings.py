"""Findings about samples: apart, copied, swapped, repeated without a word."""

import numpy as np
import pandas as pd
import pytest
from scipy.stats import mannwhitneyu

from panelkit.ingest.cohort_reader import read_cohort


class Samples:
    """Fifty samples of 300 features that vary together in a few directions."""

    def __init__(self):
        draws = np.random.default_rng(11)
        self.draws = draws
        self.ids = [f"S{number}" for number in range(50)]
        directions = draws.normal(size=(4, 300))
        self.values = 8 + draws.normal(size=(50, 4)) @ directions * 0.3
        self.values += draws.normal(0, 0.6, (50, 300))
        self.names = [f"F{number}" for number in range(300)]
        self.sheet = pd.DataFrame({"group": ["case", "control"] * 25})
        self.features = None

    def found(self, code, **options):
        sheet = self.sheet.copy()
        sheet.insert(0, "sample_id", self.ids)
        cohort = read_cohort(
            pd.DataFrame(self.values, index=self.ids, columns=self.names),
            sheet,
            outcome="group",
            positive="case",
            features=self.features,
            **options,
        )
        return [item for item in cohort.findings if item.code == code]


@pytest.fixture
def samples():
    return Samples()


def test_ordinary_samples_are_neither_apart_nor_alike(samples):
    assert not samples.found("samples-outlying")
    assert not samples.found("samples-near-copies")


def test_sample_apart_is_named_with_its_distance(samples):
    samples.values[13] += samples.draws.normal(0, 4, 300)
    [finding] = samples.found("samples-outlying")
    assert finding.severity == "warning"
    assert finding.message.startswith("1 sample lies far")
    assert "'S13' " in finding.message
    assert "rule: " in finding.message


def test_one_absurd_cell_does_not_put_a_sample_apart(samples):
    samples.values[13, 5] = 60.0
    assert not samples.found("samples-outlying")


def test_near_copy_of_another_sample(samples):
    samples.values[40] = samples.values[3] + samples.draws.normal(0, 0.1, 300)
    samples.values[40] += 2.0  # another amount of material
    [finding] = samples.found("samples-near-copies")
    assert "'S3' and 'S40' (0.9" in finding.message
    samples.sheet["person"] = [f"p{n}" for n in range(50)]
    samples.sheet.loc[40, "person"] = "p3"
    samples.sheet.loc[40, "group"] = samples.sheet.loc[3, "group"]
    assert not samples.found("samples-near-copies", subject="person")


def test_exact_copy_in_linear_values_and_counts(samples):
    for rounded in (False, True):
        samples = Samples()
        samples.values[40] = samples.values[3]
        samples.values = 2.0**samples.values
        if rounded:
            samples.values = np.rint(samples.values)
        assert "'S3' and 'S40' (1)" in samples.found("samples-near-copies")[0].message


def test_strong_structure_alone_makes_no_copies(samples):
    """Two tight groups: half of all pairs correlate above 0.8 or below -0.8."""
    side = np.sign(np.arange(50) % 2 - 0.5)[:, None]
    samples.values += 3.0 * side * samples.draws.normal(size=300)
    assert not samples.found("samples-near-copies")


@pytest.mark.parametrize("column", ["subject", "Patient ID", "donor_id", "participant"])
def test_repeated_people_without_a_subject_column_stop(samples, column):
    samples.sheet[column] = [f"p{n // 5}" for n in range(50)]
    samples.sheet["group"] = ["case"] * 25 + ["control"] * 25
    [finding] = samples.found("subject-column-unnamed")
    assert finding.severity == "stop"
    assert "10 different entries for 50 samples, up to 5 of one" in finding.message
    assert f"subject = {column!r}" in finding.next_step
    assert not samples.found("subject-column-unnamed", subject=column)


@pytest.mark.parametrize("column", ["subject_group", "patients_age", "site"])
def test_other_columns_are_no_people(samples, column):
    samples.sheet[column] = [f"p{n // 5}" for n in range(50)]
    assert not samples.found("subject-column-unnamed")


def test_one_entry_each_or_the_same_for_all_is_no_repetition(samples):
    samples.sheet["patient"] = [f"p{n}" for n in range(50)]
    samples.sheet["donor"] = "blood bank"
    assert not samples.found("subject-column-unnamed")


def test_ids_that_share_their_first_part(samples):
    samples.ids = [f"P{n // 2:02d}_{'T' if n % 2 else 'N'}" for n in range(50)]
    [finding] = samples.found("subject-column-unnamed")
    assert finding.severity == "warning"
    assert "50 of 50 sample ids share their first part" in finding.message


@pytest.mark.parametrize(
    "ids",
    [
        [f"case_{n}" for n in range(50)],
        [f"BR{n % 4}-{1000 + n}" for n in range(50)],
        [f"1_{n}_C{n % 12}" for n in range(50)],
        [f"GSM{n}" for n in range(50)],
    ],
)
def test_numbered_ids_are_no_repetition(samples, ids):
    samples.ids = ids
    assert not samples.found("subject-column-unnamed")


def with_sex(samples, *, genes=("XIST", "RPS4Y1", "DDX3Y")):
    samples.sheet["Sex"] = ["F", "M"] * 25
    male = np.arange(50) % 2 == 1
    for place, gene in enumerate(genes):
        high = ~male if gene == "XIST" else male
        samples.values[:, place] = np.where(high, 10.0, 3.0)
        samples.values[:, place] += samples.draws.normal(0, 0.4, 50)
    samples.features = pd.DataFrame(
        {"feature": samples.names, "symbol": [*genes, *samples.names[len(genes) :]]}
    )
    return samples


def test_sex_that_agrees_is_information(samples):
    [finding] = with_sex(samples).found("sex-confirmed")
    assert "all 50 samples" in finding.message


def test_swapped_sample_and_unclear_sample_are_named(samples):
    with_sex(samples)
    samples.sheet.loc[7, "Sex"] = "F"
    samples.values[8, 0] = 3.0  # a woman without XIST, and without a Y
    [against] = samples.found("sex-contradicted")
    assert "1 sample has" in against.message
    assert against.message.endswith("of 50: 'S7'")
    [unclear] = samples.found("sex-unclear")
    assert unclear.message.endswith(": 'S8'")


def test_sex_is_not_checked_without_genes_or_without_both_sexes(samples):
    with_sex(samples, genes=("ABL1",))
    codes = ("sex-confirmed", "sex-contradicted", "sex-unclear")
    assert not any(samples.found(code) for code in codes)
    with_sex(samples)
    samples.sheet["Sex"] = "F"
    assert not any(samples.found(code) for code in codes)


def test_genes_that_do_not_separate_the_sexes_say_nothing(samples):
    with_sex(samples)
    samples.values[:, :3] = samples.draws.normal(5, 1, (50, 3))
    assert not samples.found("sex-contradicted")


def with_controls(samples, shift):
    samples.features = pd.DataFrame({"feature": samples.names, "role": "marker"})
    samples.features.loc[:9, "role"] = "control"
    samples.values[::2, 2] += shift
    return samples


def test_controls_that_tell_the_classes(samples):
    [finding] = with_controls(samples, 2.0).found("controls-predict-outcome")
    assert finding.severity == "warning"
    assert "1 of 10 controls tell 'case' from 'control'" in finding.message
    assert "'F2' AUC 0.9" in finding.message
    assert "Holm-adjusted" in finding.message


def test_quiet_controls_are_quiet():
    """Ten controls on noise: the adjustment keeps false warnings near one in twenty."""
    called = 0
    for seed in range(40):
        samples = Samples()
        samples.values = np.random.default_rng(seed).normal(7, 1, (50, 300))
        called += bool(with_controls(samples, 0.0).found("controls-predict-outcome"))
    assert called <= 5


def test_number_that_tells_the_outcome_is_judged_by_its_auc(samples):
    hours = np.where(np.arange(50) % 2 == 0, 7.0, 3.0) + samples.draws.normal(0, 2, 50)
    samples.sheet["hours"] = [str(value) for value in hours]
    [finding] = samples.found("outcome-tied-to-nuisance", nuisance=["hours"])
    assert finding.severity == "warning"
    area = mannwhitneyu(hours[::2], hours[1::2]).statistic / 25**2
    assert f"AUC {area:.3g} (0." in finding.message
    assert "Cramer's V" in finding.message
    assert not samples.found("outcome-tied-to-nuisance")


def test_a_covariate_that_tells_the_outcome_does_not_stop(samples):
    samples.sheet["stage"] = samples.sheet["group"]
    [finding] = samples.found("outcome-tied-to-covariate", covariates=["stage"])
    assert finding.severity == "warning"
