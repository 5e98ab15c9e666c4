"""Spoiled files of every format: one sentence, its code, no crash, no hang.

Each maker writes a file into a folder and returns its path; the table says which code
and exit code the file ends with, and what its sentence must name.
"""

import re
import zipfile

import anndata
import h5py
import numpy as np
import openpyxl
import pandas as pd
import pyarrow as pa
import pyarrow.feather
import pyarrow.parquet
import pytest
from scipy import sparse

from panelkit.errors import PanelkitError
from panelkit.ingest.cohort_reader import read_cohort

SENTENCE = re.compile(r"^[^\n]+: [^\n]+; [^\n]+\. [A-Z][^\n]+\.$")


def frame():
    draws = np.random.default_rng(0)
    ids = [f"S{number}" for number in range(8)]
    return pd.DataFrame(draws.normal(7, 2, (8, 5)), index=ids, columns=list("abcde"))


def cut(path, share=0.6):
    raw = path.read_bytes()
    path.write_bytes(raw[: int(len(raw) * share)])
    return path


def damaged_inside(path, at=0.5, size=64):
    raw = bytearray(path.read_bytes())
    start = int(len(raw) * at)
    raw[start : start + size] = b"\xff" * size
    path.write_bytes(raw)
    return path


# --- Parquet and Arrow ---------------------------------------------------------


def table(folder, columns, name="matrix.parquet"):
    path = folder / name
    pa.parquet.write_table(pa.table(columns), path)
    return path


def parquet(folder):
    path = folder / "matrix.parquet"
    frame().to_parquet(path)
    return path


def parquet_truncated(folder):
    return cut(parquet(folder))


def parquet_magic_only(folder):
    path = folder / "matrix.parquet"
    path.write_bytes(b"PAR1" + b"\0" * 50)
    return path


def parquet_footer_spoiled(folder):
    return damaged_inside(parquet(folder), at=0.9)


def parquet_is_text(folder):
    path = folder / "matrix.parquet"
    frame().to_csv(path)
    return path


def parquet_without_ids(folder):
    return table(folder, {"a": [1.0, 2.0], "b": [3.0, 4.0]})


def parquet_two_indices(folder):
    path = folder / "matrix.parquet"
    frame().set_index(["a", "b"]).to_parquet(path)
    return path


def parquet_nested(folder):
    return table(folder, {"id": ["x", "y"], "a": [[1.0], [2.0]], "b": [1.0, 2.0]})


def parquet_times(folder):
    times = pd.to_datetime(["2026-01-01", "2026-01-02"])
    return table(folder, {"id": ["x", "y"], "a": times, "b": [1.0, 2.0]})


def parquet_no_rows(folder):
    return table(folder, {"id": pa.array([], pa.string()), "a": pa.array([], "f8")})


def parquet_ids_only(folder):
    return table(folder, {"id": ["x", "y"]})


def parquet_ids_twice(folder):
    return table(folder, {"id": ["x", "x"], "a": [1.0, 2.0]})


def parquet_columns_twice(folder):
    path = folder / "matrix.parquet"
    columns = [pa.array(["x", "y"]), pa.array([1.0, 2.0]), pa.array([3.0, 4.0])]
    pa.parquet.write_table(pa.Table.from_arrays(columns, ["id", "a", "a"]), path)
    return path


def parquet_ids_blank(folder):
    return table(folder, {"id": ["x", None], "a": [1.0, 2.0]})


def parquet_full_of_text(folder):
    words = [f"word {number}" for number in range(200)]
    ids = [f"S{number}" for number in range(200)]
    return table(folder, {"id": ids, "a": words, "b": words})


def feather_truncated(folder):
    path = folder / "matrix.feather"
    pa.feather.write_feather(pa.Table.from_pandas(frame()), path)
    return cut(path, 0.5)


def arrow_stream_truncated(folder):
    path = folder / "matrix.arrows"
    made = pa.Table.from_pandas(frame())
    with pa.ipc.new_stream(path, made.schema) as stream:
        stream.write_table(made)
    return cut(path, 0.8)


