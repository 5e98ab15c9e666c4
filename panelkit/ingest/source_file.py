"""Input files before their content: there at all, of which kind, and their hash."""

import hashlib
import io
import stat
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any, BinaryIO, Literal, TextIO, cast

from panelkit.errors import InputDataError
from panelkit.ingest.compression import (
    ByteReader,
    compression_of,
    open_bytes,
    reading,
)
from panelkit.ingest.text_lines import encoding_of

__all__ = ["FileKind", "file_kind", "file_start", "open_text", "sha256"]

FileKind = Literal["delimited", "hdf5"]

_HDF5 = b"\x89HDF\r\n\x1a\n"
_REFUSED = {
    b"PK\x03\x04": "a zip archive or an Excel workbook",
    b"\xd0\xcf\x11\xe0": "an old Excel workbook",
    b"PAR1": "a parquet file",
    b"7z\xbc\xaf\x27\x1c": "a 7z archive",
    b"Rar!": "a rar archive",
    b"\x1f\x9d": "compressed by compress (.Z)",
    b"%PDF": "a PDF document",
    b"RDX": "an R data file",
    b"<!DOCTYPE": "a web page",
    b"<!doctype": "a web page",
    b"<html": "a web page",
    b"<?xml": "an XML document",
}
_ACCEPTED = "tables are CSV or TSV (plain, .gz, .bz2, .xz or .zst), matrices also .h5ad"
_WIDE_MARKS = (b"\xff\xfe", b"\xfe\xff", b"\0\0\xfe\xff")
_CONTROLS = bytes({*range(32)} - {*b"\0\t\n\v\f\r\x1a\x1b"})
_START = 4096


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
    if compression_of(start):
        start = file_start(path)
        if not start:
            raise _empty(path)
        if start.startswith(_HDF5) or compression_of(start):
            inside = "an HDF5 file" if start.startswith(_HDF5) else "a compressed file"
            raise _wrong_content(path, f"{inside} inside a compressed file")
    _refuse_other_content(path, start)
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
    if compression_of(start):
        with open_bytes(path) as stream:
            start = stream.read(_START)
    return start


def _refuse_other_content(path: Path, start: bytes) -> None:
    for magic, name in _REFUSED.items():
        if start.startswith(magic):
            raise _wrong_content(path, name)
    if start[257:262] == b"ustar":
        raise _wrong_content(path, "a tar archive")
    if start.startswith(_WIDE_MARKS):
        return  # UTF-16 or UTF-32, in which zero bytes are usual
    text = start.rstrip(b"\0")  # zero bytes at the end of a text are left out
    if b"\0" in text or not text:
        wide = text[1:20:2].strip(b"\0") == b"" or text[0:20:2].strip(b"\0") == b""
        hint = ", like UTF-16 without a byte order mark" if text and wide else ""
        raise _wrong_content(path, f"binary data (it holds zero bytes{hint})")
    if any(byte in text for byte in _CONTROLS):
        raise _wrong_content(path, "binary data (it holds control characters)")


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
    with reading(path):
        if not stat.S_ISREG(path.stat().st_mode):
            raise InputDataError(
                code="not-a-file",
                where=str(path),
                what="this is a pipe or a device, which can be read only once",
                accepted="a regular file is needed",
                next_step="Save its content in a file first",
            )
        with path.open("rb") as stream:
            start = stream.read(_START)
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
        When the text or the compressed file is damaged.
    """
    encoding = encoding_of(path)
    with open_bytes(path) as opened:
        raw = io.BufferedReader(cast("io.RawIOBase", _Raw(opened)))
        stream = cast("BinaryIO", raw)
        with io.TextIOWrapper(stream, encoding.codec, newline=newline) as text:
            yield text


class _Raw(io.RawIOBase):
    """Blocks of bytes as what the standard library's text layer reads."""

    def __init__(self, opened: ByteReader) -> None:
        self._opened = opened

    def readable(self) -> bool:
        return True

    def readinto(self, buffer: Any, /) -> int:
        block = self._opened.read(len(buffer))
        buffer[: len(block)] = block
        return len(block)


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
    with reading(path), path.open("rb") as stream:
        return hashlib.file_digest(stream, "sha256").hexdigest()
