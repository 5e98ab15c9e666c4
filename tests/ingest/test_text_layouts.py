"""Text as other programs and core facilities leave it: layouts, encodings, archives."""

import bz2
import csv
import gzip
import lzma

import numpy as np
import pandas as pd
import pyarrow as pa
import pytest

from panelkit.errors import InputDataError
from panelkit.ingest.cohort_reader import read_cohort
from panelkit.ingest.delimited import read_delimited_matrix
from panelkit.ingest.sheet import read_sheet

PLAIN = "id,a,b\nS1,1.5,-2\nS2,3,4e-3\n"
NUMBERS = [[1.5, -2.0], [3.0, 0.004]]


def zstd(content):
    return pa.Codec("zstd").compress(content, asbytes=True)


def written(tmp_path, content, name="m.csv"):
    path = tmp_path / name
    path.write_bytes(content if isinstance(content, bytes) else content.encode())
    return path


def table_of(tmp_path, content):
    return read_delimited_matrix(written(tmp_path, content), 10)


def codes(found):
    return [finding.code for finding in found.findings]


def is_plain(table):
    return (
        table.row_ids == ["S1", "S2"]
        and table.column_ids == ["a", "b"]
        and table.values.tolist() == NUMBERS
    )


@pytest.mark.parametrize("pack", [gzip.compress, bz2.compress, lzma.compress, zstd])
def test_compression_is_known_by_content_not_by_name(tmp_path, pack):
    table = table_of(tmp_path, pack(PLAIN.encode()))
    assert is_plain(table)
    assert table.findings == ()
    sheet = read_sheet(written(tmp_path, pack(b"sample_id,g\nS1,x\n")), "sample_id")
    assert sheet.columns["g"].tolist() == ["x"]


@pytest.mark.parametrize("pack", [gzip.compress, bz2.compress, lzma.compress, zstd])
def test_archives_of_several_members_are_read_to_the_end(tmp_path, pack):
    half = PLAIN.index("S2")
    content = pack(PLAIN[:half].encode()) + pack(PLAIN[half:].encode())
    assert is_plain(table_of(tmp_path, content))


@pytest.mark.parametrize(
    "codec", ["utf-8", "utf-8-sig", "utf-16", "utf-32", "cp1252", "latin-1"]
)
def test_encodings(tmp_path, codec):
    text = PLAIN.replace("a", "ä").replace("S1", "Zoë")
    table = table_of(tmp_path, text.encode(codec))
    assert table.row_ids == ["Zoë", "S2"]
    assert table.column_ids == ["ä", "b"]
    assert table.values.tolist() == NUMBERS
    assumed = codec in ("cp1252", "latin-1")
    assert codes(table) == (["encoding-assumed"] if assumed else [])
    sheet = read_sheet(written(tmp_path, "sample_id\tø\nS1\té\n".encode(codec)), "x")
    assert sheet.columns["ø"].tolist() == ["é"]
    assert codes(sheet) == codes(table)


def test_what_a_fallback_encoding_says(tmp_path):
    table = table_of(tmp_path, "id,a,b\nS1,1,2\nGr\u20acn,3,4\n".encode("cp1252"))
    assert table.row_ids[1] == "Gr€n"
    [finding] = table.findings
    assert "byte 0x80 on line 3" in finding.message
    assert "Windows-1252" in finding.message
    latin = table_of(tmp_path, b"id,a,b\nS1,1,2\nGr\x81n,3,4\n")  # undefined in 1252
    assert latin.row_ids[1] == "Gr\x81n"
    assert "Latin-1" in latin.findings[0].message


def test_a_byte_that_is_no_utf8_far_down_is_found(tmp_path):
    body = "".join(f"S{row},{row}.25,7\n" for row in range(200_000))
    table = table_of(tmp_path, ("id,a,b\n" + body).encode() + b"\xe9,1,2\n")
    assert table.row_ids[-1] == "é"
    assert len(table.row_ids) == 200_001
    assert table.values[:200_000, 0].tolist() == [row + 0.25 for row in range(200_000)]
    assert "on line 200002" in table.findings[0].message


