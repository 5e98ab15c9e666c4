"""A locked panel on new people: figures, shifts, overlap, plan, verdict."""

import csv
import hashlib
import json
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from jsonschema import Draft202012Validator
from scipy.stats import binomtest
from sklearn.linear_model import LogisticRegression
from sklearn.metrics import roc_auc_score

from panelkit import LockedPanel, recalibrate_panel, validate_panel
from panelkit.errors import InputDataError, PanelFileError, StudyFileError, UsageError
from panelkit.workflow import SheetColumns

REPOSITORY = Path(__file__).parents[2]


def judged(locked, files, tmp_path, **how):
    return validate_panel(locked.panel, *files, out=tmp_path / "out", **how)


@pytest.fixture
def plan(locked, tmp_path):
    def write(**keys):
        own = LockedPanel.read(locked.panel).content.content_sha256
        keys = {"panel": own, "primary": "auc", "at_least": 0.7, **keys}
        path = tmp_path / "plan.toml"
        lines = [f"{key} = {json.dumps(value)}" for key, value in keys.items()]
        path.write_text("\n".join(["[validation]", *lines]))
        return path

    return write


def test_figures_are_those_of_other_libraries(locked, people, tmp_path):
    files = people(n=120)
    found = judged(locked, files, tmp_path)
    scored = LockedPanel.read(locked.panel).score(files[0])
    y = np.arange(120) % 2
    area = found.figure("auc")
    assert area.value == pytest.approx(roc_auc_score(y, scored.log_odds))
    assert area.low < area.value < area.high
    peer = LogisticRegression(C=np.inf, tol=1e-10, max_iter=1000)
    peer.fit(scored.log_odds[:, None], y)
    assert found.figure("calibration-slope").value == pytest.approx(
        peer.coef_[0, 0], rel=1e-4
    )
    cut = LockedPanel.read(locked.panel).content.cutoffs[0]
    hits = int((scored.chances[y == 1] >= cut.chance).sum())
    for name, method in (("sensitivity", "wilson"), ("sensitivity-exact", "exact")):
        figure = found.figure(name, cut.name)
        expected = binomtest(hits, 60).proportion_ci(0.95, method)
        assert (figure.low, figure.high) == pytest.approx(tuple(expected))


def test_files_agree_with_what_is_returned(locked, people, tmp_path):
    found = judged(locked, people(), tmp_path)
    out = tmp_path / "out"
    content = json.loads((out / "validation.json").read_text())
    path = REPOSITORY / "panelkit/records/schemas/validation.json"
    Draft202012Validator(json.loads(path.read_text())).validate(content)
    data = (out / "scores.csv").read_bytes()
    assert hashlib.sha256(data).hexdigest() == found.scores_sha256
    assert "response" not in data.decode().splitlines()[0]
    with (out / "figures.csv").open(newline="") as file:
        assert len(list(csv.DictReader(file))) == len(found.figures)
    assert "research" in content["research_use"]
    assert content["verdict"] == "exploratory"


def test_scores_do_not_look_at_outcomes(locked, people, tmp_path):
    files = people()
    first = judged(locked, files, tmp_path).scores_sha256
    sheet = pd.read_csv(files[1])
    sheet["response"] = np.roll(sheet["response"], 1)
    sheet.to_csv(files[1], index=False)
    assert judged(locked, files, tmp_path).scores_sha256 == first


def test_training_samples_are_found_by_id(locked, tmp_path):
    files = locked.folder / "expression.csv", locked.folder / "samples.csv"
    with pytest.raises(InputDataError, match="90 samples have ids"):
        judged(locked, files, tmp_path)


def test_training_people_are_found_under_new_sample_ids(locked, people, tmp_path):
    files = people()
    sheet = pd.read_csv(files[1])
    sheet.loc[3, "person"] = "P1-007"
    sheet.to_csv(files[1], index=False)
    with pytest.raises(InputDataError, match="1 samples have ids"):
        judged(locked, files, tmp_path, columns=SheetColumns(subject="person"))


def test_training_samples_are_found_by_values(locked, people, tmp_path):
    panel = LockedPanel.read(locked.panel).content
    assert len(panel.features) >= 3
    files = people()
    table = pd.read_csv(files[0], index_col=0)
    old = pd.read_csv(locked.folder / "expression.csv", index_col=0)
    table.iloc[4] = old.iloc[10].to_numpy()
    table.to_csv(files[0])
    with pytest.raises(
        InputDataError, match="measured values of training samples: S2-004"
    ):
        judged(locked, files, tmp_path)


def test_a_shift_is_found_with_outcome_held_equal(locked, people, tmp_path):
    found = judged(locked, people(n=200, shift=0.5), tmp_path)
    assert found.platform_shift == pytest.approx(0.5, abs=0.15)
    for each in found.shifts:
        assert each.shift_low <= 0.5 <= each.shift_high
    still = validate_panel(locked.panel, *people(seed=5, n=200), out=tmp_path / "still")
    assert abs(still.platform_shift) < 0.15


