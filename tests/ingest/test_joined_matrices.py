"""Several matrices joined by feature."""

import anndata
import numpy as np
import pandas as pd
import pytest

from panelkit.config import read_study
from panelkit.errors import InputDataError, StudyFileError
from panelkit.ingest.cohort_reader import read_cohort
from panelkit.workflow.cohort import load_cohort


@pytest.fixture
def halves(small):
    """Two files: one text and one Parquet, turned, its features in another order."""
    first, second = small.matrix.iloc[:14], small.matrix.iloc[14:, ::-1]
    first.to_csv(small.folder / "first.csv")
    second.T.to_parquet(small.folder / "second.parquet")
    small.sheet.to_csv(small.folder / "samples.csv", index=False)
    return [small.folder / "first.csv", small.folder / "second.parquet"]


def test_halves_make_the_whole(small, halves):
    sheet = small.sheet.sample(frac=1.0, random_state=1)
    cohort = read_cohort(
        halves, sheet, outcome="group", positive="case", batch="source_file"
    )
    expected = small.matrix.loc[sheet["sample_id"]]
    assert np.array_equal(cohort.X, expected)
    assert list(cohort.features) == list(small.matrix.columns)
    assert cohort.values.flags.c_contiguous
    origin = ["first.csv" if name <= "0014" else "second.parquet"
              for name in sheet["sample_id"]]  # fmt: skip
    assert list(cohort.sample_columns["source_file"]) == origin
    assert list(cohort.design.batch) == origin
    assert sorted(cohort.sources) == ["expression-1", "expression-2"]


def test_a_sample_of_no_file_comes_from_nowhere(small, halves):
    extra = pd.DataFrame({"sample_id": ["9999"], "group": ["case"]})
    cohort = read_cohort(halves, pd.concat([small.sheet, extra]))
    assert cohort.n_samples == 24
    assert {item.id for item in cohort.dropped} == {"9999"}


def test_different_features_are_refused_or_cut(small, halves):
    renamed = small.matrix.iloc[14:].rename(columns={"B_2": "new", "E5": "newer"})
    renamed.drop(columns="F6").to_parquet(halves[1])
    with pytest.raises(InputDataError) as caught:
        read_cohort(halves, small.sheet)
    assert caught.value.code == "features-differ"
    assert "first.csv has 6, second.parquet has 5; 3 are in all" in caught.value.what
    assert "'B_2 (first.csv)'" in caught.value.what
    assert "intersection" in caught.value.next_step
    cohort = read_cohort(halves, small.sheet, join="intersection")
    assert list(cohort.features) == ["007", "C-3", "d 4"]
    assert np.array_equal(cohort.X, small.matrix[["007", "C-3", "d 4"]])
    finding = next(f for f in cohort.findings if f.code == "features-not-in-all-files")
    assert "5 are left out" in finding.message


def test_nothing_in_common_is_an_error_even_for_the_intersection(small, halves):
    small.matrix.iloc[14:].rename(columns=str.lower).rename(
        columns=lambda name: f"{name}_x"
    ).to_parquet(halves[1])
    with pytest.raises(InputDataError) as caught:
        read_cohort(halves, small.sheet, join="intersection")
    assert caught.value.code == "features-differ"
    assert "0 are in all" in caught.value.what


def test_a_sample_in_two_files_is_refused(small, halves):
    small.matrix.iloc[12:].to_parquet(halves[1])
    with pytest.raises(InputDataError) as caught:
        read_cohort(halves, small.sheet)
    assert caught.value.code == "samples-in-several-files"
    assert "2 samples occur" in caught.value.what
    assert "'0013 (first.csv, second.parquet)'" in caught.value.what


def test_annotated_parts_bring_their_sheets(small):
    parts = []
    for rows, column in ((slice(0, 10), "group"), (slice(10, 24), "clinic")):
        sheet = small.sheet.iloc[rows].set_index("sample_id").rename_axis(None)
        values = small.matrix.iloc[rows].to_numpy()
        var = pd.DataFrame({"symbol": list("ABCDEF")}, index=small.matrix.columns)
        parts.append(anndata.AnnData(X=values, obs=sheet[[column, "age"]], var=var))
    cohort = read_cohort(parts)
    assert np.array_equal(cohort.X, small.matrix)
    assert list(cohort.sample_columns["group"][9:12]) == ["control", "", ""]
    assert list(cohort.sample_columns["clinic"][9:12]) == ["", "north", "north"]
    assert set(cohort.sample_columns["source_file"]) == {
        "expression (AnnData) (1)",
        "expression (AnnData) (2)",
    }
    assert list(cohort.feature_columns["symbol"]) == list("ABCDEF")


