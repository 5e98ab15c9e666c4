"""`run_shortlist`: its folder, laboratory facts, candidates on a platform, the null."""

import json

import numpy as np
import pandas as pd
import pytest

from panelkit import run_shortlist, run_study
from panelkit.errors import InputDataError, StudyFileError
from panelkit.runtime import Progress

TABLES = {
    "bounds.csv", "companions.csv", "dropped.csv", "findings.csv", "flow.csv",
    "null.csv", "selectors.csv", "shortlist.csv",
}  # fmt: skip
PICTURES = {
    "convergence", "frequency_along_path", "selection_frequency", "shuffles",
}  # fmt: skip


@pytest.fixture
def tiny(tiny):
    tiny.sections["shortlist"]["shuffles"] = 7
    return tiny


def shortlist(tiny, name="out", **how):
    run = run_shortlist(tiny.write(), tiny.folder / name, threads=1, **how)
    return run, pd.read_csv(run.path / "shortlist.csv").set_index("feature")


def test_the_folder_has_tables_pictures_and_their_numbers(tiny):
    run, table = shortlist(tiny)
    names = {path.name for path in run.path.iterdir()}
    assert TABLES | {"record.json", "timings.json", "run.log"} <= names
    assert not names & {"frontier.csv", "report.html", "choice.json"}
    figures = {path.stem for path in (run.path / "figures").glob("*.svg")}
    assert figures >= PICTURES
    assert figures == {path.stem for path in (run.path / "tables").glob("*.csv")}
    assert not table.index.isin(["F57", "F58", "F59"]).any()
    shuffles = pd.read_csv(run.path / "tables" / "shuffles.csv")
    assert (shuffles["kind"] == "shuffle").sum() == 7
    null = pd.read_csv(run.path / "null.csv")
    assert null["p_adjusted"].between(1 / 8, 1.0).all()
    assert null["p_feature"].isna().all()
    selectors = pd.read_csv(run.path / "selectors.csv")
    assert selectors["selector"].tolist() == ["lasso", "elastic-net", "univariate"]


def test_the_whole_run_goes_on_in_the_same_folder(tiny):
    run, table = shortlist(tiny)
    before = (run.path / "shortlist.csv").read_bytes()
    whole = run_study(tiny.folder / "study.toml", run.path, threads=1)
    assert whole.path == run.path
    assert (run.path / "shortlist.csv").read_bytes() == before
    assert (run.path / "report.html").exists()
    timings = json.loads((run.path / "timings.json").read_text())
    assert timings["resumed"] is True
    assert len(table)


def test_shuffles_are_resumed_and_told(tiny, contents):
    told = []
    run, _ = shortlist(tiny, listener=told.append)
    assert Progress("shuffles", 2, 2) in told
    first = contents(run.path)
    again = []
    shortlist(tiny, listener=again.append)
    assert Progress("shuffles", 2, 2, True) in again
    assert contents(run.path) == first


def test_threads_change_no_byte(tiny, contents):
    run, _ = shortlist(tiny)
    other = run_shortlist(tiny.folder / "study.toml", tiny.folder / "two", threads=2)
    assert contents(other.path) == contents(run.path)


def test_no_shuffles_when_none_are_asked_for(tiny):
    tiny.sections["shortlist"]["shuffles"] = 0
    run, _ = shortlist(tiny)
    assert run.results.null is None
    assert not (run.path / "null.csv").exists()
    assert not (run.path / "figures" / "shuffles.svg").exists()


def test_sentences_say_what_matters(tiny):
    run, table = shortlist(tiny)
    said = " ".join(run.results.sentences())
    assert "fixed before the first fit" in said
    assert "is no error of this kind" in said
    assert "With people shuffled 7 times" in said
    assert "the first 8 companion groups" in said
    named = table.index[table["picked"]].tolist()
    assert named
    assert all(name in said for name in named)


def with_features(tiny, **columns):
    path = tiny.folder / "features.csv"
    table = pd.read_csv(path, dtype=str)
    for name, values in columns.items():
        table[name] = values
    table.to_csv(path, index=False)


def test_laboratory_facts(tiny):
    path = tiny.write()
    names = [f"F{j:02d}" for j in range(60)]
    limits = ["8.0" if j < 30 else "" for j in range(60)]
    with_features(
        tiny, symbol=[f"GENE{j}" for j in range(60)], limit_of_detection=limits
    )
    run = run_shortlist(path, tiny.folder / "out", threads=1)
    table = pd.read_csv(run.path / "shortlist.csv").set_index("feature")
    values = tiny.expression
    for name in ("F00", "F01", "F40"):
        if name not in table.index:
            continue
        row, column = table.loc[name], values[name]
        filled = column.fillna(column.median())
        assert row["symbol"] == f"GENE{int(name[1:])}"
        assert row["assayable"] == "wells;pools"
        assert row["mean_level"] == pytest.approx(filled.mean())  # every sample once
        assert row["missing_share"] == pytest.approx(column.isna().mean())
        if name < "F30":
            below = (column.dropna() < 8.0).mean()
            assert row["below_limit_share"] == pytest.approx(below)
        else:
            assert np.isnan(row["below_limit_share"])
    assert names[0] in table.index
    assert table["replicate_icc"].isna().all()


