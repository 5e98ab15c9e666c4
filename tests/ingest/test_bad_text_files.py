"""Spoiled text files: one clear sentence and exit code 3 each, in bounded memory."""

import bz2
import gzip
import io
import lzma
import os
import resource
import subprocess
import sys
import tarfile
import zipfile

import pyarrow as pa
import pytest

from panelkit.errors import InputDataError
from panelkit.ingest.cohort_reader import read_cohort
from panelkit.ingest.delimited import read_delimited_matrix

TABLE = b"id,a,b\n" + b"".join(b"S%d,%d.5,%d\n" % (n, n, n * n) for n in range(3000))
MIB = 2**20


def zstd(content):
    return pa.Codec("zstd").compress(content, asbytes=True)


def tar(content):
    packed = io.BytesIO()
    with tarfile.open(fileobj=packed, mode="w") as archive:
        entry = tarfile.TarInfo("m.csv")
        entry.size = len(content)
        archive.addfile(entry, io.BytesIO(content))
    return packed.getvalue()


def zipped(content):
    packed = io.BytesIO()
    with zipfile.ZipFile(packed, "w") as archive:
        archive.writestr("m.csv", content)
    return packed.getvalue()


def flipped(content):
    middle = len(content) // 2
    return content[:middle] + bytes(255 - byte for byte in content[middle:])


def mixed():
    lines = TABLE.splitlines(keepends=True)
    return b"".join(lines[:2000] + [line.replace(b",", b";") for line in lines[2000:]])


def glued():
    return b"id,a,b\n" + TABLE[:5000].rsplit(b"\n", 1)[0] + b"\n" + TABLE


HEADER = b"id," + b",".join(b"g%d" % n for n in range(200)) + b"\n"
UNITS = b"unit," + b",".join([b"ng/ml"] * 200) + b"\n"
WIDE = b"S1," + b",".join([b"1.5"] * 200) + b"\n"

BAD = {
    "empty": (b"", "file-empty", "0 bytes"),
    "empty inside gzip": (gzip.compress(b""), "file-empty", "0 bytes"),
    "zero bytes only": (b"\0" * 9000, "wrong-file-kind", "zero bytes"),
    "blank lines only": (b"\n \n\r\n", "no-data-lines", "blank lines only"),
    "comments only": (b"# a,b\n# c,d\n", "no-data-lines", "comment lines only"),
    "header only": (b"id,a,b\n", "no-data-lines", "a header only"),
    "header and comments": (b"# x\nid,a,b\n#end\n", "no-data-lines", "a header only"),
    "one column": (b"id\nS1\nS2\n", "one-column-only", "'id'"),
    "another delimiter": (b"id|a|b\nS1|1|2\n", "one-column-only", "'id|a|b'"),
    "blanks as delimiter": (b"id a b\nS1 1 2\n", "one-column-only", "comma, tab"),
    "cut inside a line": (TABLE[:-12], "line-length-differs", "line 3001"),
    "one field more": (TABLE + b"X,1,2,3\n", "line-length-differs", "line 3002"),
    "mixed delimiters": (mixed(), "line-length-differs", "line 2001"),
    "header cut short": (
        b"id,a\nS1,1,2,3\nS2,1,2,3\n",
        "line-length-differs",
        "line 2",
    ),
    "header repeated": (glued(), "repeated-ids", "'id'"),
    "two header lines": (HEADER + UNITS + WIDE, "text-everywhere", "'ng/ml'"),
    "text matrix": (TABLE.replace(b".5", b" high"), "text-everywhere", "'0 high'"),
    "unclosed quote": (TABLE + b'"X,1,2\n' + TABLE[7:], "quotes-unbalanced", "3002"),
    "quote in the middle": (TABLE + b'X,1"2,"3"4\n', "quotes-unbalanced", "3002"),
    "repeated rows": (TABLE + b"S7,1,2\n", "repeated-ids", "'S7'"),
    "repeated columns": (b"id,a,a\nS1,1,2\nS2,3,4\n", "repeated-ids", "'a'"),
    "blank id": (TABLE + b" ,1,2\n", "blank-id", "sample"),
    "column without a name": (b"id,,b\nS1,1,2\nS2,3,4\n", "blank-id", "feature"),
    "thousands": (
        b"id;a\nS1;1,234\nS2;2,345\n",
        "decimal-mark-ambiguous",
        "'1,234'",
    ),
    "zero byte inside": (
        TABLE + b"X,1\0,2\nY,3,4\n",
        "zero-byte-inside",
        "line 3002",
    ),
    "control characters": (
        b"id,a\nS1,\x02\x03\n",
        "wrong-file-kind",
        "control characters",
    ),
    "random bytes": (bytes(range(256)) * 40, "wrong-file-kind", "binary data"),
    "utf-16 without a mark": (
        TABLE.decode().encode("utf-16-be"),
        "wrong-file-kind",
        "byte order mark",
    ),
    "utf-16 cut": (TABLE.decode().encode("utf-16")[:-3] + b"\xd8", "text-damaged", ""),
    "pdf": (b"%PDF-1.7 id,a\nS1,1\n", "wrong-file-kind", "PDF"),
    "web page": (b"<!DOCTYPE html>\n<p>log in</p>\n", "wrong-file-kind", "web page"),
    "zip": (zipped(TABLE), "wrong-file-kind", "zip archive"),
    "tar": (tar(TABLE), "wrong-file-kind", "tar archive"),
    "tar.gz": (gzip.compress(tar(TABLE)), "wrong-file-kind", "tar archive"),
    "gzip in gzip": (
        gzip.compress(gzip.compress(TABLE)),
        "wrong-file-kind",
        "inside a compressed file",
    ),
    **{
        f"{spoilt} {name}": (content, "archive-damaged", "damaged or cut short")
        for name, pack in (
            ("gzip", gzip.compress),
            ("bzip2", bz2.compress),
            ("xz", lzma.compress),
            ("zstd", zstd),
        )
        for spoilt, content in (
            ("truncated", pack(TABLE)[:-9]),
            ("damaged", flipped(pack(TABLE))),
        )
    },
}


