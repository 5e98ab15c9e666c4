"""What a study bars, forces and accepts is kept to, and said."""

import json

import numpy as np
import pandas as pd
import pytest

from panelkit import check_study, lock_panel, run_study
from panelkit.errors import InputDataError, NoPanelError, StudyFileError, UsageError

BARRED = {
    "F58": "its role is control",
    "F59": "its role is control",
    "F57": "named under [shortlist] never",
}


def panels_of(finished):
    tables = [finished.table("frontier.csv"), finished.table("fold_panels.csv")]
    rows = [row for table in tables for row in table["markers"]]
    return {name for row in rows for name in row.split(";")}


def test_controls_and_never_enter_no_panel(finished):
    """They separate the classes by three units, twice as far as any marker."""
    assert panels_of(finished) & set(BARRED) == set()
    assert "F00" in panels_of(finished)
    assert set(finished.table("shortlist.csv")["feature"]) & set(BARRED) == set()


def test_without_the_bar_they_would_be_chosen(tiny, tmp_path):
    """The test above can fail: a barred feature that may be used is used."""
    tiny.sections["shortlist"]["never"] = []
    tiny.sections["accuracy"].update(repeats=1)
    run_study(tiny.write(), tmp_path / "out", threads=1)
    text = (tmp_path / "out" / "frontier.csv").read_text()
    assert "F57" in text
    assert "F58" not in text


def test_what_is_barred_is_said_with_its_reason(finished):
    dropped = finished.table("dropped.csv").set_index("id")
    for name, reason in BARRED.items():
        assert dropped.loc[name, "reason"] == reason
        assert dropped.loc[name, "kind"] == "feature"


def test_always_is_a_candidate_whatever_happens(finished):
    """The feature is noise: by frequency or difference it is not among eight."""
    table = finished.table("shortlist.csv").set_index("feature")
    assert table.loc["F56", "candidate"]
    assert table["candidate"].sum() < 60


@pytest.mark.parametrize("name", ["F57", "F58"])
def test_always_does_not_lift_a_bar(tiny, tmp_path, name):
    tiny.sections["shortlist"]["always"] = [name]
    with pytest.raises((InputDataError, StudyFileError)) as refused:
        run_study(tiny.write(), tmp_path / "out", threads=1)
    assert refused.value.code in ("always-barred", "always-and-never")
    assert name in str(refused.value)
    assert not (tmp_path / "out").exists()


def confounded(tiny):
    """Each class on a plate of its own."""
    tiny.samples["plate"] = tiny.samples["response"]
    tiny.sections["cohort"]["batch"] = "plate"
    tiny.sections["accuracy"].update(repeats=1)
    return tiny


def test_a_stop_refuses_the_run(tiny, tmp_path):
    with pytest.raises(InputDataError) as refused:
        run_study(confounded(tiny).write(), tmp_path / "out", threads=1)
    assert refused.value.code == "outcome-tied-to-batch"
    assert refused.value.exit_code == 3
    assert 'accept = { "outcome-tied-to-batch" = ' in refused.value.next_step
    assert not (tmp_path / "out").exists()


def test_a_written_reason_lets_it_run_and_is_shown(tiny, tmp_path):
    reason = "the plates were measured in one run"
    confounded(tiny).sections["cohort"]["accept"] = {"outcome-tied-to-batch": reason}
    path = tiny.write()
    found = check_study(path).findings
    assert found.of("stop") == ()
    run_study(path, tmp_path / "out", threads=1)
    for name in ("findings.csv", "report.html", "record.json"):
        assert reason in (tmp_path / "out" / name).read_text(), name
    assert "warning" in next(
        line
        for line in (tmp_path / "out" / "findings.csv").read_text().splitlines()
        if line.startswith("outcome-tied-to-batch")
    )


@pytest.mark.parametrize("accept", [{"outcome-tied-to-batch": ""}, {"other": "why"}])
def test_no_reason_or_another_code_is_not_enough(tiny, tmp_path, accept):
    confounded(tiny).sections["cohort"]["accept"] = accept
    with pytest.raises(InputDataError):
        run_study(tiny.write(), tmp_path / "out", threads=1)


@pytest.mark.parametrize("value", [5.0, np.nan])
def test_a_matrix_without_information_is_refused(tiny, tmp_path, value):
    """Constant or empty everywhere: a sentence is due, not a traceback."""
    tiny.expression.iloc[:, :] = value
    with pytest.raises(InputDataError):
        run_study(tiny.write(), tmp_path / "out", threads=1)


