"""The invented Quillmere cohort: what was planted is found, noise is not believed.

The truth is that of `sample_cohorts/quillmere/truth.json`; no outside source.
"""

import json
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from panelkit.config import read_study
from panelkit.costing import BinaryTask, Judge, draw_everything, estimate_accuracy
from panelkit.fits import fit_panels, rank_univariate, standardised
from panelkit.metrics import auc
from panelkit.runtime import MemoryStore
from panelkit.workflow.check import check_study
from panelkit.workflow.procedure import procedure_of

ROOT = Path(__file__).parents[2]
STUDY = ROOT / "configs" / "quillmere.toml"


@pytest.fixture(scope="module")
def cohort():
    return check_study(STUDY)


@pytest.fixture(scope="module")
def truth():
    path = ROOT / "sample_cohorts" / "quillmere" / "truth.json"
    return json.loads(path.read_text(encoding="utf-8"))


def draws_of(data, seed, **sizes):
    asked = {
        "n_folds": 5,
        "n_repeats": 1,
        "n_inner": 3,
        "subsamples": 100,
        "inner_subsamples": 16,
    }
    return draw_everything(data, seed=seed, **(asked | sizes))


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_planted_groups_are_among_the_first_candidates(cohort, truth, seed):
    procedure, data, _ = procedure_of(read_study(STUDY), cohort)
    everyone = draws_of(data, seed, inner_subsamples=4).everyone
    stability = procedure.select(data, everyone).stability
    group_of = {
        member: group["name"]
        for group in truth["groups"]
        for member in group["members"]
    }
    first = [group_of.get(cohort.features[j]) for j in stability.candidates[:25]]
    assert len(set(first) - {None}) >= 8
    outside = [j for j in stability.shortlist if cohort.features[j] not in group_of]
    assert len(outside) <= 1
    assert len(stability.shortlist) >= 1


def test_dirt_is_found_where_it_was_planted(cohort, truth):
    told = " ".join(item.message for item in cohort.findings)
    for cell in truth["dirty_cells"]:
        if cell["text"] != "n/a":  # a common way to write a missing value
            assert f"column '{cell['column']}': '{cell['text']}'" in told
    for feature in truth["constant_features"]:
        assert feature in told
    assert any(
        item.code == "site-shift" and truth["shifted_clinic"]["clinic"] in item.message
        for item in cohort.findings
    )
    assert not cohort.findings.of("stop")


def test_shuffled_labels_give_one_half_and_outside_selection_flatters(cohort):
    """Ambroise & McLachlan 2002, PNAS 99:6562: selection belongs inside the loop."""
    procedure, data, _ = procedure_of(read_study(STUDY), cohort)
    procedure = replace(
        procedure, sizes=(5, 10), rules=replace(procedure.rules, n_penalties=20)
    )
    narrow = replace(data, base=data.base[:1500].copy(), barred=data.barred[:1500])
    honest, flattering = [], []
    for seed in range(8):
        rng = np.random.default_rng(seed)
        classes = rng.permutation(_class_of_subjects(data))
        shuffled = replace(narrow, task=BinaryTask(classes[data.subjects]))
        draws = draws_of(shuffled, seed, subsamples=20, n_inner=2)
        judge = Judge(
            shuffled.task, shuffled.subjects, shuffled.weights, draws.folds, 0.95
        )
        found = estimate_accuracy(
            procedure, shuffled, draws, f"shuffle {seed}", MemoryStore(), threads=2
        )
        honest.append(judge.metric(found.panels[1]).mean)
        flattering.append(_selected_outside(procedure, shuffled, draws))
    assert abs(np.mean(honest) - 0.5) < 0.06
    assert np.mean(flattering) > 0.65
    assert min(flattering) > max(0.5, np.mean(honest))


def _class_of_subjects(data):
    first = np.unique(data.subjects, return_index=True)[1]
    return data.task.y[first]


def _selected_outside(procedure, data, draws):
    """Cross-validate ten markers that were chosen with all labels: the error."""
    everyone = np.arange(data.n_samples)
    state = procedure.recipe.learn(data.base, everyone, data.barred)
    view = procedure.recipe.view(state, data.base)
    ranked = rank_univariate(view, data.task.y, everyone, data.subjects, data.weights)
    columns = view.columns(ranked.order[:10], everyone)
    areas = []
    for split in draws.splits.values():
        z = standardised(columns, split.training, data.weights[split.training])[0]
        fits = fit_panels(
            z[:, split.training],
            [np.arange(10)],
            data.task.y[split.training],
            data.weights[split.training],
            np.array([0.1]),
        )
        log_odds = fits.linear_predictors(z[:, split.test])[0, 0]
        areas.append(auc(log_odds, data.task.y[split.test]))
    return np.mean(areas)
