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
