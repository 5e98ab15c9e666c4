"""Bytes of plain and compressed files, with a limit to how far they may expand."""

import bz2
import gzip
import lzma
import zlib
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Protocol

from panelkit.errors import InputDataError

__all__ = ["BLOCK", "ByteReader", "compression_of", "open_bytes", "reading"]

BLOCK = 1 << 20
"""Bytes read at a time: small enough to stay in the processor's cache."""

MOST_EXPANSION = 100
"""Tables of measurements shrink 2 to 40 times, archives made to fill memory more."""

ALWAYS_EXPANDED = 100 * 2**20
"""Bytes below which no archive is refused."""

MOST_EXPANDED = 64 * 2**30
"""Bytes that no archive may exceed: 2,000 people x 1,000,000 features need 30 GiB."""

_MAGIC = {
    b"\x1f\x8b": "gzip",
    b"BZh": "bzip2",
    b"\xfd7zXZ\x00": "xz",
    b"\x28\xb5\x2f\xfd": "zstd",
}


class ByteReader(Protocol):
    """What can be read in blocks."""

    def read(self, size: int, /) -> bytes:
        """Return at most `size` bytes, none at the end."""
        ...


def compression_of(start: bytes) -> str | None:
    """Return the compression that a file's first bytes show.

    Parameters
    ----------
    start : bytes
        At least the first six of the file.

    Returns
    -------
    {"gzip", "bzip2", "xz", "zstd"} or None
        None for anything else.
    """
    for magic, name in _MAGIC.items():
        if start.startswith(magic):
            return name
    return None


@contextmanager
def reading(path: Path) -> Iterator[None]:
    """Turn every failure of reading bytes into one sentence.

    Parameters
    ----------
    path : Path
        The file.

    Yields
    ------
    None
        While the file is read.

    Raises
    ------
    InputDataError
        When a compressed file is damaged or the file cannot be read.
    """
    try:
        yield
    except (EOFError, gzip.BadGzipFile, zlib.error, lzma.LZMAError) as error:
        raise _damaged(path) from error
    except OSError as error:
        if error.errno is None:  # bz2 and zstd word their failures so
            raise _damaged(path) from error
        raise InputDataError(
            code="file-unreadable",
            where=str(path),
            what=f"the file cannot be read ({error.strerror or error})",
            accepted="a readable file is needed",
            next_step="Check its permissions and the disk",
        ) from error


def _damaged(path: Path) -> InputDataError:
    return InputDataError(
        code="archive-damaged",
        where=str(path),
        what="the compressed file is damaged or cut short",
        accepted="a complete gzip, bzip2, xz or zstd file is needed",
        next_step="Copy or compress the file again",
    )


@contextmanager
def open_bytes(path: Path) -> Iterator[ByteReader]:
    """Open a file for reading in blocks, expanded when it is compressed.

    Parameters
    ----------
    path : Path
        A regular file.

    Yields
    ------
    ByteReader
        The plain bytes.

    Raises
    ------
    InputDataError
        When the file cannot be read, is damaged, or expands beyond the limits.
    """
    with reading(path), path.open("rb") as raw:
        kind = compression_of(raw.read(6))
        raw.seek(0)
        if kind is None:
            yield raw
        elif kind == "gzip":
            yield _Expanding(gzip.GzipFile(fileobj=raw), path)
        elif kind == "bzip2":
            yield _Expanding(bz2.BZ2File(raw), path)
        elif kind == "xz":
            with lzma.LZMAFile(raw) as stream:
                yield _Expanding(stream, path)
        else:
            import pyarrow as pa  # slow to import; brings zstd on every Python

            if not pa.Codec.is_available("zstd"):
                raise InputDataError(
                    code="compression-not-available",
                    where=str(path),
                    what="the file is compressed by zstd, which the installed pyarrow "
                    "cannot read",
                    accepted="a pyarrow with zstd is needed, or gzip, bzip2 or xz",
                    next_step="Install pyarrow from PyPI or conda-forge, or compress "
                    "the file by gzip",
                )
            yield _Expanding(pa.CompressedInputStream(raw, "zstd"), path)


class _Expanding:
    """Counts what comes out of an archive and stops at the limits."""

    def __init__(self, stream: ByteReader, path: Path) -> None:
        self._stream = stream
        self._path = path
        self._packed = path.stat().st_size
        self._expanded = 0

    def read(self, size: int, /) -> bytes:
        block = self._stream.read(size)
        self._expanded += len(block)
        if self._expanded > ALWAYS_EXPANDED:
            self._check()
        return block

    def _check(self) -> None:
        limit = min(MOST_EXPANDED, MOST_EXPANSION * self._packed)
        if self._expanded > max(limit, ALWAYS_EXPANDED):
            raise InputDataError(
                code="archive-expands-too-far",
                where=str(self._path),
                what=f"the compressed file of {self._packed:,} bytes holds more than "
                f"{max(limit, ALWAYS_EXPANDED):,} bytes",
                accepted=f"a compressed file may expand {MOST_EXPANSION} times (any up "
                f"to {ALWAYS_EXPANDED >> 20} MiB) and to {MOST_EXPANDED >> 30} GiB",
                next_step="Look into the file; expand it yourself if it is meant so",
            )
