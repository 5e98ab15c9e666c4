"""The scale guess on invented values of each kind, and on kinds easily confused."""

import numpy as np
import pytest

from panelkit.ingest.scale import guess_scale, scale_finding

draws = np.random.default_rng(0)
levels = draws.normal(7, 2, (300, 1))
log2 = np.clip(levels + draws.normal(0, 0.5, (300, 40)), 2, 14)
ratios = draws.normal(0, draws.gamma(2, 0.5, (300, 1)), (300, 40))
standardised = (ratios - ratios.mean(axis=1, keepdims=True)) / ratios.std(
    axis=1, ddof=1, keepdims=True
)

CASES = {
    "counts": [
        draws.poisson(2**levels, (300, 40)),
        draws.poisson(0.3, (300, 40)),
        1 + draws.poisson(2**levels, (300, 40)),
    ],
    "linear": [2**log2, np.maximum(20, np.rint(2**log2 - 100)), 100 * ratios],
    "log2": [log2, ratios, 20 + log2],
    "beta-values": [draws.beta(0.5, 0.5, (300, 40))],
    "z-scores": [standardised, standardised[:, :25]],
    "unknown": [np.full((3, 3), np.nan)],
}


@pytest.mark.parametrize(
    ("kind", "number"),
    [(kind, number) for kind, cases in CASES.items() for number in range(len(cases))],
)
@pytest.mark.parametrize("gaps", [False, True])
def test_scale_of_invented_values(kind, number, gaps):
    values = np.array(CASES[kind][number], dtype=float)
    if gaps:
        values[np.random.default_rng(1).random(values.shape) < 0.2] = np.nan
    guess = guess_scale(values)
    assert guess.kind == kind
    finding = scale_finding(guess, "expression")
    assert finding.code == "scale-guess"
    assert (finding.severity == "warning") == (kind in ("z-scores", "unknown"))


def test_evidence_is_what_the_values_show():
    guess = guess_scale(np.array([[1.0, 2.0, np.nan], [0.0, -3.5, 8.0]]))
    assert guess.evidence["minimum"] == -3.5
    assert guess.evidence["maximum"] == 8.0
    assert guess.evidence["median"] == 1.0
    assert guess.evidence["share_whole"] == 0.8
    assert guess.evidence["share_negative"] == 0.2
    assert guess.evidence["share_zero"] == 0.2


@pytest.mark.parametrize(
    "kind", ["counts", "linear", "log2", "beta-values", "z-scores"]
)
@pytest.mark.parametrize("cell", [1e300, -1e300, 1e20, -999.0])
@pytest.mark.filterwarnings("error")
def test_one_absurd_cell_does_not_change_the_guess(kind, cell):
    for case in CASES[kind]:
        values = np.array(case, dtype=float)
        values[7, 3] = cell
        assert guess_scale(values).kind == kind
        narrow = values.clip(-3e38, 3e38).astype(np.float32)
        assert guess_scale(narrow).kind == kind


def test_sparse_values_are_judged_by_those_that_are_not_zero():
    values = np.where(draws.random((300, 40)) < 0.995, 0.0, 2**log2 + 0.5)
    assert guess_scale(values).kind == "linear"


def test_counts_without_zeros_are_no_floored_intensities():
    values = 1 + draws.poisson(draws.gamma(0.5, 200, (300, 1)), (300, 40))
    assert guess_scale(values).kind == "counts"
    floored = np.maximum(np.rint(2**log2), 40)
    assert guess_scale(floored).kind == "linear"


def test_evidence_stands_in_the_message():
    message = scale_finding(guess_scale(CASES["counts"][0]), "expression").message
    assert message.startswith("the values seem to be counts: 98 % of the values")
    assert "100 % whole numbers" in message
