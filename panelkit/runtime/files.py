"""Files that appear whole or not at all."""

import hashlib
import os
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import IO

from panelkit.errors import RunFolderError

__all__ = ["hash_of_file", "write_whole"]


@contextmanager
def write_whole(path: Path) -> Iterator[IO[bytes]]:
    """Open a file for writing that takes its name only when it is complete.

    Parameters
    ----------
    path : Path
        The final name; missing folders are made.

    Yields
    ------
    binary file
        A temporary file in the same folder, synced and renamed at the end.

    Raises
    ------
    RunFolderError
        The folder or the file cannot be written.
    """
    temporary: str | None = None
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        handle, temporary = tempfile.mkstemp(dir=path.parent, prefix=".unfinished-")
        with os.fdopen(handle, "wb") as file:
            yield file
            file.flush()
            os.fsync(file.fileno())
        Path(temporary).chmod(0o644)
        Path(temporary).replace(path)
        temporary = None
    except OSError as error:
        raise RunFolderError(
            code="cannot-write",
            where=str(path),
            what=f"cannot be written ({error.strerror or error})",
            accepted="a folder that can be written, with space left",
            next_step="Free space or name another folder by --out, then run again",
        ) from error
    finally:
        if temporary is not None:
            Path(temporary).unlink(missing_ok=True)


def hash_of_file(path: Path) -> str:
    """Return the SHA-256 of a file's bytes, hexadecimal."""
    with path.open("rb") as file:
        return hashlib.file_digest(file, "sha256").hexdigest()
