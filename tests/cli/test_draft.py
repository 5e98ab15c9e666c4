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


def test_an_event_is_no_binary_outcome_beside_its_time(panelkit, files):
    """Who was followed for a month and who for years are not one class."""
    files.samples["os_event"] = [0, 1] * 20
    files.samples["os_days"] = range(100, 140)
    _answer, out = drafted(panelkit, files)
    cohort = read_study(out).cohort
    assert (cohort.outcome, cohort.time) == ("response", None)
    text = out.read_text()
    assert '# time = "os_days"' in text
    assert '# event = "os_event"' in text
    assert "1 means event, 0 censored" in text
    files.samples = files.samples.drop(columns="response")
    out.unlink()
    _answer, out = drafted(panelkit, files)
    cohort = read_study(out).cohort
    assert (cohort.outcome, cohort.time, cohort.event) == (None, "os_days", "os_event")
    assert cohort.time_unit == "days"
    assert panelkit("check", out, "--quiet").code == 0


def test_codes_in_words_are_named(panelkit, files):
    files.samples["vital_status"] = ["alive", "dead"] * 20
    files.samples["months"] = range(1, 41)
    files.samples = files.samples.drop(columns=["response", "plate"])
    _answer, out = drafted(panelkit, files)
    cohort = read_study(out).cohort
    assert (cohort.event_value, cohort.censored_value) == ("dead", "alive")
    assert panelkit("check", out, "--quiet").code == 0


def test_people_with_both_classes_are_matched_sets(panelkit, files):
    files.samples["patient"] = [f"P{number // 2}" for number in range(40)]
    files.samples = files.samples.drop(columns="plate")
    _answer, out = drafted(panelkit, files)
    study = read_study(out)
    assert (study.cohort.subject, study.cohort.matched_set) == (None, "patient")
    assert study.design.kind == "matched"
    assert panelkit("check", out, "--quiet").code == 0


def test_what_could_be_meant_is_a_comment(panelkit, files):
    files.samples["pair_id"] = [f"P{number // 4}" for number in range(40)]
    files.samples["year"] = [2018 + number // 10 for number in range(40)]
    files.samples["run_order"] = range(40)
    _answer, out = drafted(panelkit, files)
    text = out.read_text()
    assert '# matched_set = "pair_id"' in text
    assert '# kind = "matched"' in text
    assert '# run_order = "run_order"' in text
    assert '# set_aside = { "column" = "year", "from" = 2021 }' in text
    assert read_study(out).cohort.set_aside == {}


def test_sheets_beside_the_matrix_are_proposed(panelkit, files):
    files.samples = files.samples.drop(columns="plate")
    sheet = "feature,symbol\n" + "".join(f"F{k:02d},G{k}\n" for k in range(60))
    (files.folder / "features.csv").write_text(sheet)
    _answer, out = drafted(panelkit, files)
    assert read_study(out).cohort.features == "features.csv"
    assert panelkit("check", out, "--quiet").code == 0