def test_a_lost_effect_is_found(locked, people, tmp_path):
    found = judged(locked, people(n=200, effect=0.0), tmp_path)
    assert found.figure("auc").low < 0.5 < found.figure("auc").high
    assert any("below the out-of-fold figure" in note for note in found.notes)
    for each in found.shifts:
        assert each.difference_high < each.difference_training
    inside = [each.difference_low < 0.0 < each.difference_high for each in found.shifts]
    assert sum(inside) >= len(inside) - 1  # of three 95 % intervals one may miss


def test_another_mix_is_named(locked, people, tmp_path):
    files = people(n=90)
    sheet = pd.read_csv(files[1])
    sheet = sheet[(sheet["response"] == "yes") | (sheet.index % 4 == 0)]
    sheet.to_csv(files[1], index=False)
    found = judged(locked, files, tmp_path)
    share = (sheet["response"] == "yes").mean()
    training = LockedPanel.read(locked.panel).content.training
    assert found.figure("prevalence-difference").value == pytest.approx(
        share - training.prevalence
    )
    assert 0.5 < found.figure("spread-ratio").value < 2.0
    shown = f"Cases are {100 * share:.0f} % here"
    assert any(shown in note for note in found.notes)
    assert any("times as wide" in note for note in found.notes)


@pytest.mark.parametrize(
    ("at_least", "verdict"), [(0.51, "pass"), (0.99, "fail"), (0.88, "inconclusive")]
)
def test_verdicts(locked, people, plan, tmp_path, at_least, verdict):
    found = judged(locked, people(n=120), tmp_path, plan=plan(at_least=at_least))
    area = found.figure("auc")
    assert found.verdict == verdict, (area.low, area.high)
    assert found.sentence.lower().startswith(verdict)
    assert found.plan_sha256


def test_too_few_people_are_inconclusive(locked, people, plan, tmp_path):
    found = judged(locked, people(), tmp_path, plan=plan(at_least=0.51, cases=41))
    assert found.verdict == "inconclusive"
    assert "40 cases" in found.sentence


def test_a_plan_for_another_panel_is_refused(locked, people, plan, tmp_path):
    with pytest.raises(PanelFileError, match="another panel file"):
        judged(locked, people(), tmp_path, plan=plan(panel="0" * 64))
    with pytest.raises(StudyFileError, match="no such cut-off"):
        judged(locked, people(), tmp_path, plan=plan(primary="sensitivity", cutoff="x"))
    with pytest.raises(StudyFileError, match="more"):
        judged(locked, people(), tmp_path, plan=plan(more=1))


def test_subgroups_say_how_small_they_are(locked, people, plan, tmp_path):
    files = people()
    sheet = pd.read_csv(files[1])
    sheet.loc[:5, "site"] = "east"
    sheet.to_csv(files[1], index=False)
    found = judged(locked, files, tmp_path, plan=plan(subgroups=["site"]))
    assert found.figure("auc", "site=east").note == "too small"
    assert found.figure("auc", "site=north").note == ""
    assert found.figure("auc", "site=east").samples == 6
    with pytest.raises(InputDataError, match="no column clinic"):
        judged(locked, files, tmp_path, columns=SheetColumns(subgroups=("clinic",)))


def test_a_panel_against_itself(locked, people, tmp_path):
    found = judged(locked, people(), tmp_path, against=locked.panel)
    name = LockedPanel.read(locked.panel).content.name
    assert found.figure("auc-difference", f"against {name}").value == 0.0
    assert found.figure("sensitivity-difference-p", f"against {name}").value == 1.0


def test_nobody_to_validate_on(locked, tmp_path):
    with pytest.raises(UsageError, match="who is to judge"):
        validate_panel(locked.panel, out=tmp_path / "out")


def test_rows_set_aside_are_opened_and_recorded(study_with, tmp_path):
    from panelkit import lock_panel, read_openings, run_study

    study = study_with(
        'openings = "openings.json"\n'
        'set_aside = { column = "site", values = ["south"] }'
    )
    run = run_study(study, tmp_path / "run", threads=1).path
    lock_panel(run, tmp_path / "p.json")
    found = validate_panel(
        tmp_path / "p.json", out=tmp_path / "out", study=study,
        open_set_aside="the panel is locked",
    )  # fmt: skip
    assert found.samples == 30
    assert found.openings == 1
    assert len(read_openings(study.parent / "openings.json")) == 1


@pytest.mark.parametrize("changed", ["intercept", "intercept and slope"])
def test_recalibration_names_its_parent_and_fits(locked, people, tmp_path, changed):
    files = people(n=200, shift=0.5)
    parent = LockedPanel.read(locked.panel).content
    found = recalibrate_panel(
        locked.panel, *files, tmp_path / "new.json", changed=changed
    )
    assert found.parent.sha256 == parent.content_sha256
    assert found.content_sha256 != parent.content_sha256
    assert "did not fit it" in found.parent.sentence
    assert LockedPanel.read(tmp_path / "new.json").content.parent == found.parent
    before = judged(locked, files, tmp_path)
    after = validate_panel(tmp_path / "new.json", *files, out=tmp_path / "after")
    assert abs(before.figure("calibration-in-the-large").value) > 0.2
    assert after.figure("calibration-in-the-large").value == pytest.approx(0, abs=1e-6)
    assert after.figure("auc").value == before.figure("auc").value
    if changed != "intercept":
        assert after.figure("calibration-slope").value == pytest.approx(1, abs=1e-6)
    else:
        assert found.markers == parent.markers
