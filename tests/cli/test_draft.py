"""`panelkit draft`: a study file that reads, checks and runs as it is."""

import tomllib

import pytest

from panelkit.config import read_study


def drafted(panelkit, files, *more):
    files.write()
    out = files.folder / "drafted.toml"
    arguments = (files.folder / "expression.csv", files.folder / "samples.csv")
    return panelkit("draft", *arguments, "--out", out, *more), out


def test_a_drafted_study_runs_untouched(panelkit, files):
    """Every default, so a small cohort: twelve features are enough."""
    files.expression = files.expression.iloc[:, :12]
    files.samples = files.samples.drop(columns="plate")
    answer, out = drafted(panelkit, files)
    assert answer.code == 0
    assert panelkit("check", out, "--quiet").code == 0
    run = panelkit("run", out, "--out", files.folder / "out", "--json")
    assert run.code == 0
    assert (files.folder / "out" / "report.html").exists()


def test_it_proposes_what_the_columns_say(panelkit, files):
    files.samples["person"] = files.samples["sample_id"]
    files.samples["age"] = "50"
    _answer, out = drafted(panelkit, files)
    cohort = read_study(out).cohort
    assert cohort.outcome == "response"
    assert (cohort.positive, cohort.negative) == ("yes", "no")
    assert (cohort.subject, cohort.batch) == ("person", "plate")
    assert cohort.covariates == ("age",)
    assert read_study(out).choice.primary is not None


def test_paths_are_relative_to_the_study(panelkit, files):
    _answer, out = drafted(panelkit, files)
    cohort = tomllib.loads(out.read_text())["cohort"]
    assert cohort["expression"] == "expression.csv"
    assert cohort["samples"] == "samples.csv"
    assert str(files.folder) not in out.read_text()


def test_without_a_file_it_is_printed(panelkit, files):
    files.write()
    answer = panelkit(
        "draft", files.folder / "expression.csv", files.folder / "samples.csv"
    )
    assert answer.code == 0
    assert tomllib.loads(answer.out)["cohort"]["outcome"] == "response"


def test_names_that_need_quoting_survive(panelkit, files):
    """Quotes, backslashes and letters of other alphabets in a class and a column."""
    odd = 'antwort "6\\m" \u00fc\u4e2d'
    files.samples = files.samples.drop(columns="plate")
    files.samples = files.samples.rename(columns={"response": odd})
    files.samples[odd] = files.samples[odd].replace("yes", 'ja "\\t"')
    _answer, out = drafted(panelkit, files)
    cohort = read_study(out).cohort
    assert cohort.outcome == odd
    assert {cohort.positive, cohort.negative} == {'ja "\\t"', "no"}
    assert panelkit("check", out, "--quiet").code == 0


def test_it_never_writes_over_a_file(panelkit, files):
    (files.folder / "drafted.toml").write_text("mine")
    answer, out = drafted(panelkit, files)
    assert answer.code == 2
    assert "there already" in answer.sentence
    assert out.read_text() == "mine"


def test_no_outcome_in_sight(panelkit, files):
    """Every column has one value or forty."""
    files.samples = files.samples.drop(columns=["response", "plate"])
    files.samples["age"] = [str(20 + number) for number in range(40)]
    answer, out = drafted(panelkit, files)
    assert answer.code == 3
    assert "no column looks like an outcome" in answer.sentence
    assert not out.exists()


@pytest.mark.parametrize("missing", ["expression.csv", "samples.csv"])
def test_missing_file(panelkit, files, missing):
    files.write()
    (files.folder / missing).unlink()
    answer = panelkit(
        "draft", files.folder / "expression.csv", files.folder / "samples.csv"
    )
    assert answer.code == 3
    assert missing in answer.sentence
    assert answer.out == ""
