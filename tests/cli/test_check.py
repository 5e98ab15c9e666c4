"""`panelkit check`: findings for people and for programs."""

import numpy as np
import pytest


def tie(files):
    """Each class on a plate of its own: results would mislead."""
    files.change("[shortlist]", 'batch = "plate"\n[shortlist]')
    return files.write()


def test_shows_findings_and_flow(panelkit, files):
    answer = panelkit("check", files.write())
    assert answer.code == 0
    assert answer.err == ""
    assert "class-sizes" in answer.out
    assert "participant flow" in answer.out
    assert "40 samples of 40 subjects, 60 features" in answer.out


def test_json_parses(panelkit, files, read_json):
    answer = panelkit("check", files.write(), "--json")
    assert answer.code == 0
    content = read_json(answer.out)
    parts = {"code", "severity", "where", "message", "next_step"}
    assert all(set(item) == parts for item in content["findings"])
    assert {row["outcome_class"]: row["analysed"] for row in content["flow"]} == {
        "yes": 20,
        "no": 20,
        "": 0,
    }


def test_quiet_prints_nothing(panelkit, files):
    answer = panelkit("check", files.write(), "--quiet")
    assert (answer.code, answer.out, answer.err) == (0, "", "")


def test_a_stop_is_shown_and_is_exit_code_three(panelkit, files):
    answer = panelkit("check", tie(files))
    assert answer.code == 3
    assert "outcome-tied-to-batch" in answer.out
    assert "stop-found" in answer.sentence


def test_a_stop_leaves_the_json_whole(panelkit, files, read_json):
    answer = panelkit("check", tie(files), "--json")
    assert answer.code == 3
    severities = {i["code"]: i["severity"] for i in read_json(answer.out)["findings"]}
    assert severities["outcome-tied-to-batch"] == "stop"


def test_an_accepted_stop_is_a_warning_with_its_reason(panelkit, files, read_json):
    tie(files)
    reason = 'accept = { "outcome-tied-to-batch" = "one run" }'
    files.change("[shortlist]", f"{reason}\n[shortlist]")
    answer = panelkit("check", files.write(), "--json")
    assert answer.code == 0
    found = {item["code"]: item for item in read_json(answer.out)["findings"]}
    assert found["outcome-tied-to-batch"]["severity"] == "warning"
    assert "one run" in found["outcome-tied-to-batch"]["message"]


@pytest.mark.parametrize(
    ("entry", "why"),
    [
        ('"outcome-tied-to-bach" = "one run"', "no `stop` finding"),
        ('"class-sizes" = "they are what they are"', "no `stop` finding"),
        ('"outcome-tied-to-batch" = " "', "gives no reason"),
        ('"subject-in-both-classes" = "relapse"', "can't be accepted"),
    ],
)
def test_an_acceptance_that_changes_nothing_is_said(
    panelkit, files, read_json, entry, why
):
    tie(files)
    files.change("[shortlist]", f"accept = {{ {entry} }}\n[shortlist]")
    answer = panelkit("check", files.write(), "--json")
    assert answer.code == 3
    found = {item["code"]: item for item in read_json(answer.out)["findings"]}
    assert found["outcome-tied-to-batch"]["severity"] == "stop"
    assert why in found["acceptance-without-effect"]["message"]


def test_nothing_that_could_be_a_marker_is_foreseen(panelkit, files, read_json):
    """Forty features do not vary, the study bars the rest."""
    files.expression.iloc[:, :40] = 3.0
    barred = ", ".join(f'"{name}"' for name in files.expression.columns[40:])
    files.change("candidates = 8", f"candidates = 8\nnever = [{barred}]")
    files.change("[shortlist]", 'accept = { "no-usable-feature" = "so" }\n[shortlist]')
    answer = panelkit("check", files.write(), "--json")
    assert answer.code == 3
    found = {item["code"]: item for item in read_json(answer.out)["findings"]}
    assert found["no-usable-feature"]["severity"] == "stop"  # no reason can mend it
    assert "20 may not enter a panel" in found["no-usable-feature"]["message"]
    assert "40 have a single value" in found["no-usable-feature"]["message"]
    refused = panelkit("run", files.path, "--out", files.folder / "out")
    assert refused.code == 3
    assert "no-usable-feature" in refused.sentence


def test_every_feature_barred_is_foreseen(panelkit, files, read_json):
    barred = ", ".join(f'"{name}"' for name in files.expression.columns)
    files.change("candidates = 8", f"candidates = 8\nnever = [{barred}]")
    answer = panelkit("check", files.write(), "--json")
    assert answer.code == 3
    codes = [item["code"] for item in read_json(answer.out)["findings"]]
    assert codes[0] == "no-usable-feature"


def test_an_absurd_cell_stops_and_can_be_accepted(panelkit, files, read_json):
    files.expression.iloc[3, 5] = -999.0
    answer = panelkit("check", files.write())
    assert answer.code == 3
    assert "feature 'F05', sample 'S03': -999" in answer.out
    files.change("[shortlist]", 'accept = { "value-absurd" = "known" }\n[shortlist]')
    assert panelkit("check", files.write(), "--quiet").code == 0


def test_what_stops_is_printed_first(panelkit, files):
    files.expression.iloc[3, 5] = np.nan
    shown = [
        line.split()[0]
        for line in panelkit("check", tie(files)).out.splitlines()
        if line.strip().startswith(("stop ", "warning ", "info "))
    ]
    assert shown[0] == "stop"
    assert shown == sorted(shown, key=["stop", "warning", "info"].index)


def test_quiet_leaves_a_stop_to_the_exit_code(panelkit, files):
    answer = panelkit("check", tie(files), "--quiet")
    assert (answer.code, answer.out, answer.err) == (3, "", "")


def test_markup_in_the_data_is_shown_as_it_is(panelkit, files):
    """Square brackets are markup of the table's library; unescaped they vanish."""
    files.change('positive = "yes"', 'positive = "[bold]yes[/bold]"')
    files.samples["response"] = files.samples["response"].replace(
        "yes", "[bold]yes[/bold]"
    )
    answer = panelkit("check", files.write())
    assert answer.code == 0
    assert "[bold]yes[/bold]" in answer.out


def test_writes_no_file(panelkit, files):
    path = files.write()
    before = sorted(files.folder.iterdir())
    panelkit("check", path)
    assert sorted(files.folder.iterdir()) == before
