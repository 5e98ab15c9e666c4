"""The duality gap against exact values and as a certificate of solutions."""

import numpy as np
import pytest

from panelkit.errors import UsageError
from panelkit.fits import duality_gap, fit_paths


@pytest.mark.parametrize(
    ("coefficients", "gap"),
    # exact arithmetic on the eight rows at penalty 0.5: primal 3.21875 and 1.34375,
    # dual 0.8539540816 and 1.04
    [([0, 0, 0, 0], 2.3647959184), ([1, 0, 0, 0], 0.30375)],
)
def test_gap_of_points_that_are_not_optimal(eight, coefficients, gap):
    beta = np.array(coefficients, float)
    intercept = float((eight.gaussian - eight.X @ beta).mean())
    found = duality_gap(
        eight.X, eight.gaussian, intercept, beta, 0.5, family="gaussian"
    )
    assert found == pytest.approx(gap, abs=1e-10)


@pytest.mark.parametrize("family", ["gaussian", "binomial"])
@pytest.mark.parametrize("penalty", [0.05, 0.1, 0.2])
def test_gap_closes_at_solutions_and_only_there(eight, family, penalty):
    outcome = getattr(eight, family)
    fit = fit_paths(
        eight.X, outcome, family=family, penalties=[penalty], standardise=False,
        tol=1e-10,
    )  # fmt: skip
    intercept, beta = fit.coef(0, 0)
    gap = duality_gap(eight.X, outcome, intercept, beta, penalty, family=family)
    assert abs(gap) < 1e-9  # the gap is at most tol * penalty * L1 norm and rounding
    shrunk = fit_paths(
        eight.X, outcome, family=family, penalties=[2 * penalty], standardise=False,
        tol=1e-10,
    ).coef(0, 0)  # fmt: skip
    assert duality_gap(eight.X, outcome, *shrunk, penalty, family=family) > 1e-4


def test_gap_of_other_families_is_refused(eight):
    with pytest.raises(UsageError) as caught:
        duality_gap(eight.X, eight.gaussian, 0.0, np.zeros(4), 0.5, family="cox")
    assert caught.value.code == "gap-undefined"
