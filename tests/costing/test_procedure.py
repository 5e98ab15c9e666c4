"""The whole procedure: nothing leaks, nothing depends on threads, noise stays noise."""

import numpy as np
import pytest

from panelkit.costing import (
    BinaryTask,
    Procedure,
)
from panelkit.fits import fit_panels, standardised
from panelkit.metrics import auc
from panelkit.preparation import Recipe
from panelkit.stability import ShortlistRules

LEARNT = ("filter", "median-fill")


@pytest.fixture
def procedure():
    return Procedure(
        Recipe(LEARNT),
        ShortlistRules(markers_per_subsample=5, n_penalties=12, candidates=10),
        makers=("frequency", "univariate"),
        sizes=(1, 3, 6),
    )


def everything(learnt):
    """Return every number that was learnt, as bytes; predictions apart."""
    stability = learnt.selected.stability
    found = {
        name: np.asarray(getattr(stability, name)).tobytes()
        for name in (
            "frequency",
            "low",
            "high",
            "positive_share",
            "shortlist",
            "candidates",
            "group",
            "group_frequency",
            "t",
        )
    }
    found["bound"] = stability.bound.worst_case
    found["picks"] = [picks.tolist() for picks in stability.picks]
    found["state"] = learnt.selected.view.state.digest()
    found["panels"] = [panel.tolist() for panel in learnt.selected.panels]
    found["penalties"] = learnt.penalties.tolist()
    found["best"] = learnt.tuning.best.tobytes()
    found["area"] = learnt.tuning.metric.tobytes()
    return found


@pytest.mark.parametrize("kind", [np.float32, np.float64])
@pytest.mark.parametrize("change", ["random", "missing", "huge"])
@pytest.mark.parametrize("fold", [0, 2])
def test_held_out_rows_change_no_bit_of_what_is_learnt(
    kind, change, fold, procedure, drawn_cohort
):
    # signals are weak and many cells missing, so that frequencies, fills, penalties and
    # the chosen size all sit where a single leaked value would move them
    cohort = drawn_cohort(1, 36, 300, signals=4, rows_per_subject=2, missing=0.1)
    cohort.base = cohort.base.astype(kind)
    training, test = cohort.folds(4).split(0, fold)
    split = cohort.split(training, test)
    changed = cohort.base.copy()
    changed[:, test] = {
        "random": np.random.default_rng(9).normal(size=(300, len(test))),
        "missing": np.nan,
        "huge": 1e12,
    }[change]
    one = procedure.learn(cohort.data(), split)
    other = procedure.learn(cohort.data(changed), split)
    assert everything(one) == everything(other)
    if change == "random":
        assert one.predicted.tobytes() != other.predicted.tobytes()  # it was applied


@pytest.mark.parametrize("seed", [2, 4])
def test_held_out_rows_of_a_large_matrix_change_no_bit(seed, monkeypatch, drawn_cohort):
    monkeypatch.setattr("panelkit.fits.product.COPY_LIMIT", 0)
    cohort = drawn_cohort(seed, 36, 300, signals=4, rows_per_subject=2, missing=0.1)
    rules = ShortlistRules(markers_per_subsample=4, n_penalties=6, candidates=10)
    procedure = Procedure(Recipe(LEARNT), rules, ("frequency", "univariate"), (1, 3, 6))
    training, test = cohort.folds(4).split(0, 0)
    split = cohort.split(training, test)
    changed = cohort.base.copy()
    changed[:, test] = 1e3 * np.random.default_rng(9).normal(size=(300, len(test)))
    one = everything(procedure.learn(cohort.data(), split))
    other = everything(procedure.learn(cohort.data(changed), split))
    assert [name for name in one if one[name] != other[name]] == []


@pytest.mark.parametrize("threads", [1, 2])
def test_held_out_outcomes_change_nothing_at_all(threads, procedure, drawn_cohort):
    cohort = drawn_cohort(2, 40, 300, signals=4)
    training, test = cohort.folds(4).split(0, 1)
    split = cohort.split(training, test)
    other = cohort.y.copy()
    other[test] = 1.0 - other[test]
    weights = cohort.weights.copy()
    weights[test] = 100.0
    one = procedure.learn(cohort.data(), split, threads)
    two = procedure.learn(
        cohort.data(task=BinaryTask(other), weights=weights), split, threads
    )
    assert everything(one) == everything(two)
    assert one.predicted.tobytes() == two.predicted.tobytes()


