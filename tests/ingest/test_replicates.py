"""Technical replicates: kept, held against their samples, summarised."""

import numpy as np
import pandas as pd
import pytest

from panelkit.ingest import read_cohort, replicate_agreement

N, P = 30, 40


@pytest.fixture
def files():
    return Repeated()


class Repeated:
    """Thirty samples, the first ten measured again, S0 twice; ten noise features."""

    def __init__(self):
        self.draws = np.random.default_rng(2)
        truth = 8 + self.draws.normal(0, 1.0, (N, P))
        origin = [*range(N), *range(10), 0]
        self.ids = [f"S{n}" for n in range(N)] + [f"R{n}" for n in range(10)] + ["RR0"]
        self.values = truth[origin] + self.draws.normal(0, 0.3, (len(origin), P))
        noise = self.draws.normal(8, 1.0, (len(origin), 10))
        self.values[:, 30:] = noise
        self.sheet = pd.DataFrame(
            {
                "sample_id": self.ids,
                "group": [["case", "control"][n % 2] for n in origin],
                "again": [""] * N + [f"S{n}" for n in range(10)] + ["S0"],
                "year": [2020] * len(origin),
            }
        )

    def read(self, **options):
        frame = pd.DataFrame(
            self.values, index=self.ids, columns=[f"F{n}" for n in range(P)]
        )
        return read_cohort(
            frame, self.sheet, outcome="group", positive="case",
            replicate_of="again", **options,
        )  # fmt: skip


def test_replicates_are_kept_beside_the_cohort(files):
    cohort = files.read()
    assert cohort.n_samples == N
    repeated = cohort.replicates
    assert list(repeated.samples) == [f"R{n}" for n in range(10)] + ["RR0"]
    assert list(cohort.samples[repeated.of]) == [f"S{n}" for n in range(10)] + ["S0"]
    assert np.array_equal(repeated.values, files.values[N:].T)


def test_agreement_is_that_of_the_draws(files):
    """Between 1.0, within 0.3: ICC 1 / 1.09; the noise features have none."""
    table = replicate_agreement(files.read())
    assert list(table.n_samples) == [10] * P
    assert list(table.n_measurements) == [21] * P
    assert np.median(table.icc[:30]) == pytest.approx(1 / 1.09, abs=0.05)
    assert np.median(table.icc[30:]) < 0.3
    assert np.median(table.within_sd[:30]) == pytest.approx(0.3, abs=0.04)
    # log-normal: sqrt(exp((0.3 ln 2)^2) - 1)
    assert np.median(table.cv[:30]) == pytest.approx(0.2102124529, abs=0.03)
    half = 0.5 * (table.difference_high - table.difference_low)
    assert np.median(half[:30]) == pytest.approx(1.96 * np.sqrt(2) * 0.3, abs=0.12)


def test_differences_are_replicate_minus_sample(files):
    files.values[N:, 0] += 5.0
    table = replicate_agreement(files.read())
    assert table.difference[0] == pytest.approx(
        np.mean(files.values[N:, 0] - files.values[[*range(10), 0], 0])
    )


def test_the_finding_counts_poor_features(files):
    [finding] = [
        item for item in files.read().findings if item.code == "replicates-agreement"
    ]
    assert finding.severity == "info"
    poor = int((replicate_agreement(files.read()).icc < 0.5).sum())
    assert 5 <= poor <= 12
    assert "11 replicates of 10 samples" in finding.message
    assert f"below 0.5 in {poor} of 40 features" in finding.message
    files.values[:, :15] = files.draws.normal(8, 1, (41, 15))
    [finding] = [
        item for item in files.read().findings if item.code == "replicates-agreement"
    ]
    assert finding.severity == "warning"


def test_rows_that_were_filtered_out_stay_unread(files):
    files.sheet.loc[[N, N + 3], "year"] = 2010
    cohort = files.read(keep={"year": {"min": 2015}})
    assert "R0" not in cohort.replicates.samples
    assert "R3" not in cohort.replicates.samples
    assert len(cohort.replicates.samples) == 9


def test_replicates_of_samples_that_are_not_analysed_are_left_out(files):
    files.sheet.loc[4, "group"] = ""
    assert "R4" not in files.read().replicates.samples


def test_counts_are_compared_per_million(files):
    """Twice the depth is no disagreement."""
    counts = files.draws.poisson(2.0**files.values).astype(float)
    counts[N:] = files.draws.poisson(2.0 * 2.0 ** files.values[N:])
    files.values = counts
    table = replicate_agreement(files.read())
    assert abs(np.median(table.difference)) < 0.2


def test_one_pair_is_too_few_and_says_so(files):
    files.sheet.loc[N + 1 :, "again"] = ""
    files.sheet.loc[N + 1 :, "group"] = ""
    [finding] = [
        item for item in files.read().findings if item.code == "replicates-agreement"
    ]
    assert "1 replicate of 1 sample are too few" in finding.message


def test_without_the_column_there_are_none(files):
    frame = pd.DataFrame(files.values[:N], index=files.ids[:N])
    cohort = read_cohort(frame, files.sheet[:N], outcome="group", positive="case")
    assert cohort.replicates is None
    assert replicate_agreement(cohort) is None
