"""Input files before their content: there at all, of which kind, and their hash."""

import csv
import gzip
import hashlib
import io
import zlib
from collections.abc import Iterator
from contextlib import contextmanager
from itertools import islice
from pathlib import Path
from typing import BinaryIO, Literal, TextIO, cast

from panelkit.errors import InputDataError

__all__ = [
    "FileKind",
    "file_kind",
    "file_start",
    "open_text",
    "sha256",
    "sniff_delimiter",
]

FileKind = Literal["delimited", "hdf5"]

_GZIP = b"\x1f\x8b"
_HDF5 = b"\x89HDF\r\n\x1a\n"
_REFUSED = {
    b"PK\x03\x04": "a zip archive or an Excel workbook",
    b"\xd0\xcf\x11\xe0": "an old Excel workbook",
    b"PAR1": "a parquet file",
    b"\xff\xfe": "text in UTF-16",
    b"\xfe\xff": "text in UTF-16",
    b"BZh": "a bzip2 archive",
    b"\xfd7zXZ": "an xz archive",
}
_ACCEPTED = "tables are CSV or TSV in UTF-8 (plain or .gz), matrices also .h5ad"
_DELIMITERS = ("\t", ",", ";")


def file_kind(path: Path) -> FileKind:
    """Return what a file is by its content, whatever its name says.

    Parameters
    ----------
    path : Path
        The file.

    Returns
    -------
    {"delimited", "hdf5"}
        Plain and compressed text are both "delimited".

    Raises
    ------
    InputDataError
        When the file is missing, a folder, empty, unreadable or of another kind.
    """
    start = _first_bytes(path)
    if start.startswith(_HDF5):
        return "hdf5"
    if path.suffix.lower() in {".h5ad", ".h5"}:
        raise _wrong_content(path, "named like an HDF5 file but is none")
    for magic, name in _REFUSED.items():
        if start.startswith(magic):
            raise _wrong_content(path, name)
    if start.startswith(_GZIP):
        with _reading(path), gzip.open(path) as stream:
            start = stream.read(4096)
        if not start:
            raise _empty(path)
    if b"\0" in start:
        raise _wrong_content(path, "binary data (it holds zero bytes)")
    return "delimited"


def file_start(path: Path) -> bytes:
    """Return the first bytes of a file, after any compression.

    Parameters
    ----------
    path : Path
        The file.

    Returns
    -------
    bytes
        At most 4,096; empty when the compressed file holds nothing.

    Raises
    ------
    InputDataError
        When the file is missing, a folder, empty or unreadable.
    """
    start = _first_bytes(path)
    if start.startswith(_GZIP):
        with _reading(path), gzip.open(path) as stream:
            start = stream.read(4096)
    return start


def _first_bytes(path: Path) -> bytes:
    if path.is_dir():
        raise InputDataError(
            code="not-a-file",
            where=str(path),
            what="this is a folder",
            accepted="a file is needed",
            next_step="Name the file inside it",
        )
    if not path.exists():
        raise InputDataError(
            code="file-missing",
            where=str(path),
            what="there is no such file",
            accepted="the path of an existing file is needed",
            next_step="Check the path and the folder that it starts from",
        )
    with _reading(path), path.open("rb") as stream:
        start = stream.read(4096)
    if not start:
        raise _empty(path)
    return start


def _empty(path: Path) -> InputDataError:
    return InputDataError(
        code="file-empty",
        where=str(path),
        what="the file is empty (0 bytes)",
        accepted="a header line and data lines are needed",
        next_step="Export or copy the file again",
    )


def _wrong_content(path: Path, what: str) -> InputDataError:
    return InputDataError(
        code="wrong-file-kind",
        where=str(path),
        what=f"the file is {what}",
        accepted=_ACCEPTED,
        next_step="Save it in one of these formats",
    )


@contextmanager
def _reading(path: Path) -> Iterator[None]:
    """Turn every failure of reading bytes or text into one sentence."""
    try:
        yield
    except (EOFError, gzip.BadGzipFile, zlib.error) as error:
        raise InputDataError(
            code="archive-damaged",
            where=str(path),
            what="the compressed file is damaged or cut short",
            accepted="a complete gzip file is needed",
            next_step="Copy or compress the file again",
        ) from error
    except UnicodeDecodeError as error:
        raise _wrong_content(path, "not UTF-8 text") from error
    except OSError as error:
        raise InputDataError(
            code="file-unreadable",
            where=str(path),
            what=f"the file cannot be read ({error.strerror or error})",
            accepted="a readable file is needed",
            next_step="Check its permissions and the disk",
        ) from error


@contextmanager
def open_text(path: Path, newline: str | None = None) -> Iterator[TextIO]:
    """Open plain or compressed text; failures while it is open become one sentence.

    Parameters
    ----------
    path : Path
        A file of kind "delimited".
    newline : str or None
        As for `open`; the csv module wants ``""``.

    Yields
    ------
    TextIO
        The decoded text, without a byte order mark.

    Raises
    ------
    InputDataError
        When the text is not UTF-8 or the compressed file is damaged.
    """
    with _reading(path), path.open("rb") as raw:
        compressed = raw.read(2) == _GZIP
        raw.seek(0)
        opened = gzip.GzipFile(fileobj=raw) if compressed else raw
        stream = cast("BinaryIO", opened)
        with io.TextIOWrapper(stream, "utf-8-sig", newline=newline) as text:
            yield text


def sha256(path: Path) -> str:
    """Return the SHA-256 of a file's bytes, as hexadecimal text.

    Parameters
    ----------
    path : Path
        The file.

    Returns
    -------
    str
        64 hexadecimal digits.

    Raises
    ------
    InputDataError
        When the file cannot be read.
    """
    with _reading(path), path.open("rb") as stream:
        return hashlib.file_digest(stream, "sha256").hexdigest()


def sniff_delimiter(path: Path) -> str:
    """Return the delimiter that splits the first two lines alike.

    Parameters
    ----------
    path : Path
        A file of kind "delimited".

    Returns
    -------
    str
        Tab, comma or semicolon; a comma when none occurs.

    Raises
    ------
    InputDataError
        When the text cannot be read.
    """
    with open_text(path) as text:
        lines = list(islice((line for line in text if line.strip()), 2))

    def merit(delimiter: str) -> tuple[bool, int]:
        counts = [_count_fields(line, delimiter) for line in lines]
        # a header may lack the field above the row names
        alike = counts[-1] - counts[0] in (0, 1) and counts[-1] > 1
        return alike, counts[0]

    best = max(_DELIMITERS, key=merit) if lines else ","
    return best if lines and merit(best)[1] > 1 else ","


def _count_fields(line: str, delimiter: str) -> int:
    if '"' not in line:
        return line.count(delimiter) + 1
    return len(next(csv.reader([line], delimiter=delimiter)))
