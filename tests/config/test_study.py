"""Right study files, and what of them determines results."""

import json
import shutil

import pytest

from panelkit.config import read_platform_file, read_study
from panelkit.runtime import json_bytes


def test_committed_files_read(repository):
    """Every commented file under configs/ runs as it stands."""
    found = sorted((repository / "configs").glob("*.toml"))
    assert found
    for path in found:
        if "[cohort]" in path.read_text(encoding="utf-8"):
            study = read_study(path)
            assert study.file(study.cohort.expression).exists(), path.name
        else:
            assert read_platform_file(path), path.name


def test_files_of_committed_studies_are_there(repository):
    study = read_study(repository / "configs" / "quillmere.toml")
    named = [
        study.cohort.expression,
        study.cohort.samples,
        study.cohort.features,
        study.panels.prices,
        *study.panels.platforms,
    ]
    assert all(study.file(name).is_file() for name in named)
    assert set(study.platforms) == {"wells", "beads"}


def test_effective_has_no_path_and_stays_when_files_move(repository, tmp_path):
    """The study and all that it names, under other names and in another place."""
    origin = repository / "configs" / "quillmere.toml"
    here = read_study(origin)
    folder = tmp_path / "moved"
    folder.mkdir()
    text = origin.read_text(encoding="utf-8")
    assert "../sample_cohorts/quillmere/" in text
    for name in ("platform_wells.toml", "platform_beads.toml"):
        shutil.copy(repository / "sample_cohorts" / "quillmere" / name, folder)
    moved = folder / "renamed.toml"
    moved.write_text(text.replace("../sample_cohorts/quillmere/", ""))
    there = read_study(moved)
    assert there.effective() == here.effective()
    written = json_bytes(here.effective()).decode()
    for word in ("quillmere", ".csv", ".toml", "sample_cohorts", str(repository)):
        assert word not in written


def test_effective_shows_every_setting_that_was_not_written(study):
    tables = study().effective()
    assert tables["accuracy"]["folds"] == 5
    assert tables["shortlist"]["threshold"] == 0.75
    assert tables["preparation"]["log2_offset"] == 1.0
    assert tables["seed"] == 1


@pytest.mark.parametrize(
    "lines",
    [
        "[accuracy]\nfolds = 4",
        "[accuracy]\ninner_subsamples = 38",
        "[shortlist]\nthreshold = 0.76",
        '[shortlist]\nnever = ["F01"]',
        "[panels]\nsizes = [1, 2]",
        '[panels]\nmakers = ["univariate", "frequency"]',
        "[preparation]\nmax_missing_share = 0.4",
        '[preparation]\ndiscovery = ["filter"]',
        '[choice]\nprimary = { rule = "smallest-within-one-se" }',
        '[cohort.keep]\nlineage = ["B"]',
        '[cohort.accept]\noutcome-tied-to-batch = "why"',
    ],
)
def test_every_setting_that_changes_results_changes_the_record(study, lines):
    """Left out, it would let a run go on from the folds of another one."""
    assert json_bytes(study(f"{lines}\n").effective()) != json_bytes(
        study().effective()
    )


def test_texts_for_the_report_do_not(study):
    with_text = study('[statement]\nethics = "approved"\n')
    assert with_text.effective() == study().effective()


def test_effective_fills_in_the_defaults_of_prices(study):
    text = (
        '[panels]\nprices = "p.csv"\n'
        '[programme]\ncurrency = "EUR"\nsamples = 10\n{more}'
        "[platform.wells]\npositions = 96\n"
    )
    plain = study(text.format(more=""))
    written = study(text.format(more="horizon_months = 12\n"))
    assert plain.programme == written.programme
    assert plain.effective() == written.effective()


def test_amounts_keep_every_digit(study):
    """A binary float would make 0.1 + 0.2 out of money."""
    text = (
        '[panels]\nprices = "p.csv"\n'
        '[programme]\ncurrency = "EUR"\nsamples = 10\ncollection_cost = 0.30\n'
        "[platform.wells]\npositions = 96\nrun_cost = 1234567.89\n"
    )
    recorded = json.loads(json_bytes(study(text).effective()))
    assert recorded["programme"]["collection_cost"] == "0.30"
    assert recorded["platform"]["wells"]["run_cost"] == "1234567.89"


@pytest.mark.parametrize(
    ("written", "read"), [("1", "1"), ('"yes"', "yes"), ("0.50", "0.50")]
)
def test_classes_may_be_numbers(study, written, read):
    """The sample sheet is text: a class 1 there is "1" here."""
    assert study(f"positive = {written}\n").cohort.positive == read


def test_a_study_is_frozen(study):
    made = study()
    with pytest.raises(AttributeError):
        made.seed = 2
    with pytest.raises(ValueError, match="frozen"):
        made.accuracy.folds = 9


@pytest.mark.parametrize(
    ("keys", "design", "code"),
    [
        ("", 'kind = "matched"', "matched-without-sets"),
        ('matched_set = "pair"\n', "", "sets-without-matched"),
        ('matched_set = "pair"\n', 'kind = "case-control"', "sets-without-matched"),
        ('time = "t"\nevent = "e"\n', "prevalence = 0.1", "design-needs-two-classes"),
        ('kind = "number"\n', 'kind = "case-control"', "design-needs-two-classes"),
        ("", "prevalence = 1.5", "value-refused"),
        ("", 'kind = "cross-over"', "value-refused"),
    ],
)
def test_designs_that_contradict_the_columns(refused, keys, design, code):
    assert refused(f"{keys}[design]\n{design}\n").code == code


def test_the_design_is_among_what_determines_results(study):
    made = study('[design]\nkind = "case-control"\nprevalence = 0.02\n')
    assert made.effective()["design"] == {"kind": "case-control", "prevalence": 0.02}
    assert study().effective()["design"] == {"kind": "cohort", "prevalence": None}


def test_folds_are_given_or_drawn(refused, study):
    text = 'folds = "part"\n[accuracy]\n{}\n'
    assert refused(text.format("folds = 5")).code == "folds-twice"
    assert refused(text.format("repeats = 1")).code == "folds-twice"
    assert study(text.format("inner_folds = 3")).cohort.folds == "part"


def test_file_names_do_not_determine_results(study):
    one = study('assays = "a.csv"\nopenings = "o.jsonl"\n').effective()
    assert one == study().effective()


def test_dates_of_the_study_file_reach_the_record(study):
    made = study('set_aside = { column = "seen", from = 2019-06-30 }\n')
    assert made.effective()["cohort"]["set_aside"] == {
        "column": "seen",
        "from": "2019-06-30",
    }