@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
def test_line_ends(tmp_path, end):
    assert is_plain(table_of(tmp_path, PLAIN.replace("\n", end)))
    assert is_plain(table_of(tmp_path, PLAIN.replace("\n", end).removesuffix(end)))


def test_characters_that_only_python_takes_for_line_ends(tmp_path):
    names = ["a\x0bb", "a\x0cb", "a\x85b", "a\u2028b"]
    table = table_of(tmp_path, "id," + ",".join(names) + "\nS1,1,2,3,4\n")
    assert table.column_ids == names


@pytest.mark.parametrize("codec", ["utf-8", "utf-16"])
def test_zero_bytes_at_the_end_are_left_out_and_said(tmp_path, codec):
    table = table_of(tmp_path, (PLAIN + "\0" * 5000).encode(codec))
    assert is_plain(table)
    assert codes(table) == ["zero-bytes-at-end"]
    assert "5,000 zero bytes" in table.findings[0].message


@pytest.mark.parametrize(
    "before",
    [
        "# exported\n# by, hand, twice\n",
        "!Series\n!Sample_title,x,y\n",
        "Results of the core facility\n\n",
        "Results,,\n,,\n",
        "Plate 7,12 March\n",
    ],
)
def test_lines_before_the_header_are_skipped_and_said(tmp_path, before):
    table = table_of(tmp_path, before + PLAIN)
    assert is_plain(table)
    assert codes(table) == ["lines-skipped"]
    assert before.split("\n")[0] in table.findings[0].message


def test_a_series_with_its_closing_line(tmp_path):
    # the layout of GEO's series matrix files, as published by NCBI
    text = '!Series_title\t"x"\n!Sample_title\t"p"\t"q"\n!table_begin\n'
    text += '"ID_REF"\t"a"\t"b"\n"S1"\t1.5\t-2\n"S2"\t3\t4e-3\n!table_end\n'
    table = table_of(tmp_path, text)
    assert is_plain(table)
    assert "4 lines are" in table.findings[0].message


def test_a_header_behind_a_comment_mark_is_a_header(tmp_path):
    table = table_of(tmp_path, "# by hand\n#id\ta\tb\nS1\t1.5\t-2\nS2\t3\t4e-3\n")
    assert is_plain(table)
    sheet = read_sheet(written(tmp_path, "#sample_id,g\nS1,x\nS2,y\n"), "sample_id")
    assert sheet.ids.tolist() == ["S1", "S2"]


@pytest.mark.parametrize(
    "text",
    [
        "id,a,b,\nS1,1.5,-2,\nS2,3,4e-3,\n",
        "id,a,b,,\nS1,1.5,-2,,\nS2,3,4e-3,,\n",
        "id,a,b\nS1,1.5,-2,\nS2,3,4e-3,\n",
        "id,a,b\nS1,1.5,-2\nS2,3,4e-3,,,\n,,,\n",
    ],
)
def test_delimiters_at_the_end_of_lines_are_no_columns(tmp_path, text):
    table = table_of(tmp_path, text)
    assert is_plain(table)
    assert codes(table) == ["delimiters-at-line-end"]


def test_trailing_delimiters_of_the_header_alone(tmp_path):
    assert is_plain(table_of(tmp_path, PLAIN.replace("b\n", "b,,\n")))


def test_missing_last_column_is_a_column(tmp_path):
    table = table_of(tmp_path, "id,a,b\nS1,1,\nS2,2,\n")
    assert table.column_ids == ["a", "b"]
    assert np.isnan(table.values[:, 1]).all()
    without_corner = table_of(tmp_path, "a,b\nS1,1,\nS2,2,3\n")
    assert without_corner.column_ids == ["a", "b"]
    assert without_corner.values[1].tolist() == [2, 3]


