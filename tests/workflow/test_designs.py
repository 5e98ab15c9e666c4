"""Outcomes that are only checked, rows set aside, the user's folds, matched sets."""

import json

import numpy as np
import pandas as pd
import pytest

from panelkit import check_study, open_set_aside, read_openings, run_study
from panelkit.errors import InputDataError, StudyFileError, UsageError

INPUT_HASHES = "input hashes"


@pytest.fixture
def quick(tiny):
    """One repeat is enough here, and every size of panel twice as many as needed."""
    tiny.sections["accuracy"].update(repeats=1)
    tiny.sections["panels"]["sizes"] = [1, 2]
    return tiny


def number(tiny):
    tiny.samples["level"] = np.linspace(1.0, 9.0, 40)
    return {"outcome": "level", "kind": "number", "unit": "mg/l"}


def classes(tiny):
    tiny.samples["grade"] = [["low", "mid", "high"][k % 30 % 3] for k in range(40)]
    return {"outcome": "grade", "classes": ["low", "mid", "high"]}


def survival(tiny):
    tiny.samples["days"] = [100 + k % 30 for k in range(40)]
    tiny.samples["died"] = [k % 30 % 2 for k in range(40)]
    return {"time": "days", "event": "died", "time_unit": "days"}


@pytest.mark.parametrize("kind", [number, classes, survival])
def test_other_outcomes_run_from_end_to_end(tiny, tmp_path, kind):
    keys = kind(tiny)
    cohort = tiny.sections["cohort"]
    del cohort["outcome"], cohort["positive"]
    cohort.update(keys)
    tiny.sections["accuracy"].update(folds=5, inner_folds=3, repeats=1)
    path = tiny.write()
    checked = check_study(path)
    assert checked.outcome.kind == kind.__name__
    assert checked.findings.of("stop") == ()
    run = run_study(path, tmp_path / "out", threads=1)
    frontier = run.summary.frontier.to_frame()
    assert np.isfinite(frontier["metric"]).all()
    assert frontier["size"].max() > 1
    words = {"number": "R squared", "classes": "pairs of classes"}
    assert (
        words.get(kind.__name__, "concordance") in run.summary.choice.headline.sentence
    )
    table = pd.read_csv(tmp_path / "out" / "predictions.csv")
    assert ("class" in table) == (kind is classes)
    assert ("event" in table) == (kind is survival)


def set_aside(tiny, n_last=6):
    """The last people, who have one sample each, were seen in the last year."""
    late = tiny.samples["person"].isin([f"P{29 - k}" for k in range(n_last)])
    tiny.samples["year"] = np.where(late, 2021, 2020)
    tiny.sections["cohort"]["set_aside"] = {"column": "year", "from": 2021}
    tiny.sections["cohort"]["openings"] = "openings.jsonl"
    return np.flatnonzero(late)


def without_hashes(files):
    """Return the files with every input hash replaced: it has to differ.

    A panel file holds these hashes, so that the hashes of its content and of the record
    differ as well.
    """
    record = json.loads(files["record.json"])
    plain = {}
    for name, content in files.items():
        digests = list(record["inputs"].values())
        if name.startswith("panels/") and name.endswith(".json"):
            panel = json.loads(content)
            digests += [panel["content_sha256"], panel["record_sha256"]]
        for digest in digests:
            content = content.replace(digest.encode(), INPUT_HASHES.encode())
        plain[name] = content
    return plain


def test_no_byte_depends_on_rows_set_aside(quick, tmp_path, contents):
    """Their values and outcomes become nonsense; only the hash of the files differs."""
    hidden = set_aside(quick)
    run_study(quick.write(), tmp_path / "one", threads=1)
    before = contents(tmp_path / "one")
    quick.expression.iloc[hidden] = 1e6
    quick.expression.iloc[hidden[0], 3] = np.nan
    quick.samples.loc[hidden, "response"] = "unheard of"
    run_study(quick.write(), tmp_path / "two", threads=1)
    after = contents(tmp_path / "two")
    assert before["record.json"] != after["record.json"]
    blocks = [name for name in before if name.startswith("blocks")]
    one, two = (
        {k: v for k, v in without_hashes(files).items() if k not in blocks}
        for files in (before, after)
    )
    assert {k for k in one if not k.startswith("blocks")} == {
        k for k in two if not k.startswith("blocks")
    }
    assert [name for name in one if one[name] != two[name]] == []
    assert b"(set aside)" in before["flow.csv"]
    assert b"set aside,year is at least 2021" in before["dropped.csv"]


def test_that_test_can_fail(quick, tmp_path, contents):
    """A small change in a row that is read changes what is found."""
    set_aside(quick)
    run_study(quick.write(), tmp_path / "one", threads=1)
    quick.expression.iloc[0] += 1.0
    run_study(quick.write(), tmp_path / "two", threads=1)
    one, two = (without_hashes(contents(tmp_path / name)) for name in ("one", "two"))
    assert one["shortlist.csv"] != two["shortlist.csv"]