# --- AnnData -------------------------------------------------------------------


def h5ad(folder, values=None, **parts):
    path = folder / "matrix.h5ad"
    made = frame()
    obs, var = pd.DataFrame(index=made.index), pd.DataFrame(index=made.columns)
    values = made.to_numpy() if values is None else values
    anndata.AnnData(X=values, obs=obs, var=var, **parts).write_h5ad(path)
    return path


def changed_h5ad(folder, change, values=None):
    path = h5ad(folder, values)
    with h5py.File(path, "r+") as file:
        change(file)
    return path


def sparse_values():
    return sparse.csr_matrix(np.round(frame().to_numpy()))


def h5ad_truncated(folder):
    return cut(h5ad(folder))


def h5ad_without_matrix(folder):
    def change(file):
        del file["X"]

    return changed_h5ad(folder, change)


def h5ad_of_text(folder):
    def change(file):
        del file["X"]
        file["X"] = np.full((8, 5), b"word")

    return changed_h5ad(folder, change)


def h5ad_of_complex_numbers(folder):
    def change(file):
        del file["X"]
        file["X"] = np.full((8, 5), 1 + 2j)

    return changed_h5ad(folder, change)


def h5ad_of_one_dimension(folder):
    def change(file):
        del file["X"]
        file["X"] = np.ones(8)

    return changed_h5ad(folder, change)


def h5ad_of_other_size(folder):
    def change(file):
        del file["X"]
        file["X"] = np.ones((8, 9))

    return changed_h5ad(folder, change)


def h5ad_with_groups_inside(folder):
    def change(file):
        del file["X"]
        file.create_group("X/deeper/still")

    return changed_h5ad(folder, change)


def h5ad_without_names(folder):
    def change(file):
        del file["var"].attrs["_index"]

    return changed_h5ad(folder, change)


def h5ad_without_table(folder):
    def change(file):
        del file["obs"]

    return changed_h5ad(folder, change)


def h5ad_link_outside(folder):
    other = h5ad(folder).rename(folder / "other.h5ad")

    def change(file):
        del file["X"]
        file["X"] = h5py.ExternalLink(other.name, "/X")

    return changed_h5ad(folder, change)


def h5ad_numbers_outside(folder):
    (folder / "secret.bin").write_bytes(b"\1" * 320)

    def change(file):
        del file["X"]
        file.create_dataset(
            "X", (8, 5), "f8", external=[(str(folder / "secret.bin"), 0, 320)]
        )

    return changed_h5ad(folder, change)


def h5ad_virtual(folder):
    other = h5ad(folder).rename(folder / "other.h5ad")

    def change(file):
        del file["X"]
        layout = h5py.VirtualLayout((8, 5), "f8")
        layout[:] = h5py.VirtualSource(str(other), "X", (8, 5))
        file.create_virtual_dataset("X", layout)

    return changed_h5ad(folder, change)


def h5ad_loop_of_links(folder):
    def change(file):
        del file["X"]
        file["X"] = h5py.SoftLink("/Y")
        file["Y"] = h5py.SoftLink("/X")

    return changed_h5ad(folder, change)


def h5ad_entries_outside(folder):
    def change(file):
        file["X/indices"][3] = 900

    return changed_h5ad(folder, change, sparse_values())


def h5ad_entries_negative(folder):
    def change(file):
        file["X/indices"][3] = -7

    return changed_h5ad(folder, change, sparse_values())


def h5ad_pointers_wrong(folder):
    def change(file):
        file["X/indptr"][3] = 10**9

    return changed_h5ad(folder, change, sparse_values())


def h5ad_pointers_backwards(folder):
    def change(file):
        file["X/indptr"][3] = 0

    return changed_h5ad(folder, change, sparse_values())


def h5ad_of_endless_size(folder):
    """A few kilobytes that claim 80 million GB: nothing was ever written there."""

    def change(file):
        del file["X"]
        file.create_dataset("X", (10**8, 10**8), "f8", chunks=(100, 100))

    return changed_h5ad(folder, change)


