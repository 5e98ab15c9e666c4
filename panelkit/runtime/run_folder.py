"""The run folder: claimed once, written whole files at a time."""

import csv
import io
import json
import time
from collections.abc import Callable, Iterable, Mapping, Sequence
from decimal import Decimal
from pathlib import Path
from typing import Any

import numpy as np

from panelkit.errors import RunFolderError
from panelkit.runtime.blocks import FolderStore
from panelkit.runtime.files import write_whole

__all__ = ["RunFolder", "json_bytes"]

RECORD = "record.json"


def _cell(value: Any) -> str:
    """Return a table cell: floats so that they read back to the same bits."""
    if value is None:
        return ""
    if isinstance(value, bool | np.bool_):
        return "true" if value else "false"
    if isinstance(value, float | np.floating):
        return "" if np.isnan(value) else repr(float(value))
    if isinstance(value, Decimal):
        return format(value, "f")
    return str(value)


class RunFolder:
    """Where a run keeps its records.

    Parameters
    ----------
    path : Path
        The folder; made when needed.
    """

    def __init__(self, path: Path) -> None:
        self.path = path
        self._log: list[str] = []

    def claim(
        self, record: bytes, work: Callable[[bytes], bytes] | None = None
    ) -> bool:
        """Take the folder for the run that this record describes.

        Parameters
        ----------
        record : bytes
            The content of ``record.json``.
        work : callable, optional
            From a record to the part of it that finished blocks depend on; a run
            that differs elsewhere takes the folder over. None: all of it.

        Returns
        -------
        bool
            True when the folder holds an earlier attempt at the same run, or the
            same work for another purpose, whose finished blocks will be used.

        Raises
        ------
        RunFolderError
            The folder holds something else, or cannot be written.
        """
        kept = self.path / RECORD
        if self.path.exists() and not self.path.is_dir():
            raise RunFolderError(
                code="not-a-folder",
                where=str(self.path),
                what="a file of that name is there already",
                accepted="a folder that is new, empty, or holds this same run",
                next_step="Name another folder by --out",
            )
        if kept.exists():
            earlier = kept.read_bytes()
            if earlier == record:
                return True
            if work is not None and work(earlier) == work(record):
                self.write(RECORD, record)
                return True
            raise RunFolderError(
                code="run-folder-taken",
                where=str(self.path),
                what="it holds a run of another study, other data or other versions",
                accepted="a folder that is new, empty, or holds this same run",
                next_step="Name another folder by --out, or remove this one",
            )
        if self.path.exists() and any(self.path.iterdir()):
            raise RunFolderError(
                code="folder-not-empty",
                where=str(self.path),
                what="it is not empty and holds no run",
                accepted="a folder that is new, empty, or holds this same run",
                next_step="Name another folder by --out",
            )
        self.write(RECORD, record)
        return False

    def store(self) -> FolderStore:
        """Return the store of this run's finished blocks."""
        return FolderStore(self.path / "blocks")

    def write(self, name: str, content: bytes) -> None:
        """Write a file, whole or not at all.

        Raises
        ------
        RunFolderError
            It cannot be written.
        """
        with write_whole(self.path / name) as file:
            file.write(content)

    def json(self, name: str, content: Mapping[str, Any]) -> None:
        """Write a JSON file with sorted keys.

        Raises
        ------
        RunFolderError
            It cannot be written.
        """
        self.write(name, json_bytes(content))

    def table(
        self, name: str, header: Sequence[str], rows: Iterable[Sequence[Any]]
    ) -> None:
        """Write a CSV table; missing values are empty cells.

        Raises
        ------
        RunFolderError
            It cannot be written.
        """
        text = io.StringIO()
        writer = csv.writer(text, lineterminator="\n")
        writer.writerow(header)
        writer.writerows([_cell(value) for value in row] for row in rows)
        self.write(name, text.getvalue().encode())

    def log(self, line: str) -> None:
        """Add a line to ``run.log``, with the time.

        Raises
        ------
        RunFolderError
            It cannot be written.
        """
        self._log.append(f"{time.strftime('%Y-%m-%d %H:%M:%S')}  {line}\n")
        self.write("run.log", "".join(self._log).encode())


def json_bytes(content: Mapping[str, Any]) -> bytes:
    """Return a mapping as JSON with sorted keys; NaN is refused."""
    text = json.dumps(
        content, indent=2, sort_keys=True, ensure_ascii=False, allow_nan=False
    )
    return (text + "\n").encode()