def test_a_training_value_does_change_what_is_learnt(procedure, drawn_cohort):
    # the guard of the leak tests: they would pass on a procedure that learns nothing
    cohort = drawn_cohort(1, 36, 300, signals=4, rows_per_subject=2, missing=0.1)
    training, test = cohort.folds(4).split(0, 0)
    split = cohort.split(training, test)
    changed = cohort.base.copy()
    changed[:, training[:4]] = np.random.default_rng(9).normal(size=(300, 4))
    one = everything(procedure.learn(cohort.data(), split))
    other = everything(procedure.learn(cohort.data(changed), split))
    for name in ("state", "frequency", "panels", "area", "t"):
        assert one[name] != other[name]


def test_inner_test_rows_do_not_teach_the_selection_they_judge(procedure, drawn_cohort):
    cohort = drawn_cohort(3, 40, 300, signals=4, missing=0.1)
    training, test = cohort.folds(4).split(0, 0)
    inner = cohort.split(training, test).inner[1]
    changed = cohort.base.copy()
    changed[:, inner.test] = 5.0
    one = procedure.select(cohort.data(), inner)
    other = procedure.select(cohort.data(changed), inner)
    assert one.view.state.digest() == other.view.state.digest()
    assert one.stability.frequency.tobytes() == other.stability.frequency.tobytes()
    assert [p.tolist() for p in one.panels] == [p.tolist() for p in other.panels]


def test_threads_change_no_bit(procedure, monkeypatch, drawn_cohort):
    monkeypatch.setattr("panelkit.fits.product.TILE", 64)
    cohort = drawn_cohort(4, 40, 500, signals=4, missing=0.05)
    split = cohort.split(*cohort.folds(4).split(0, 2))
    one = procedure.learn(cohort.data(), split, threads=1)
    two = procedure.learn(cohort.data(), split, threads=2)
    assert everything(one) == everything(two)
    assert one.predicted.tobytes() == two.predicted.tobytes()


def test_predictions_come_from_a_refit_on_the_training_rows(procedure, drawn_cohort):
    cohort = drawn_cohort(5, 40, 200, signals=4, missing=0.1)
    training, test = cohort.folds(4).split(0, 0)
    split = cohort.split(training, test)
    learnt = procedure.learn(cohort.data(), split)
    state = learnt.selected.view.state
    prepared = procedure.recipe.apply(state, cohort.base, np.arange(40))
    Z, _, _ = standardised(prepared, training, np.ones(len(training)))
    assert len(learnt.selected.panels) == 6
    for p, panel in enumerate(learnt.selected.panels):
        fits = fit_panels(
            Z[:, training],
            [panel],
            cohort.y[training],
            np.ones(len(training)),
            learnt.penalties[p : p + 1],
        )
        expected = fits.linear_predictors(Z[:, test])[0, 0]
        assert learnt.predicted[p] == pytest.approx(expected, abs=1e-12)
        # tuned on fewer rows than it is used on
        ratio = (len(split.inner) - 1) / len(split.inner)
        grid = np.array(procedure.ridge_penalties) * ratio
        assert np.isclose(grid, learnt.penalties[p], rtol=1e-12).any()


def test_panels_come_from_the_candidates_in_order_of_maker_and_size(
    procedure, drawn_cohort
):
    cohort = drawn_cohort(6, 40, 200, signals=4)
    learnt = procedure.learn(cohort.data(), cohort.split(*cohort.folds(4).split(0, 0)))
    assert [len(panel) for panel in learnt.selected.panels] == [1, 3, 6, 1, 3, 6]
    for panel in learnt.selected.panels:
        assert np.isin(panel, learnt.selected.stability.candidates).all()


def test_barred_features_never_reach_a_panel(procedure, drawn_cohort):
    cohort = drawn_cohort(7, 40, 200, signals=4)
    barred = np.full(200, "", object)
    barred[:4] = "barred by the study"  # the signals themselves
    split = cohort.split(*cohort.folds(4).split(0, 0))
    learnt = procedure.learn(cohort.data(barred=barred), split)
    for panel in learnt.selected.panels:
        assert not np.isin(panel, np.arange(4)).any()