def hdf5_of_something_else(folder):
    path = folder / "matrix.h5"
    with h5py.File(path, "w") as file:
        file["a/b/c"] = np.ones(5)
    return path


def h5ad_is_text(folder):
    path = folder / "matrix.h5ad"
    frame().to_csv(path)
    return path


# --- GCT -----------------------------------------------------------------------


def gct(folder, text):
    path = folder / "matrix.gct"
    path.write_text(text)
    return path


HEAD = "NAME\tDescription\tA\tB\n"


def gct_more_rows_than_stated(folder):
    return gct(folder, f"#1.2\n1\t2\n{HEAD}g1\tx\t1\t2\ng2\tx\t3\t4\n")


def gct_fewer_rows_than_stated(folder):
    return gct(folder, f"#1.2\n9\t2\n{HEAD}g1\tx\t1\t2\n")


def gct_other_columns_than_stated(folder):
    return gct(folder, f"#1.2\n1\t3\n{HEAD}g1\tx\t1\t2\n")


def gct_short_line(folder):
    return gct(folder, f"#1.2\n2\t2\n{HEAD}g1\tx\t1\t2\ng2\tx\t3\n")


def gct_without_dimensions(folder):
    return gct(folder, f"#1.2\n{HEAD}g1\tx\t1\t2\n")


def gct_ends_early(folder):
    return gct(folder, "#1.3\n2\t2\t1\t5\nid\tsymbol\tA\tB\nage\tna\t1\t2\n")


def gct_two_dimensions_for_four(folder):
    return gct(folder, "#1.3\n2\t2\nid\tsymbol\tA\tB\n")


def gct_of_endless_size(folder):
    return gct(folder, f"#1.2\n99999999999\t2\n{HEAD}g1\tx\t1\t2\n")


def gct_of_nothing(folder):
    return gct(folder, f"#1.2\n0\t2\n{HEAD}")


def gct_other_version(folder):
    return gct(folder, f"#2.7\n1\t2\n{HEAD}g1\tx\t1\t2\n")


# --- Matrix Market -------------------------------------------------------------

BANNER = "%%MatrixMarket matrix coordinate real general\n"


def mtx(folder, text, features="g1\ng2\ng3\n", barcodes="S1\nS2\n"):
    path = folder / "matrix.mtx"
    path.write_text(text)
    if features:
        (folder / "features.tsv").write_text(features)
    if barcodes:
        (folder / "barcodes.tsv").write_text(barcodes)
    return path


def mtx_entry_outside(folder):
    return mtx(folder, f"{BANNER}3 2 2\n1 1 1.5\n4 1 2.5\n")


def mtx_entry_at_zero(folder):
    return mtx(folder, f"{BANNER}3 2 2\n1 1 1.5\n0 1 2.5\n")


def mtx_entry_twice(folder):
    return mtx(folder, f"{BANNER}3 2 3\n1 1 1.5\n2 1 2.5\n1 1 3.5\n")


def mtx_complex(folder):
    banner = BANNER.replace("real", "complex")
    return mtx(folder, f"{banner}3 2 1\n1 1 1.5 2.5\n")


def mtx_pattern(folder):
    return mtx(folder, f"{BANNER.replace('real', 'pattern')}3 2 1\n1 1\n")


def mtx_symmetric(folder):
    banner = BANNER.replace("general", "symmetric")
    return mtx(folder, f"{banner}2 2 1\n1 1 1.5\n", "g1\ng2\n")


def mtx_fewer_entries(folder):
    return mtx(folder, f"{BANNER}3 2 4\n1 1 1.5\n2 1 2.5\n")


def mtx_more_entries(folder):
    return mtx(folder, f"{BANNER}3 2 1\n1 1 1.5\n2 1 2.5\n")


def mtx_word_for_number(folder):
    return mtx(folder, f"{BANNER}3 2 2\n1 1 1.5\n2 1 word\n")


def mtx_banner_alone(folder):
    return mtx(folder, BANNER)