def test_limit_that_is_no_number(tiny):
    path = tiny.write()
    with_features(tiny, limit_of_detection=["low"] * 60)
    with pytest.raises(InputDataError) as caught:
        run_shortlist(path, tiny.folder / "out")
    assert caught.value.code == "limit-not-numeric"


def test_replicates_are_compared(tiny):
    """Four people measured again: F00 to the digit, F01 as if somebody else."""
    draws = np.random.default_rng(1)
    again = tiny.expression.iloc[:4].copy()
    again.index = pd.Index([f"R{k}" for k in range(4)], name="sample_id")
    again["F01"] = draws.normal(8.0, 1.0, 4)
    first = tiny.expression.iloc[:4]
    tiny.expression = pd.concat([tiny.expression, again])
    rows = tiny.samples.iloc[:4].assign(
        sample_id=again.index, replicate_of=tiny.samples["sample_id"][:4]
    )
    tiny.samples = pd.concat([tiny.samples, rows]).fillna({"replicate_of": ""})
    tiny.sections["cohort"]["replicate_of"] = "replicate_of"
    run, table = shortlist(tiny)
    assert run.results.n_samples == 40
    same, other = first["F00"].notna().sum(), again["F01"].notna().sum()
    assert same > 2
    assert other > 2
    assert table.loc["F00", "replicate_icc"] == pytest.approx(1.0)
    assert table.loc["F01", "replicate_icc"] < 0.9


def test_candidates_on_a_platform(tiny):
    _, free = shortlist(tiny)
    path = tiny.write()
    prices = pd.read_csv(tiny.folder / "prices.csv", dtype=str)
    no = pd.DataFrame(
        [("F00", "wells", "no", "", ""), ("F01", "pools", "no", "", "")],
        columns=prices.columns,
    )
    text = path.read_text().replace(
        "[shortlist]", '[shortlist]\ncandidates_on = "wells"'
    )
    path.write_text(text)
    pd.concat([prices, no]).to_csv(tiny.folder / "prices.csv", index=False)
    run = run_shortlist(path, tiny.folder / "kept", threads=1)
    table = pd.read_csv(run.path / "shortlist.csv").set_index("feature")
    assert free.loc["F00", "candidate"]
    assert not table.loc["F00", "candidate"]
    assert table.loc["F01", "candidate"]
    assert table.loc["F00", "assayable"] == "pools"
    assert table["frequency"].equals(free["frequency"].loc[table.index])
    for name in ("F00", "F01"):
        assert table.loc[name, "picked"] == free.loc[name, "picked"]


def test_the_feature_sheet_stands_above_the_price_list(tiny):
    path = tiny.write()
    with_features(tiny, assayable=["wells"] * 2 + ["pools;wells"] * 58)
    text = path.read_text().replace(
        "[shortlist]", '[shortlist]\ncandidates_on = "pools"'
    )
    path.write_text(text)
    run = run_shortlist(path, tiny.folder / "out", threads=1)
    table = pd.read_csv(run.path / "shortlist.csv").set_index("feature")
    candidates = table.index[table["candidate"]]
    assert not candidates.isin(["F00", "F01"]).any()
    assert candidates.isin(["F02", "F03"]).any()


def test_unknown_platform(tiny):
    tiny.sections["shortlist"]["candidates_on"] = "slides"
    with pytest.raises(StudyFileError) as caught:
        shortlist(tiny)
    assert caught.value.code == "platform-unknown"
    assert "wells" in caught.value.accepted


def test_halves_by_site(tiny):
    tiny.sections["shortlist"]["stratify_by_site"] = True
    with pytest.raises(StudyFileError) as caught:
        shortlist(tiny)
    assert caught.value.code == "site-missing"
    tiny.samples["site"] = np.where(np.arange(40) % 10 < 5, "north", "south")
    tiny.sections["cohort"]["site"] = "site"
    _, by_site = shortlist(tiny)
    tiny.sections["shortlist"]["stratify_by_site"] = False
    _, free = shortlist(tiny, "free")
    assert by_site["frequency"].to_dict() != free["frequency"].to_dict()


@pytest.mark.parametrize(
    ("given", "threshold", "asked"),
    [
        ({"markers_per_subsample": 4, "threshold": 0.9}, 0.9, 4),
        # 1/2 (1 + 16 / 57) = 0.64: of eight subsamples the next step is 0.75
        ({"markers_per_subsample": 4, "false_markers": 1.0}, 0.75, 4),
        ({"threshold": 0.6, "false_markers": 0.5}, 0.6, 2),
    ],
)
def test_two_of_three(tiny, given, threshold, asked):
    tiny.sections["shortlist"] |= given
    run, _ = shortlist(tiny)
    assert run.results.bound.threshold == threshold
    assert run.results.bound.asked == asked


def test_all_three_are_refused(tiny):
    tiny.sections["shortlist"] |= {
        "markers_per_subsample": 4,
        "threshold": 0.9,
        "false_markers": 1.0,
    }
    with pytest.raises(StudyFileError) as caught:
        shortlist(tiny)
    assert "the third follows" in caught.value.accepted


def test_an_infeasible_demand_names_what_would_do(tiny):
    tiny.sections["shortlist"] |= {"markers_per_subsample": 20, "false_markers": 0.5}
    with pytest.raises(StudyFileError) as caught:
        shortlist(tiny)
    assert caught.value.code == "bound-infeasible"
    assert "at most 5 markers" in caught.value.accepted
