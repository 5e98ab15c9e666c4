"""`StabilitySelector` in scikit-learn's own hands."""

import anndata
import numpy as np
import pandas as pd
import pytest
from sklearn.linear_model import LogisticRegression
from sklearn.model_selection import GridSearchCV
from sklearn.pipeline import make_pipeline
from sklearn.preprocessing import StandardScaler
from sklearn.utils.estimator_checks import parametrize_with_checks

from panelkit import StabilitySelector
from panelkit.errors import StudyFileError


@parametrize_with_checks([StabilitySelector(n_subsamples=6)])
@pytest.mark.filterwarnings("ignore:No features were selected:UserWarning")
@pytest.mark.filterwarnings("ignore::sklearn.exceptions.SkipTestWarning")
def test_scikit_learns_own_checks(estimator, check):
    check(estimator)


@pytest.fixture(scope="module")
def cohort():
    draws = np.random.default_rng(0)
    y = np.where(np.arange(60) % 2, "case", "control")
    X = draws.normal(size=(60, 120))
    X[:, [3, 50]] += 2.0 * (y == "case")[:, None]
    X[:, 7] = 1.0  # constant
    return X, y


def selector(**given):
    return StabilitySelector(n_subsamples=20, **given)


def test_planted_features_are_selected(cohort):
    X, y = cohort
    fitted = selector().fit(X, y)
    assert fitted.get_support(indices=True).tolist() == [3, 50]
    assert fitted.selection_frequency_.shape == (120,)
    assert (fitted.selection_frequency_[[3, 50]] > 0.9).all()
    assert fitted.selection_frequency_[7] == 0.0
    assert fitted.family_ == "binomial"
    assert fitted.classes_.tolist() == ["case", "control"]
    assert fitted.transform(X).tolist() == X[:, [3, 50]].tolist()


def test_same_seed_same_answer_for_any_jobs(cohort):
    X, y = cohort
    one, two = selector().fit(X, y), selector(n_jobs=2).fit(X, y)
    other = selector(random_state=9).fit(X, y)
    assert one.selection_frequency_.tolist() == two.selection_frequency_.tolist()
    assert one.selection_frequency_.tolist() != other.selection_frequency_.tolist()


def test_candidates_instead_of_the_shortlist(cohort):
    X, y = cohort
    fitted = selector(select="candidates", candidates=4).fit(X, y)
    assert 4 <= fitted.get_support().sum() <= 8
    assert fitted.get_support()[[3, 50]].all()


def test_pipeline_and_grid_search(cohort):
    X, y = cohort
    pipeline = make_pipeline(
        StandardScaler(), selector(select="candidates"), LogisticRegression()
    )
    search = GridSearchCV(
        pipeline, {"stabilityselector__candidates": [2, 5]}, cv=3, scoring="roc_auc"
    ).fit(X, y)
    assert search.best_score_ > 0.9


def test_data_frames_come_back_with_their_names(cohort):
    X, y = cohort
    frame = pd.DataFrame(X, columns=[f"g{j}" for j in range(120)])
    fitted = selector().set_output(transform="pandas").fit(frame, y)
    assert fitted.transform(frame).columns.tolist() == ["g3", "g50"]
    assert fitted.get_feature_names_out().tolist() == ["g3", "g50"]
    table = fitted.to_frame()
    assert table["feature"].tolist() == frame.columns.tolist()
    assert table.loc[table["shortlist"], "feature"].tolist() == ["g3", "g50"]
    assert (table["frequency_low"] <= table["frequency"]).all()


def test_annotated_data(cohort):
    X, y = cohort
    data = anndata.AnnData(
        X.copy(),
        obs=pd.DataFrame({"state": y}, index=[f"s{i}" for i in range(60)]),
        var=pd.DataFrame(index=[f"g{j}" for j in range(120)]),
    )
    fitted = selector().fit(data, "state")
    assert fitted.get_support(indices=True).tolist() == [3, 50]
    assert fitted.transform(data).var_names.tolist() == ["g3", "g50"]
    fitted.annotate(data)
    assert data.var.index[data.var["stability_shortlist"]].tolist() == ["g3", "g50"]
    frequency = data.var["stability_frequency"].to_numpy()
    assert frequency.tolist() == fitted.selection_frequency_.tolist()
    with pytest.raises(ValueError, match="not those fitted"):
        fitted.annotate(data[:, :5].copy())


def test_rows_of_one_subject_stay_together(cohort):
    X, y = cohort
    thrice = np.repeat(np.arange(60), 3)
    one = selector().fit(X, y)
    other = selector().fit(X[thrice], y[thrice], groups=thrice)
    assert other.selection_frequency_ == pytest.approx(
        one.selection_frequency_, abs=0.051
    )
    with pytest.raises(ValueError, match="groups"):
        selector().fit(X, y, groups=thrice)


def test_numbers_and_several_classes(cohort):
    X, _ = cohort
    draws = np.random.default_rng(1)
    number = 2.0 * X[:, 9] + draws.normal(size=60)
    assert selector().fit(X, number).get_support(indices=True).tolist() == [9]
    classes = np.digitize(3.0 * X[:, 9], [-1.0, 1.0])
    fitted = selector().fit(X, classes)
    assert fitted.family_ == "multinomial"
    assert fitted.get_support()[9]


@pytest.mark.parametrize(
    ("given", "match"),
    [
        ({"n_subsamples": 5}, "even number"),
        ({"threshold": 0.3}, "threshold"),
        ({"selector": "forest"}, "selector"),
    ],
)
def test_wrong_parameters(cohort, given, match):
    X, y = cohort
    with pytest.raises(ValueError, match=match):
        StabilitySelector(**given).fit(X, y)


def test_demands_that_cannot_be_met(cohort):
    X, y = cohort
    with pytest.raises(StudyFileError) as caught:
        selector(markers_per_subsample=60, threshold=None, false_markers=0.1).fit(X, y)
    assert caught.value.code == "bound-infeasible"


def test_too_few_of_a_class(cohort):
    X, _ = cohort
    with pytest.raises(ValueError, match="smallest class of y has 3"):
        selector().fit(X, np.repeat(["a", "b"], [57, 3]))