def mtx_banner_unknown(folder):
    return mtx(folder, f"{BANNER.replace('coordinate', 'wheel')}3 2 1\n1 1 1\n")


def mtx_of_endless_size(folder):
    return mtx(folder, f"{BANNER}999999999 999999999 1\n1 1 1.5\n")


def mtx_of_endless_entries(folder):
    return mtx(folder, f"{BANNER}3 2 99999999999999\n1 1 1.5\n")


def mtx_ids_of_other_length(folder):
    return mtx(folder, f"{BANNER}3 2 1\n1 1 1.5\n", "g1\n")


def mtx_without_ids(folder):
    return mtx(folder, f"{BANNER}3 2 1\n1 1 1.5\n", features="")


def mtx_ids_in_two_files(folder):
    (folder / "genes.tsv.gz").write_bytes(b"\x1f\x8b")
    return mtx(folder, f"{BANNER}3 2 1\n1 1 1.5\n")


# --- Excel ---------------------------------------------------------------------


def xlsx(folder, rows):
    path = folder / "matrix.xlsx"
    book = openpyxl.Workbook()
    for row in rows:
        book.active.append(row)
    book.save(path)
    return path


ROWS = [["id", "a", "b"], ["S1", 1.5, 2.5], ["S2", 3.5, 4.5]]


def member_changed(path, name, change):
    """Write the archive again with one member changed, as another tool might."""
    with zipfile.ZipFile(path) as archive:
        members = {each: archive.read(each) for each in archive.namelist()}
    members[name] = change(members.get(name, b""))
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as archive:
        for each, content in members.items():
            archive.writestr(each, content)
    return path


def xlsx_truncated(folder):
    return cut(xlsx(folder, ROWS))


def xlsx_is_text(folder):
    path = folder / "matrix.xlsx"
    frame().to_csv(path)
    return path


def xlsx_is_another_archive(folder):
    path = folder / "matrix.xlsx"
    with zipfile.ZipFile(path, "w") as archive:
        archive.writestr("matrix.csv", "id,a\nS1,1\n")
    return path


def xlsx_blank(folder):
    return xlsx(folder, [])


def xlsx_header_only(folder):
    return xlsx(folder, ROWS[:1])


def xlsx_formulas(folder):
    return xlsx(folder, [*ROWS, ["S3", "=B2+B3", 1.0]])


def xlsx_cells_beside(folder):
    return xlsx(folder, [*ROWS, ["S3", 1.0, 2.0, None, "a note"]])


def xlsx_ids_twice(folder):
    return xlsx(folder, [*ROWS, ["S1", 5.5, 6.5]])


def xlsx_expands(folder):
    """Three kilobytes a megabyte: the sum of the sizes is what gives it away."""
    path = xlsx(folder, ROWS)
    with zipfile.ZipFile(path, "a", zipfile.ZIP_DEFLATED) as archive:
        archive.writestr("xl/media/image1.bin", b"\0" * 2**20)
    raw = path.read_bytes()
    at = raw.rindex(b"PK\x01\x02")  # its entry in the directory is the last one
    claimed = (2**32 - 2).to_bytes(4, "little")
    path.write_bytes(raw[: at + 24] + claimed + raw[at + 28 :])
    return path


def xlsx_entities(folder):
    entities = b'<!DOCTYPE a [<!ENTITY b "bbbb">]>'
    return member_changed(
        xlsx(folder, ROWS),
        "xl/worksheets/sheet1.xml",
        lambda content: entities + content,
    )


