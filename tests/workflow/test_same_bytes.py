"""A run gives the same bytes whatever the threads, the folder and the interruptions."""

import csv
import json
import shutil

import pytest

from panelkit import run_study
from panelkit.costing import Procedure
from panelkit.errors import InputDataError, RunFolderError, StudyFileError


@pytest.mark.parametrize("threads", [2, 4])
def test_threads_change_no_byte(study, finished, contents, tmp_path, threads):
    """Six folds over two or four threads end in another order than on one."""
    run_study(study, tmp_path / "out", threads=threads)
    expected, got = contents(finished.path), contents(tmp_path / "out")
    assert list(got) == list(expected)
    assert [name for name in got if got[name] != expected[name]] == []


def test_another_place_on_disk_changes_no_byte(study, finished, contents, tmp_path):
    """A path written into a record or a finding would differ here."""
    moved = shutil.copytree(study.parent, tmp_path / "elsewhere" / "deeper")
    run_study(moved / study.name, tmp_path / "out", threads=1)
    assert contents(tmp_path / "out") == contents(finished.path)


def test_no_result_names_a_folder_of_the_machine(study, finished, contents):
    """Neither the study's folder nor the run's may be handed on with the results."""
    for name, content in contents(finished.path).items():
        assert str(study.parent).encode() not in content, name
        assert str(finished.path.parent).encode() not in content, name


class Interruption(BaseException):
    """What a user's Ctrl-C does to a run."""


def test_an_interrupted_run_goes_on_where_it_stopped(
    study, finished, contents, tmp_path, monkeypatch
):
    """Folds finished before the interruption are not learnt again."""
    learn, learnt = Procedure.learn, []

    def stopping(self, data, split, threads=1):
        if len(learnt) == 2:
            raise Interruption
        learnt.append(split)
        return learn(self, data, split, threads)

    monkeypatch.setattr(Procedure, "learn", stopping)
    out = tmp_path / "out"
    with pytest.raises(Interruption):
        run_study(study, out, threads=1)
    assert len(list((out / "blocks").glob("accuracy-*"))) == 2
    assert not (out / "frontier.csv").exists()

    again = []

    def counting(self, data, split, threads=1):
        again.append(split)
        return learn(self, data, split, threads)

    monkeypatch.setattr(Procedure, "learn", counting)
    run_study(study, out, threads=1)
    assert len(again) == 4 + 3  # and the learning curve at four fifths
    assert contents(out) == contents(finished.path)


def test_a_second_run_into_the_same_folder_learns_no_fold(
    study, finished, copy_of_run, contents, monkeypatch
):
    def refuse(*_arguments, **_named):
        raise AssertionError("a remembered fold was learnt again")

    monkeypatch.setattr(Procedure, "learn", refuse)
    told = []
    run_study(study, copy_of_run, threads=2, listener=told.append)
    accuracy = [event for event in told if event.stage == "accuracy" and event.done]
    assert len(accuracy) == 6
    assert all(event.remembered for event in accuracy)
    assert contents(copy_of_run) == contents(finished.path)
    assert json.loads((copy_of_run / "timings.json").read_text())["resumed"] is True


@pytest.mark.parametrize("damage", ["empty", "half", "junk"])
def test_a_damaged_block_is_learnt_again(
    study, finished, copy_of_run, contents, damage
):
    """Trusting what is left of it would give other numbers, or a traceback."""
    block = sorted((copy_of_run / "blocks").iterdir())[0]
    whole = block.read_bytes()
    block.write_bytes(
        {"empty": b"", "half": whole[: len(whole) // 2], "junk": b"PK" * 300}[damage]
    )
    told = []
    run_study(study, copy_of_run, threads=1, listener=told.append)
    done = [event for event in told if event.stage == "accuracy" and event.done]
    assert sum(not event.remembered for event in done) == 1
    assert contents(copy_of_run) == contents(finished.path)


def test_another_seed_into_the_same_folder_is_refused(tiny, copy_of_run, contents):
    before = contents(copy_of_run)
    tiny.seed += 1
    with pytest.raises(RunFolderError) as refused:
        run_study(tiny.write(), copy_of_run, threads=1)
    assert refused.value.code == "run-folder-taken"
    assert refused.value.exit_code == 7
    assert contents(copy_of_run) == before


def test_another_value_in_the_matrix_is_refused(tiny, copy_of_run):
    """One cell in the last digit: the settings are equal, the data are not."""
    tiny.expression.iloc[0, 0] += 0.0001
    with pytest.raises(RunFolderError):
        run_study(tiny.write(), copy_of_run, threads=1)


def test_another_seed_gives_other_folds(tiny, finished, tmp_path):
    """Else the seed would decide nothing and the tests above would be empty."""
    tiny.seed += 1
    run_study(tiny.write(), tmp_path / "out", threads=1)
    other = (tmp_path / "out" / "folds.csv").read_bytes()
    assert other != (finished.path / "folds.csv").read_bytes()


@pytest.mark.parametrize("what", ["file", "full folder"])
def test_an_occupied_place_is_refused(study, tmp_path, what):
    out = tmp_path / "out"
    if what == "file":
        out.write_text("mine")
    else:
        out.mkdir()
        (out / "thesis.txt").write_text("mine")
    with pytest.raises(RunFolderError) as refused:
        run_study(study, out, threads=1)
    assert refused.value.exit_code == 7
    kept = out if what == "file" else out / "thesis.txt"
    assert kept.read_text() == "mine"


MISTAKES = {
    "maker": ("panels", "makers", ["frequncy"]),
    "step": ("preparation", "discovery", ["log3"]),
    "always": ("shortlist", "always", ["no such feature"]),
    "sizes": ("panels", "sizes", [200]),
}


@pytest.mark.parametrize("mistake", MISTAKES)
def test_a_mistake_in_the_study_is_refused(tiny, tmp_path, mistake):
    section, key, value = MISTAKES[mistake]
    tiny.sections[section][key] = value
    with pytest.raises((StudyFileError, InputDataError)):
        run_study(tiny.write(), tmp_path / "out", threads=1)


@pytest.mark.parametrize("mistake", MISTAKES)
def test_a_mistake_in_the_study_claims_no_folder(tiny, tmp_path, mistake):
    section, key, value = MISTAKES[mistake]
    tiny.sections[section][key] = value
    with pytest.raises((StudyFileError, InputDataError)):
        run_study(tiny.write(), tmp_path / "out", threads=1)
    assert not (tmp_path / "out").exists()


def test_what_changes_a_result_is_in_the_record(tiny, tmp_path):
    """Two platforms at one price: their order decides the column `platform`."""
    tiny.sections["accuracy"].update(repeats=1)
    path = tiny.write()
    pools, prices = path.parent / "pools.toml", path.parent / "prices.csv"
    pools.write_text(pools.read_text().replace("plex = 8", "plex = 1"))
    prices.write_text(prices.read_text().replace("300,1.20", "100,2.50"))
    records, named = [], []
    for first, second in (("wells", "pools"), ("pools", "wells")):
        old = 'platforms = ["wells.toml", "pools.toml"]'
        new = f'platforms = ["{first}.toml", "{second}.toml"]'
        other = path.with_name(f"{first}-first.toml")
        other.write_text(path.read_text().replace(old, new))
        out = run_study(other, tmp_path / first, threads=1).path
        records.append((out / "record.json").read_bytes())
        with (out / "frontier.csv").open() as file:
            named.append([row["platform"] for row in csv.DictReader(file)])
    assert (records[0] == records[1]) == (named[0] == named[1])