@pytest.mark.parametrize(("content", "code", "named"), BAD.values(), ids=BAD)
def test_bad_files_give_one_sentence(tmp_path, content, code, named):
    path = tmp_path / "expression.csv"
    path.write_bytes(content)
    with pytest.raises(InputDataError) as caught:
        read_cohort(path)
    error = caught.value
    assert error.code == code
    assert error.exit_code == 3
    assert named in str(error)
    assert "expression.csv" in error.where
    assert "\n" not in str(error)
    assert len(str(error)) < 600


@pytest.mark.parametrize(
    ("content", "code", "named"),
    [
        (b"# only\n", "no-data-lines", "blank lines only"),
        (b"sample_id,g\nS1,x\nS2,y,z\n", "line-length-differs", "line 3, data row 2"),
        (b'sample_id,g\n"S1,x\n' + b"S,y\n" * 99999, "quotes-unbalanced", "line 2"),
        (b"sample_id,g\nS1,x\0y\nS2,z\n", "wrong-file-kind", "zero bytes"),
        (gzip.compress(TABLE)[:-9], "archive-damaged", "cut short"),
        (tar(TABLE), "wrong-file-kind", "tar archive"),
    ],
)
def test_bad_sheets_give_one_sentence(small, content, code, named):
    expression, samples = small.write()
    samples.write_bytes(content)
    with pytest.raises(InputDataError) as caught:
        read_cohort(expression, samples)
    assert caught.value.code == code
    assert named in str(caught.value)
    assert "samples.csv" in caught.value.where


def test_pipes_devices_and_folders_do_not_hang(tmp_path):
    pipe = tmp_path / "pipe.csv"
    os.mkfifo(pipe)
    for path in (pipe, tmp_path, "/dev/zero"):
        with pytest.raises(InputDataError) as caught:
            read_cohort(path)
        assert caught.value.code == "not-a-file"


READ = """
import resource, sys
import pandas, pyarrow.compute
from panelkit.errors import InputDataError
from panelkit.ingest.cohort_reader import read_cohort
before = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
try:
    read_cohort(sys.argv[1])
except InputDataError as error:
    print(error.code)
    print(error)
    print((resource.getrusage(resource.RUSAGE_SELF).ru_maxrss - before) // 1024)
"""


def bomb(kind):
    """Return an archive of about 2 MiB that holds a table of 300 MB and more."""
    line = b"S1" + b",0" * 500 + b"\n"
    block = b"id" + b",a" * 500 + b"\n" + line * 1000
    pack = {"gzip": gzip, "bzip2": bz2, "xz": lzma}.get(kind)
    packed = zstd(line * 20_000) if pack is None else pack.compress(line * 20_000)
    first = zstd(block) if pack is None else pack.compress(block)
    return first + packed * 20  # members one after the other


BOMBS = {
    **{
        f"{kind} bomb": (lambda kind=kind: bomb(kind), "archive-expands-too-far")
        for kind in ("gzip", "zstd", "bzip2", "xz")
    },
    "one huge line": (lambda: b"id,a\nS1," + b"1" * (140 * MIB), "line-too-long"),
    "ten million columns": (
        lambda: b"id" + b",gene" * 10_000_000 + b"\nS1" + b",1" * 10_000_000,
        "too-many-columns",
    ),
    "a line of delimiters": (
        lambda: b"id,a\nS1,1\n" * 40 + b"," * (50 * MIB) + b"1\n",
        "line-length-differs",
    ),
}
SLOW = {"bzip2 bomb", "xz bomb"}  # the limit is that of the others


@pytest.mark.skipif(sys.platform != "linux", reason="ru_maxrss counts in KiB on Linux")
@pytest.mark.parametrize(
    ("make", "code"),
    [
        pytest.param(*case, id=name, marks=[pytest.mark.slow] * (name in SLOW))
        for name, case in BOMBS.items()
    ],
)
def test_files_made_to_fill_memory(tmp_path, make, code):
    path = tmp_path / "m.csv"
    path.write_bytes(make())
    done = subprocess.run(
        [sys.executable, "-c", READ, str(path)],
        capture_output=True,
        check=True,
        text=True,
        timeout=300,
        preexec_fn=lambda: resource.setrlimit(resource.RLIMIT_CORE, (0, 0)),
    )
    found, sentence, mib = done.stdout.splitlines()
    assert found == code
    assert "m.csv" in sentence
    assert len(sentence) < 600
    assert int(mib) < 1000


def test_small_files_may_shrink_as_far_as_they_like(tmp_path):
    path = tmp_path / "m.csv.xz"
    content = b"id,a,b\n" + b"S,0,0\n" * 1_000_000
    path.write_bytes(lzma.compress(content, preset=0))
    assert len(content) > 1000 * path.stat().st_size
    assert read_delimited_matrix(path, 0).values.shape == (1_000_000, 2)