def xlsx_broken_xml(folder):
    return member_changed(
        xlsx(folder, ROWS), "xl/worksheets/sheet1.xml", lambda c: c[: len(c) // 2]
    )


def xlsx_row_beyond_counting(folder):
    return member_changed(
        xlsx(folder, ROWS),
        "xl/worksheets/sheet1.xml",
        lambda c: c.replace(b'<row r="3"', b'<row r="99999999999"'),
    )


def archive_bare(folder):
    path = folder / "matrix.zip"
    path.write_bytes(b"PK\x03\x04" + b"\0" * 20)
    return path


BAD = [
    (parquet_truncated, "wrong-file-kind", 3, "a Parquet file"),
    (parquet_magic_only, "wrong-file-kind", 3, "a Parquet file"),
    (parquet_footer_spoiled, "wrong-file-kind", 3, "a Parquet file"),
    (parquet_is_text, "wrong-file-kind", 3, "the name says a Parquet file"),
    (parquet_without_ids, "ids-not-found", 3, "none of the 2 columns is text"),
    (parquet_two_indices, "ids-not-found", 3, "'a', 'b'"),
    (parquet_nested, "columns-not-numeric", 3, "a (list<"),
    (parquet_times, "columns-not-numeric", 3, "a (timestamp"),
    (parquet_no_rows, "matrix-empty", 3, "0 rows"),
    (parquet_ids_only, "matrix-empty", 3, "1 columns"),
    (parquet_ids_twice, "repeated-ids", 3, "'x'"),
    (parquet_columns_twice, "repeated-ids", 3, "'a'"),
    (parquet_ids_blank, "blank-id", 3, "1 of the 2"),
    (parquet_full_of_text, "text-everywhere", 3, "row 'S0', column 'a': 'word 0'"),
    (feather_truncated, "wrong-file-kind", 3, "an Arrow file"),
    (arrow_stream_truncated, "wrong-file-kind", 3, "an Arrow file"),
    (h5ad_truncated, "wrong-file-kind", 3, "truncated"),
    (h5ad_without_matrix, "matrix-empty", 3, "no X"),
    (h5ad_of_text, "matrix-empty", 3, "|S4"),
    (h5ad_of_complex_numbers, "matrix-empty", 3, "complex128"),
    (h5ad_of_one_dimension, "matrix-empty", 3, "(8,)"),
    (h5ad_of_other_size, "dimensions-differ", 3, "9 columns"),
    (h5ad_with_groups_inside, "wrong-file-kind", 3, "'deeper'"),
    (h5ad_without_names, "names-missing", 3, "no index"),
    (h5ad_without_table, "names-missing", 3, "obs"),
    (h5ad_link_outside, "external-link", 3, "a link to other.h5ad"),
    (h5ad_numbers_outside, "external-link", 3, "X (its numbers lie in another"),
    (h5ad_virtual, "external-link", 3, "X (its numbers lie in another"),
    (h5ad_loop_of_links, "wrong-file-kind", 3, "an .h5ad file"),
    (h5ad_entries_outside, "wrong-file-kind", 3, "index 900 of 5"),
    (h5ad_entries_negative, "wrong-file-kind", 3, "index -7 of 5"),
    (h5ad_pointers_wrong, "wrong-file-kind", 3, "contradicts itself"),
    (h5ad_pointers_backwards, "wrong-file-kind", 3, "contradicts itself"),
    (h5ad_of_endless_size, "dimensions-differ", 3, "100000000 rows"),
    (hdf5_of_something_else, "matrix-empty", 3, "no X"),
    (h5ad_is_text, "wrong-file-kind", 3, "the name says an .h5ad file"),
    (
        gct_more_rows_than_stated,
        "dimensions-differ",
        3,
        "states 1 rows, the file has 2",
    ),
    (gct_fewer_rows_than_stated, "dimensions-differ", 3, "9 rows, the file has 1"),
    (
        gct_other_columns_than_stated,
        "dimensions-differ",
        3,
        "3 columns, this line has 2",
    ),
    (gct_short_line, "dimensions-differ", 3, "line 5"),
    (gct_without_dimensions, "dimensions-unreadable", 3, "'NAME Description A B'"),
    (gct_ends_early, "dimensions-differ", 3, "ends after line 4"),
    (gct_two_dimensions_for_four, "dimensions-unreadable", 3, "'2 2'"),
    (gct_of_endless_size, "matrix-too-large", 7, "99,999,999,999 rows"),
    (gct_of_nothing, "matrix-empty", 3, "0 rows"),
    (gct_other_version, "wrong-file-kind", 3, "the name says a GCT file"),
    (mtx_entry_outside, "wrong-file-kind", 3, "a Matrix Market file"),
    (mtx_entry_at_zero, "wrong-file-kind", 3, "a Matrix Market file"),
    (mtx_entry_twice, "repeated-entries", 3, "row 1, column 1"),
    (mtx_complex, "matrix-kind-refused", 3, "complex"),
    (mtx_pattern, "matrix-kind-refused", 3, "pattern"),
    (mtx_symmetric, "matrix-kind-refused", 3, "symmetric"),
    (mtx_fewer_entries, "wrong-file-kind", 3, "a Matrix Market file"),
    (mtx_more_entries, "wrong-file-kind", 3, "a Matrix Market file"),
    (mtx_word_for_number, "wrong-file-kind", 3, "a Matrix Market file"),
    (mtx_banner_alone, "wrong-file-kind", 3, "a Matrix Market file"),
    (mtx_banner_unknown, "wrong-file-kind", 3, "a Matrix Market file"),
    (mtx_of_endless_size, "dimensions-differ", 3, "999999999 rows"),
    (mtx_of_endless_entries, "matrix-too-large", 7, "GiB"),
    (mtx_ids_of_other_length, "dimensions-differ", 3, "features.tsv has 1 lines"),
    (mtx_without_ids, "names-file-missing", 3, "ids of its features"),
    (mtx_ids_in_two_files, "names-file-unclear", 3, "'features.tsv', 'genes.tsv.gz'"),
    (xlsx_truncated, "wrong-file-kind", 3, "Excel"),
    (xlsx_is_text, "wrong-file-kind", 3, "the name says an Excel workbook"),
    (xlsx_is_another_archive, "wrong-file-kind", 3, "no Excel workbook"),
    (xlsx_blank, "sheet-empty", 3, "0 rows"),
    (xlsx_header_only, "sheet-empty", 3, "0 rows"),
    (xlsx_formulas, "formulas-without-results", 3, "B4"),
    (xlsx_cells_beside, "line-length-differs", 3, "row 4"),
    (xlsx_ids_twice, "repeated-ids", 3, "'S1'"),
    (xlsx_expands, "archive-expands", 3, "4.0 GiB"),
    (xlsx_entities, "archive-expands", 3, "entities"),
    (xlsx_broken_xml, "wrong-file-kind", 3, "Excel"),
    (xlsx_row_beyond_counting, "wrong-file-kind", 3, "rows"),
    (archive_bare, "wrong-file-kind", 3, "Excel"),
]


@pytest.mark.parametrize(
    ("make", "code", "exit_code", "named"), BAD, ids=[each[0].__name__ for each in BAD]
)
def test_a_spoiled_file_gives_one_sentence(tmp_path, make, code, exit_code, named):
    with pytest.raises(PanelkitError) as caught:
        read_cohort(make(tmp_path))
    assert caught.value.code == code
    assert caught.value.exit_code == exit_code
    assert named in str(caught.value)
    assert "matrix." in caught.value.where
    assert SENTENCE.match(str(caught.value)), str(caught.value)


def test_every_maker_is_in_the_table():
    """A maker that nobody calls would look like a test."""
    spoils = re.compile(r"^(parquet|feather|arrow|h5ad|hdf5|gct|mtx|xlsx|archive)_")
    makers = {name for name in globals() if spoils.match(name)}
    assert makers == {each[0].__name__ for each in BAD}


def test_numbers_that_cannot_be_unpacked(tmp_path):
    """The head is whole, a column is not: the damage shows when numbers are read."""
    path = tmp_path / "matrix.parquet"
    ids = [f"S{number}" for number in range(500)]
    values = np.random.default_rng(0).normal(size=(500, 4))
    made = pd.DataFrame(values, index=ids, columns=list("abcd"))
    made.to_parquet(path, compression="gzip", use_dictionary=False)
    damaged_inside(path, at=0.4, size=400)
    with pytest.raises(PanelkitError) as caught:
        read_cohort(path)
    assert caught.value.code == "wrong-file-kind"