def test_openings_are_counted_in_the_record(quick, tmp_path):
    hidden = set_aside(quick, 8)
    quick.sections["accuracy"].update(folds=4)
    path = quick.write()
    run_study(path, tmp_path / "before", threads=1)
    opened = open_set_aside(path, "the panel is locked")
    assert list(opened.samples) == list(quick.samples["sample_id"][hidden])
    open_set_aside(path, "to look again")
    run_study(path, tmp_path / "after", threads=1)
    counts = [
        json.loads((tmp_path / name / "record.json").read_text())["openings"]
        for name in ("before", "after")
    ]
    assert counts == [0, 2]
    reasons = [o.reason for o in read_openings(path.parent / "openings.jsonl")]
    assert reasons == ["the panel is locked", "to look again"]


def test_a_study_without_an_openings_file_opens_nothing(quick):
    set_aside(quick, 8)
    del quick.sections["cohort"]["openings"]
    with pytest.raises(UsageError) as refused:
        open_set_aside(quick.write(), "why not")
    assert refused.value.code == "openings-missing"


def given(tiny):
    person = tiny.samples["person"].str[1:].astype(int)
    tiny.samples["part"] = [f"part {value // 2 % 4}" for value in person]
    tiny.sections["cohort"]["folds"] = "part"
    del tiny.sections["accuracy"]["folds"], tiny.sections["accuracy"]["repeats"]
    return tiny.samples["part"]


def test_given_folds_take_the_place_of_drawn_ones(tiny, tmp_path):
    tiny.sections["panels"]["sizes"] = [1, 2]
    part = given(tiny)
    run = run_study(tiny.write(), tmp_path / "out", threads=1)
    folds = pd.read_csv(tmp_path / "out" / "folds.csv", dtype={"sample": str})
    assert len(folds) == 40
    assert set(folds["repeat"]) == {0}
    assert list(folds["fold"]) == [int(name[-1]) for name in part]
    assert "4 folds given by the column 'part'" in run.summary.scheme
    predicted = pd.read_csv(tmp_path / "out" / "predictions.csv")
    assert predicted.groupby(["maker", "size"]).size().eq(40).all()


def test_folds_are_given_or_drawn_not_both(tiny, tmp_path):
    given(tiny)
    tiny.sections["accuracy"]["folds"] = 3
    with pytest.raises(StudyFileError) as refused:
        check_study(tiny.write())
    assert refused.value.code == "folds-twice"


def paired(tiny):
    """Twenty pairs: everybody with a sample of either class, the healthy one first."""
    tiny.samples["pair"] = [f"pair {number // 2}" for number in range(40)]
    sick = np.arange(40) % 2
    tiny.samples["response"] = np.where(sick, "yes", "no")
    draws = np.random.default_rng(5)
    values = draws.normal(8.0, 1.0, (40, 60))
    values[:, :4] += 1.5 * sick[:, None]
    tiny.expression.iloc[:, :] = values
    cohort = tiny.sections["cohort"]
    del cohort["subject"]
    cohort["matched_set"] = "pair"
    tiny.sections["design"] = {"kind": "matched"}


def test_matched_sets_stay_together(quick, tmp_path):
    paired(quick)
    quick.sections["accuracy"].update(folds=4)
    run = run_study(quick.write(), tmp_path / "out", threads=1)
    folds = pd.read_csv(tmp_path / "out" / "folds.csv")
    pairs = folds["fold"].to_numpy().reshape(20, 2)
    assert (pairs[:, 0] == pairs[:, 1]).all()
    assert np.bincount(pairs[:, 0]).tolist() == [5, 5, 5, 5]
    assert "matched set" in run.summary.scheme
    record = json.loads((tmp_path / "out" / "record.json").read_text())
    assert record["study"]["design"] == {"kind": "matched", "prevalence": None}


def test_without_the_sets_pairs_are_torn(quick, tmp_path):
    """The test above can fail."""
    paired(quick)
    del quick.sections["cohort"]["matched_set"], quick.sections["design"]
    quick.sections["cohort"]["accept"] = {"subject-column-unnamed": "on purpose"}
    run_study(quick.write(), tmp_path / "out", threads=1)
    folds = pd.read_csv(tmp_path / "out" / "folds.csv")
    pairs = folds["fold"].to_numpy().reshape(20, 2)
    assert (pairs[:, 0] != pairs[:, 1]).any()


def test_what_no_platform_measures_enters_no_panel(quick, tmp_path):
    path = quick.write()
    sheet = pd.read_csv(path.parent / "features.csv")
    sheet["assayable"] = ["" if f in ("F00", "F01") else "wells" for f in sheet.feature]
    sheet.to_csv(path.parent / "features.csv", index=False)
    run_study(path, tmp_path / "out", threads=1)
    dropped = pd.read_csv(tmp_path / "out" / "dropped.csv").set_index("id")
    assert "no platform" in dropped.loc["F00", "reason"]
    markers = pd.read_csv(tmp_path / "out" / "frontier.csv")["markers"]
    assert not {"F00", "F01"} & {name for row in markers for name in row.split(";")}


def test_a_platform_that_the_study_does_not_have(quick):
    path = quick.write()
    sheet = pd.read_csv(path.parent / "features.csv")
    sheet["assayable"] = "wels"
    sheet.to_csv(path.parent / "features.csv", index=False)
    with pytest.raises(InputDataError) as refused:
        check_study(path)
    assert refused.value.code == "unknown-platform"
    assert "the nearest is 'wells'" in refused.value.accepted
