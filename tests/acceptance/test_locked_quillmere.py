"""A panel locked on the invented cohort meets the later clinic: shift and drop.

What the later clinic does is written down in truth.json: every value 0.2 log2 higher,
more noise, and two groups of markers that have lost their effect.
"""

import json
from pathlib import Path
from statistics import NormalDist

import numpy as np
import pytest

from panelkit.config import read_study
from panelkit.lock import ChosenPanel, freeze_panel, panel_bytes
from panelkit.metrics import auc, cross_validated_auc
from panelkit.workflow import LockedPanel, SheetColumns, validate_panel
from panelkit.workflow.check import checked
from panelkit.workflow.lock import taught_on

REPOSITORY = Path(__file__).parents[2]
SAMPLES = REPOSITORY / "sample_cohorts" / "quillmere"
TRUTH = json.loads((SAMPLES / "truth.json").read_text())
GROUPS = TRUTH["groups"][:9]  # the best marker of each, two of them lost later
LOST = [g["best"] for g in GROUPS if not g["carries_effect_later"]]


def effects(key):
    """Effect of each group's best marker in units of the spread within outcomes."""
    return np.array([g[key][g["members"].index(g["best"])] for g in GROUPS])


@pytest.fixture(scope="module")
def known():
    return checked(read_study(REPOSITORY / "configs" / "quillmere.toml"))


@pytest.fixture(scope="module")
def locked(known, tmp_path_factory):
    """Nine markers that the truth names, since a run need not choose the lost ones."""
    plan = read_study(REPOSITORY / "configs" / "quillmere.toml")
    data, names = known.data, [str(f) for f in known.cohort.features]
    state = known.procedure.recipe.learn(
        data.base, np.arange(data.n_samples), data.barred, data.context
    )
    record = {"panelkit": "0", "versions": {}, "inputs": {}}
    taught = taught_on(plan, known, state, record)
    markers = np.array([names.index(g["best"]) for g in GROUPS])
    # chosen by the truth, not by these people: what is fitted to them is no selection
    values = np.log2(known.cohort.values[markers].astype(float) + 1.0)
    values = np.where(np.isnan(values), np.nanmedian(values, axis=1)[:, None], values)
    spread = values.std(axis=1)
    linear = (effects("member_effects") / spread) @ values
    linear = linear - linear.mean()
    folds = np.zeros((1, data.n_samples), np.int64)
    figure = cross_validated_auc(
        linear[None], taught.outcome, folds, taught.subjects, taught.weights, 0.95
    )
    panel = ChosenPanel(
        "truth-9", markers, 0.02, linear[None], "a score by the truth",
        figure.mean, figure.low, figure.high, {},
    )  # fmt: skip
    content = freeze_panel(panel, taught, [], np.random.default_rng(0))
    path = tmp_path_factory.mktemp("quillmere") / "panel.json"
    path.write_bytes(panel_bytes(content))
    return path


@pytest.fixture(scope="module")
def found(locked):
    return validate_panel(
        locked,
        SAMPLES / "later_expression.csv.gz",
        SAMPLES / "later_samples.csv",
        out=locked.parent / "out",
        columns=SheetColumns(subject="person", replicate_of="replicate_of"),
    )


def test_the_later_clinic_is_there(found):
    assert found.subjects == 90
    assert found.cases + found.controls == 90


def test_the_shift_of_the_later_clinic_is_found(known, found):
    """0.2 over all, less what the shifted clinic already lent to the training mean."""
    site = known.cohort.design.site
    share = np.average(site == "Orchard", weights=known.cohort.design.weights)
    expected = TRUTH["later_log2_shift"] - TRUTH["shifted_clinic"]["log2_shift"] * share
    lost_too = [each for each in found.shifts if each.feature not in LOST]
    assert expected > 0.05
    assert np.median([each.shift for each in lost_too]) == pytest.approx(
        expected, abs=0.08
    )
    inside = [each.shift_low < expected < each.shift_high for each in lost_too]
    assert sum(inside) >= len(inside) - 1


def test_the_lost_groups_are_found(found):
    by_name = {each.feature: each for each in found.shifts}
    assert len(LOST) == 2
    for name in LOST:
        each = by_name[name]
        assert each.difference_low < 0.0 < each.difference_high
        assert abs(each.difference_training) > 0.3
    strong = by_name[GROUPS[0]["best"]]
    assert strong.difference_low > 0.0


def test_the_drop_agrees_with_the_truth(locked, found):
    """Normal scores of independent groups: AUC = Phi(w'd / sqrt(2 w'w)).

    Closed form of the area for normal scores of equal spread: Hanley 1988, Med Decis
    Making 8:197; w in units of the spread within outcomes.
    """
    content = LockedPanel.read(locked).content
    w = np.array([m.coefficient * m.class_deviation for m in content.markers])

    def area(key):
        return NormalDist().cdf(w @ effects(key) / np.sqrt(2.0 * w @ w))

    before, after = area("member_effects"), area("member_effects_later")
    assert before - after > 0.02  # there is a drop to be found
    figure = found.figure("auc")
    assert figure.low < after < figure.high
    drop = content.honest.metric - figure.value
    spread = (figure.high - figure.low) / 2.0
    assert abs(drop - (before - after)) < spread
    assert figure.value < TRUTH["oracle_auc"]["later"] + spread


def test_training_scores_are_no_surprise(known, locked):
    """The panel's own training scores reach what the truth expects of them."""
    content = LockedPanel.read(locked).content
    scored = LockedPanel(content).score(known.cohort.to_frame())
    area = auc(scored.log_odds, known.cohort.outcome.values)
    assert area == pytest.approx(TRUTH["oracle_auc"]["discovery"], abs=0.06)