def test_a_demand_that_nothing_meets_ends_with_the_nearest_miss(tiny, tmp_path):
    tiny.sections["accuracy"].update(repeats=1, learning_curve=False)
    tiny.sections["panels"]["sizes"] = [1, 2]
    tiny.sections["choice"] = {
        "primary": {"rule": "cheapest-above-accuracy", "required_accuracy": 0.9999}
    }
    out = tmp_path / "out"
    with pytest.raises(NoPanelError) as missed:
        run_study(tiny.write(), out, threads=1)
    assert missed.value.exit_code == 5
    assert "No panel meets the demand: the cheapest panel" in str(missed.value)
    first = json.loads((out / "choice.json").read_text())["rules"][0]
    assert first["panel"] == ""
    assert "nearest miss has" in first["sentence"]
    assert (out / "report.html").exists()
    with pytest.raises(UsageError, match="no panel met the rule's demand"):
        lock_panel(out, tmp_path / "panel.json")


def test_each_site_is_left_out_in_turn(tiny, tmp_path):
    clinics = ["North", "South", "West"]
    tiny.samples["clinic"] = [clinics[k % 30 % 3] for k in range(40)]
    tiny.sections["cohort"]["site"] = "clinic"
    tiny.sections["accuracy"] = {
        "leave_out": "site",
        "inner_folds": 2,
        "inner_subsamples": 4,
        "learning_curve": False,
    }
    tiny.sections["panels"]["sizes"] = [1, 2]
    run = run_study(tiny.write(), tmp_path / "out", threads=1)
    folds = pd.read_csv(tmp_path / "out" / "folds.csv")
    sheet = tiny.samples.set_index(tiny.samples.columns[0])["clinic"]
    pairs = {(sheet[row.sample], row.fold) for row in folds.itertuples()}
    assert len(pairs) == 3
    assert "each a site" in run.summary.scheme


def test_the_users_own_list_is_cut_in_its_order(tiny, tmp_path):
    tiny.sections["panels"].update(makers=["own"], own=["F20", "F03", "F11"])
    tiny.sections["panels"]["sizes"] = [1, 2]
    tiny.sections["accuracy"].update(repeats=1, learning_curve=False)
    run_study(tiny.write(), tmp_path / "out", threads=1)
    table = pd.read_csv(tmp_path / "out" / "frontier.csv")
    assert table["markers"].tolist() == ["F20", "F20;F03"]
    tiny.sections["panels"]["own"] = ["F58"]
    with pytest.raises(InputDataError, match="F58 may not enter a panel"):
        run_study(tiny.write(), tmp_path / "other", threads=1)


def test_price_weighted_panels_are_cheaper_and_tied_to_their_prices(tiny, tmp_path):
    tiny.sections["panels"].update(makers=["frequency", "price-weighted"], sizes=[2, 3])
    tiny.sections["accuracy"].update(repeats=1, learning_curve=False)
    run_study(tiny.write(), tmp_path / "out", threads=1)
    table = pd.read_csv(tmp_path / "out" / "frontier.csv").set_index("panel")
    assert (
        table.loc["price-weighted-3", "cost_total"]
        <= table.loc["frequency-3", "cost_total"]
    )


def test_a_rule_that_nobody_meets_has_no_panel_but_a_sentence(tiny, tmp_path):
    """Its row is empty in choice.json; the page names the nearest miss."""
    tiny.sections["choice"]["required_accuracy"] = 0.9999
    tiny.sections["cohort"]["nuisance"] = ["plate"]
    tiny.sections["accuracy"].update(repeats=1)
    out = run_study(tiny.write(), tmp_path / "out", threads=1).path
    rules = json.loads((out / "choice.json").read_text())["rules"]
    missed = next(r for r in rules if r["rule"].startswith("cheapest-above"))
    assert (missed["panel"], missed["markers"], missed["platform"]) == ("", [], "")
    assert missed["cost_total"] is missed["cost_per_result"] is None
    assert "The nearest miss has" in missed["sentence"]
    page = (out / "report.html").read_text()
    assert "nobody meets it" in page
    assert missed["sentence"] in page
    handling = pd.read_csv(out / "handling.csv")
    assert set(handling["group"]) == {"no", "yes"}
