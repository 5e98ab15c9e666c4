"""Nobody is predicted by a model that saw them, and every fold keeps to the rules."""

import numpy as np
import pytest

from panelkit import run_study

KEYS = ["repeat", "maker", "size"]


@pytest.fixture(scope="module")
def predictions(finished):
    return finished.table("predictions.csv")


@pytest.fixture(scope="module")
def folds(finished):
    return finished.table("folds.csv")


@pytest.fixture(scope="module")
def fold_panels(finished):
    return finished.table("fold_panels.csv")


def test_every_sample_once_per_repeat_and_procedure(predictions, study):
    sheet = (study.parent / "samples.csv").read_text().splitlines()
    names = [line.partition(",")[0] for line in sheet]
    for _, rows in predictions.groupby(KEYS):
        assert sorted(rows["sample"]) == sorted(names[1:])
    assert predictions.groupby(KEYS).ngroups == 2 * 11
    assert predictions["score"].between(0.0, 1.0, inclusive="neither").all()


def test_predictions_keep_to_the_folds(predictions, folds):
    joined = predictions.merge(folds, on=["sample", "repeat"], suffixes=("", "_plan"))
    assert len(joined) == len(predictions)
    assert (joined["fold"] == joined["fold_plan"]).all()


def test_no_subject_is_in_training_and_test_at_once(folds):
    """Ten people have two samples: drawn by sample, some pair would be torn apart."""
    assert folds["subject"].nunique() == 30
    assert len(folds) == 2 * 40
    assert (folds.groupby(["repeat", "subject"])["fold"].nunique() == 1).all()
    assert set(folds["fold"]) == {0, 1, 2}


def test_repeats_are_drawn_anew(folds):
    wide = folds.pivot(index="sample", columns="repeat", values="fold")
    assert (wide[0] != wide[1]).any()


def test_folds_are_stratified_by_the_outcome(folds, predictions):
    """Fifteen people of each class over three folds: five of each in every fold."""
    outcome = predictions.drop_duplicates("sample").set_index("sample")["outcome"]
    people = folds.assign(outcome=folds["sample"].map(outcome)).drop_duplicates(
        ["repeat", "subject"]
    )
    counts = people.groupby(["repeat", "fold", "outcome"]).size()
    assert (counts == 5).all()
    assert len(counts) == 2 * 3 * 2


def test_fold_panels_name_features_of_the_matrix(fold_panels, study):
    with (study.parent / "expression.csv").open() as file:
        features = set(file.readline().strip().split(",")[1:])
    assert len(fold_panels) == 2 * 3 * 6
    for row in fold_panels.itertuples():
        markers = row.markers.split(";")
        assert len(markers) == len(set(markers)) == row.size
        assert set(markers) <= features


def test_each_fold_has_one_primary_choice_and_its_scores(fold_panels, predictions):
    """Else the nested figure would be of something else than what was chosen."""
    chosen = fold_panels[fold_panels["chosen_by_primary"]]
    assert (chosen.groupby(["repeat", "fold"]).size() == 1).all()
    assert len(chosen) == 6
    by_fold = dict(list(predictions.groupby(["repeat", "fold", "maker", "size"])))
    for row in chosen.itertuples():
        own = by_fold[row.repeat, row.fold, row.maker, row.size]["score"]
        taken = by_fold[row.repeat, row.fold, "primary-rule", 0]["score"]
        assert own.tolist() == taken.tolist()
    assert chosen["cost_total"].notna().all()


def test_values_of_held_out_people_change_nothing_that_is_learnt(
    tiny, finished, fold_panels, predictions, tmp_path
):
    """Every test row of one fold but one person's is moved by ten units, enough to
    turn every ranking and to shift every median; what that fold learnt may not move
    by a bit, so the person who stays keeps every score to the last digit."""
    plan = finished.table("folds.csv")
    held_out = plan[(plan["repeat"] == 0) & (plan["fold"] == 1)]
    stays = held_out["subject"].iloc[0]
    rows = held_out["sample"][held_out["subject"] != stays]
    moved = np.random.default_rng(1).uniform(5.0, 15.0, (len(rows), 60))
    tiny.expression.loc[rows] += moved
    run_study(tiny.write(), tmp_path / "out", threads=1)
    other = type(finished)(tmp_path / "out")
    assert other.table("folds.csv").equals(plan)
    columns = ["maker", "size", "markers", "ridge_penalty", "chosen_by_primary"]
    panels = other.table("fold_panels.csv")

    def of_fold(table, fold, columns):
        found = table[(table["repeat"] == 0) & (table["fold"] == fold)]
        return found[columns].reset_index(drop=True)

    assert of_fold(panels, 1, columns).equals(of_fold(fold_panels, 1, columns))
    assert not of_fold(panels, 0, columns).equals(of_fold(fold_panels, 0, columns))
    samples = held_out["sample"][held_out["subject"] == stays]
    before, after = (
        of_fold(table[table["sample"].isin(samples)], 1, ["maker", "size", "score"])
        for table in (predictions, other.table("predictions.csv"))
    )
    assert len(before) == 11 * len(samples)
    assert after.equals(before)