def test_forced_features_are_candidates_in_every_fold(procedure, drawn_cohort):
    cohort = drawn_cohort(8, 40, 200, signals=4)
    data = cohort.data(always=np.array([150]))
    for fold in range(4):
        split = cohort.split(*cohort.folds(4).split(0, fold), n_inner=0)
        assert 150 in procedure.select(data, split).stability.candidates


def test_no_test_rows_are_no_predictions(procedure, drawn_cohort):
    cohort = drawn_cohort(9, 40, 100, signals=4)
    split = cohort.split(np.arange(40), np.empty(0, np.int64))
    learnt = procedure.learn(cohort.data(), split)
    assert learnt.predicted.shape == (6, 0)


@pytest.mark.parametrize("seed", [0, 1])
def test_ridge_on_all_reads_no_held_out_outcome_and_learns_a_signal(
    seed, procedure, drawn_cohort
):
    cohort = drawn_cohort(10 + seed, 60, 100, signals=20)
    training, test = cohort.folds(3).split(0, seed)
    split = cohort.split(training, test, n_inner=0)
    view = procedure.select(cohort.data(), split).view
    found = procedure.ridge_on_all(cohort.data(), split, view)
    other = cohort.y.copy()
    other[test] = 1.0 - other[test]
    again = procedure.ridge_on_all(cohort.data(task=BinaryTask(other)), split, view)
    assert found.tobytes() == again.tobytes()
    assert auc(found, cohort.y[test]) > 0.8


def test_signal_is_found_out_of_fold(procedure, drawn_cohort):
    cohort = drawn_cohort(12, 60, 300, signals=4)
    folds = cohort.folds(3)
    areas = []
    for fold in range(3):
        training, test = folds.split(0, fold)
        learnt = procedure.learn(cohort.data(), cohort.split(training, test))
        areas.append([auc(eta, cohort.y[test]) for eta in learnt.predicted])
    assert np.mean(areas, axis=0)[2] > 0.85  # six markers by frequency


def test_noise_is_worth_one_half_unless_the_selection_sees_every_row(drawn_cohort):
    # Ambroise & McLachlan 2002, PNAS 99:6562: selecting on all rows and validating
    # afterwards flatters pure noise. 30 data sets of 40 samples and 500 features; the
    # standard error of an honest mean is about 0.02
    procedure = Procedure(
        Recipe(LEARNT),
        ShortlistRules(markers_per_subsample=5, n_penalties=8, candidates=10),
        makers=("frequency", "univariate"),
        sizes=(5,),
        ridge_penalties=(1.0, 0.1),
    )
    honest, flattering = np.zeros((30, 2)), np.zeros((30, 2))
    for seed in range(30):
        cohort = drawn_cohort([99, seed], 40, 500)
        data, folds = cohort.data(), cohort.folds(5, seed)
        no_rows = np.empty(0, np.int64)
        whole = procedure.select(
            data, cohort.split(np.arange(40), no_rows, seed, n_inner=0)
        )
        for fold in range(5):
            training, test = folds.split(0, fold)
            split = cohort.split(training, test, seed)
            learnt = procedure.learn(data, split)
            for maker in range(2):
                honest[seed, maker] += auc(learnt.predicted[maker], cohort.y[test]) / 5
                panel = whole.panels[maker]
                Z, _, _ = standardised(
                    whole.view.columns(panel, np.arange(40)),
                    training,
                    np.ones(len(training)),
                )
                fits = fit_panels(
                    Z[:, training],
                    [np.arange(len(panel))],
                    cohort.y[training],
                    np.ones(len(training)),
                    learnt.penalties[maker : maker + 1],
                )
                eta = fits.linear_predictors(Z[:, test])[0, 0]
                flattering[seed, maker] += auc(eta, cohort.y[test]) / 5
    assert honest.mean(axis=0) == pytest.approx([0.5, 0.5], abs=0.06)
    assert (flattering.mean(axis=0) > 0.85).all()