def test_without_a_sheet_the_origin_is_all_there_is(small):
    small.matrix.iloc[:14].to_csv(small.folder / "first.csv")
    small.matrix.iloc[14:].to_csv(small.folder / "second.csv")
    cohort = read_cohort([small.folder / "first.csv", small.folder / "second.csv"])
    assert list(cohort.sample_columns) == ["source_file"]
    assert np.array_equal(cohort.X, small.matrix)


def test_precision_of_the_wider_part_holds(small):
    narrow = small.matrix.iloc[:14].astype(np.float32)
    cohort = read_cohort([narrow, small.matrix.iloc[14:]], small.sheet)
    assert cohort.values.dtype == np.float64
    assert np.array_equal(cohort.X[:14], narrow)
    assert np.array_equal(cohort.X[14:], small.matrix.iloc[14:])


STUDY = """[cohort]
expression = {expression}
samples = "samples.csv"
outcome = "group"
positive = "case"
batch = "source_file"
join = "intersection"
"""


def study_of(folder, expression):
    path = folder / "study.toml"
    path.write_text(STUDY.format(expression=expression))
    return read_study(path)


def test_a_study_names_a_list_and_the_record_no_file(small, halves):
    study = study_of(small.folder, '["first.csv", "second.parquet"]')
    cohort = load_cohort(study)
    assert np.array_equal(cohort.X, small.matrix)
    shown = study.effective()["cohort"]
    assert shown["join"] == "intersection"
    assert not {"expression", "row_names", "column_names"} & set(shown)


@pytest.mark.parametrize("expression", ["[]", "5", "[1]", "{}"])
def test_a_study_takes_paths_only(small, expression):
    with pytest.raises(StudyFileError) as caught:
        study_of(small.folder, expression)
    assert caught.value.code == "value-refused"
    assert caught.value.where.endswith("key 'expression'")
    assert "a list of paths" in caught.value.accepted


def annotated(path, samples, **columns):
    values = np.arange(len(samples) * 3.0).reshape(-1, 3)
    var = pd.DataFrame(columns, index=["g1", "g2", "g3"])
    obs = pd.DataFrame(index=samples)
    anndata.AnnData(X=values, obs=obs, var=var).write_h5ad(path)
    return path


def test_feature_columns_of_all_parts_are_joined(tmp_path):
    """AnnData and GCT: equal columns once, further ones beside them, no finding."""
    first = annotated(tmp_path / "a.h5ad", ["S1", "S2"], symbol=["A", "B", "C"])
    second = tmp_path / "b.gct"
    second.write_text(
        "#1.3\n3\t1\t2\t0\nid\tsymbol\tclone\tS3\n"
        "g3\tC\tk3\t9\ng1\tA\tk1\t7\ng2\tB\tk2\t8\n"
    )
    cohort = read_cohort([first, second])
    assert list(cohort.samples) == ["S1", "S2", "S3"]
    assert cohort.X.tolist() == [[0, 1, 2], [3, 4, 5], [7, 8, 9]]
    assert list(cohort.feature_columns["symbol"]) == ["A", "B", "C"]
    assert list(cohort.feature_columns["clone"]) == ["k1", "k2", "k3"]
    assert "feature-columns-differ" not in {f.code for f in cohort.findings}


@pytest.mark.parametrize("given", [False, True])
def test_feature_columns_that_differ_are_named(tmp_path, given):
    parts = [
        annotated(tmp_path / "a.h5ad", ["S1"], symbol=["A", "B", "C"]),
        annotated(tmp_path / "b.h5ad", ["S2"], symbol=["A", "X", "Y"]),
    ]
    sheet = pd.DataFrame({"feature": ["g1", "g2", "g3"], "symbol": ["K", "L", "M"]})
    cohort = read_cohort(parts, features=sheet if given else None)
    found = [f for f in cohort.findings if f.code == "feature-columns-differ"]
    symbols = list(cohort.feature_columns["symbol"])
    if given:  # the sheet settles it
        assert (symbols, found) == (["K", "L", "M"], [])
    else:
        assert symbols == ["A", "B", "C"]
        assert found[0].where == "b.h5ad"
        assert "2 features ('g2', 'g3')" in found[0].message
        assert "that of 'a.h5ad' is used" in found[0].message