def test_header_cut_short_is_not_taken_for_a_title(tmp_path):
    with pytest.raises(InputDataError) as caught:
        table_of(tmp_path, "id,a\nS1,1,2,3\nS2,4,5,6\n")
    assert caught.value.code == "line-length-differs"


@pytest.mark.parametrize("delimiter", [";", "\t"])
def test_decimal_commas_are_read_and_said(tmp_path, delimiter):
    text = f"id{delimiter}a{delimiter}b\nS1{delimiter}1,5{delimiter}-2\n"
    text += f'S2{delimiter}3{delimiter}"4,0E-3"\n'
    table = table_of(tmp_path, text)
    assert is_plain(table)
    [finding] = table.findings
    assert finding.code == "decimal-comma-read"
    assert "'1,5' as 1.5" in finding.message


def test_points_beside_decimal_commas_are_refused_cell_by_cell(tmp_path):
    text = "id;a;b\nS1;1,5;1.234,5\nS2;2,25;1.234\nS3;0,125;1,234,5\n"
    table = table_of(tmp_path, text)
    assert table.values[:, 0].tolist() == [1.5, 2.25, 0.125]
    assert np.isnan(table.values[:, 1]).all()
    assert [cell.text for cell in table.bad_cells.cells] == [
        "1.234,5",
        "1.234",
        "1,234,5",
    ]


def test_commas_before_three_digits_throughout_are_not_guessed(tmp_path):
    with pytest.raises(InputDataError) as caught:
        table_of(tmp_path, "id\ta\tb\nS1\t1,234\t12,500\nS2\t7\t99,001\n")
    assert caught.value.code == "decimal-mark-ambiguous"
    assert "'1,234'" in caught.value.what
    # one number with other digits settles it, wherever it stands
    body = "".join(f"S{row}\t1,{row % 900 + 100}\t7\n" for row in range(90_000))
    table = table_of(tmp_path, "id\ta\tb\n" + body + "T\t0,5\t7\n")
    assert table.values[0, 0] == 1.1
    assert table.values[-1, 0] == 0.5


def test_a_comma_in_a_file_of_points_is_a_bad_cell(tmp_path):
    table = table_of(tmp_path, "id\ta\tb\nS1\t1.5\t2.5\nS2\t1,5\t2.5\n")
    assert [cell.text for cell in table.bad_cells.cells] == ["1,5"]
    assert "decimal-comma-read" not in codes(table)


def test_commas_of_columns_in_a_sheet(tmp_path):
    text = "sample_id;age;dose;note\nS1;45,5;1,000;a,b\nS2;;2,000;1,5\nS3;51;3,000;c\n"
    sheet = read_sheet(written(tmp_path, text), "sample_id")
    assert sheet.columns["age"].tolist() == ["45.5", "", "51"]
    assert sheet.columns["dose"].tolist() == ["1,000", "2,000", "3,000"]  # ambiguous
    assert sheet.columns["note"].tolist() == ["a,b", "1,5", "c"]
    [finding] = sheet.findings
    assert finding.code == "decimal-comma-read"
    assert "'age'" in finding.message


def test_sheets_have_titles_comments_and_trailing_delimiters_too(tmp_path):
    text = "Our study\n# note\nsample_id,g,\nS1,x,\nS2,y,\n#end\n"
    sheet = read_sheet(written(tmp_path, text), "sample_id")
    assert sheet.ids.tolist() == ["S1", "S2"]
    assert list(sheet.columns) == ["g"]
    assert codes(sheet) == ["lines-skipped", "delimiters-at-line-end"]
    assert "3 lines are" in sheet.findings[0].message


def test_a_quoted_field_of_a_sheet_may_hold_line_ends(tmp_path):
    text = 'sample_id,g\nS1,"two\r\nlines"\nS2,y\n'
    sheet = read_sheet(written(tmp_path, text), "sample_id")
    assert sheet.columns["g"].tolist() == ["two\nlines", "y"]
    open_end = 'sample_id,g\nS1,x\nS2,"never\nclosed\nS3,y\n'
    with pytest.raises(InputDataError) as caught:
        read_sheet(written(tmp_path, open_end), "sample_id")
    assert caught.value.where == "m.csv, line 3"


