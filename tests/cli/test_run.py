"""`panelkit run`: the run folder, what is shown, and exit codes."""

import pandas as pd
import pytest

COLUMNS = {
    "findings.csv": "code severity where message next_step",
    "flow.csv": "received matched with_outcome kept analysed",
    "dropped.csv": "kind id stage reason",
    "shortlist.csv": "feature frequency frequency_low frequency_high sign sign_share "
    "group group_frequency picked candidate mean_level difference difference_low "
    "difference_high single_marker_auc missing_share",
    "folds.csv": "sample subject repeat fold",
    "predictions.csv": "sample repeat fold maker size score outcome",
    "fold_panels.csv": "repeat fold maker size markers cost_total",
    "frontier.csv": "panel maker size markers metric_of metric metric_low metric_high "
    "metric_se_naive metric_se_corrected slope cost_total cost_per_result on_frontier "
    "chosen_by",
    "comparators.csv": "name size metric metric_low metric_high",
}
OTHERS = ["record.json", "timings.json", "run.log", "choice.json", "report.html"]


def test_run_folder_has_every_file(run_folder):
    names = {path.name for path in run_folder.iterdir()}
    assert {*COLUMNS, *OTHERS, "figures", "tables"} <= names
    assert all((run_folder / name).stat().st_size for name in {*COLUMNS, *OTHERS})
    left = [path for path in run_folder.rglob("*") if path.name.startswith(".")]
    assert left == []


@pytest.mark.parametrize("name", COLUMNS)
def test_tables_have_their_columns(run_folder, name):
    table = pd.read_csv(run_folder / name)
    assert set(COLUMNS[name].split()) <= set(table.columns)
    if name != "dropped.csv":
        assert len(table)


def test_every_figure_has_its_numbers(run_folder):
    figures = {path.stem for path in (run_folder / "figures").glob("*.svg")}
    tables = {path.stem for path in (run_folder / "tables").glob("*.csv")}
    assert figures
    assert figures <= tables


def test_report_and_choice_say_the_same(run_folder, read_json):
    choice = read_json((run_folder / "choice.json").read_text())
    report = (run_folder / "report.html").read_text()
    assert f"{choice['headline']['metric']:.3f}" in report
    assert "For research and planning only" in report


def test_record_is_of_this_format(run_folder, read_json):
    record = read_json((run_folder / "record.json").read_text())
    assert record["format"] == 1
    assert set(record["inputs"]) == {"expression", "samples", "prices"}
    assert all(len(digest) == 64 for digest in record["inputs"].values())
    assert record["study"]["seed"] == 4


def test_times_are_kept_apart(run_folder, read_json):
    """A clock in the record would make every run another run."""
    timings = read_json((run_folder / "timings.json").read_text())
    assert {"started", "seconds", "total"} <= set(timings)
    assert "started" not in (run_folder / "record.json").read_text()


def test_shown_table_and_sentence(panelkit, files):
    answer = panelkit("run", files.write(), "--out", files.folder / "out")
    assert answer.code == 0
    assert "markers" in answer.out or "size" in answer.out
    assert "Exploratory" in answer.out  # no primary rule is declared
    assert "For research and planning only" in answer.out
    assert "accuracy: done" in answer.err  # progress is no part of the result


def test_json_is_one_document(panelkit, files, read_json):
    out = files.folder / "out"
    answer = panelkit("run", files.write(), "--out", out, "--json")
    assert answer.code == 0
    content = read_json(answer.out)
    kept = read_json((out / "choice.json").read_text())
    assert content["headline"] == kept["headline"]
    assert content["rules"] == kept["rules"]
    assert len(content["frontier"]) == 6
    assert (content["samples"], content["features"]) == (40, 60)


def test_json_without_an_interval_is_json(panelkit, files, read_json):
    """Classes ten units apart: area 1 has no interval, and NaN is no JSON."""
    shift = 10.0 * (files.samples["response"] == "yes").to_numpy()
    files.expression["F00"] += shift
    answer = panelkit("run", files.write(), "--out", files.folder / "out", "--json")
    assert answer.code == 0
    headline = read_json(answer.out)["headline"]
    assert headline["metric"] == 1.0
    assert headline["metric_low"] is None
    read_json((files.folder / "out" / "choice.json").read_text())


def test_quiet_prints_nothing(panelkit, files):
    answer = panelkit("run", files.write(), "--out", files.folder / "out", "--quiet")
    assert (answer.code, answer.out, answer.err) == (0, "", "")


def test_again_is_the_same_run(panelkit, files):
    arguments = ("run", files.write(), "--out", files.folder / "out", "--json")
    first, second = panelkit(*arguments), panelkit(*arguments)
    assert first.code == second.code == 0
    assert first.out == second.out


def test_occupied_folder(panelkit, files):
    out = files.folder / "out"
    out.mkdir()
    (out / "thesis.txt").write_text("mine")
    answer = panelkit("run", files.write(), "--out", out)
    assert answer.code == 7
    assert "not empty" in answer.sentence
    assert [path.name for path in out.iterdir()] == ["thesis.txt"]


def test_another_seed(panelkit, files):
    out = files.folder / "out"
    assert panelkit("run", files.write(), "--out", out).code == 0
    files.change("seed = 4", "seed = 5")
    answer = panelkit("run", files.write(), "--out", out)
    assert answer.code == 7
    assert "another study" in answer.sentence


@pytest.mark.parametrize("threads", ["0", "-3", "two"])
def test_wrong_number_of_threads(panelkit, files, threads):
    answer = panelkit(
        "run", files.write(), "--out", files.folder / "out", "--threads", threads
    )
    assert answer.code == 2
    assert "--threads" in answer.err
    assert not (files.folder / "out").exists()


def test_too_few_people_for_the_folds(panelkit, files):
    files.change("folds = 2\nrepeats", "folds = 25\nrepeats")
    answer = panelkit("run", files.write(), "--out", files.folder / "out")
    assert answer.code == 4
    assert "25 folds for 20 subjects" in answer.sentence