def test_findings_of_files_reach_the_cohort(small):
    expression, samples = small.write(sep=";", decimal=",", encoding="utf-16")
    samples.write_bytes(b"# caf\xe9\n" + samples.read_bytes())
    cohort = read_cohort(expression, samples, outcome="group", positive="case")
    assert np.array_equal(cohort.X, small.matrix.to_numpy())
    assert {"encoding-assumed", "lines-skipped", "decimal-comma-read"} <= set(
        codes(cohort)
    )


def test_numbers_beyond_single_precision_are_named(tmp_path):
    text = "id,a,b\nS1,1e300,2\nS2,-3.5e38,4\nS3,3.4e38,1e-300\n"
    cohort = read_cohort(written(tmp_path, text))
    [finding] = [each for each in cohort.findings if each.code == "value-beyond-range"]
    assert "2 cells hold" in finding.message
    assert "row 'S1', column 'a': '1e300'" in finding.message
    assert np.isnan(cohort.X[:2, 0]).all()
    assert cohort.X[2].tolist() == [3.4e38, 1e-300]
    frame = pd.DataFrame([[1e300, 2.0], [3.0, 4.0]], ["S1", "S2"], ["a", "b"])
    assert "value-beyond-range" in codes(read_cohort(frame))


@pytest.mark.parametrize("sep", [",", ";", "\t"])
@pytest.mark.parametrize(
    "quoting", [csv.QUOTE_MINIMAL, csv.QUOTE_ALL, csv.QUOTE_NONNUMERIC]
)
@pytest.mark.parametrize("form", [None, "%.3f", "%.17g", "%12.4f", "%+.2e"])
@pytest.mark.parametrize("lineterminator", ["\n", "\r\n"])
@pytest.mark.parametrize("na_rep", ["", "NA", " ", "NULL"])
def test_files_of_pandas_in_many_options(
    tmp_path, small, sep, quoting, form, lineterminator, na_rep
):
    matrix = small.matrix.mask(np.random.default_rng(1).random((24, 6)) < 0.2)
    path = tmp_path / "m.txt"
    matrix.to_csv(
        path,
        sep=sep,
        quoting=quoting,
        float_format=form,
        lineterminator=lineterminator,
        na_rep=na_rep,
    )
    table = read_delimited_matrix(path, 0)
    digits = matrix.map(lambda value: float((form or "%r") % value))
    assert np.array_equal(table.values, digits.to_numpy(), equal_nan=True)
    assert table.row_ids == list(matrix.index)
    assert table.column_ids == list(matrix.columns)


@pytest.mark.parametrize(
    ("compression", "encoding"),
    [
        (compression, encoding)
        for compression in ("gzip", "bz2", "xz", None)
        for encoding in ("utf-8", "utf-8-sig", "utf-16", "cp1252")
        # pandas writes no byte order mark there, as it warns
        if not (encoding == "utf-16" and compression in ("bz2", "xz"))
    ],
)
@pytest.mark.parametrize("sep", [";", "\t"])
@pytest.mark.parametrize("index_label", [None, False])
def test_files_of_pandas_with_decimal_commas(
    tmp_path, small, compression, encoding, sep, index_label
):
    small.matrix.columns = ["ä", "b;", "c,d", 'e"f', "g", "h i"]
    path = tmp_path / "m"
    small.matrix.to_csv(
        path,
        sep=sep,
        decimal=",",
        encoding=encoding,
        compression=compression,
        index_label=index_label,
    )
    table = read_delimited_matrix(path, 0)
    assert np.array_equal(table.values, small.matrix.to_numpy())
    assert table.column_ids == list(small.matrix.columns)
    assert table.row_ids == list(small.matrix.index)
