"""The file in which every opening of rows set aside is recorded, as a hash chain."""

import json
import os
import time
from collections.abc import Iterable, Iterator
from contextlib import contextmanager
from dataclasses import asdict, fields
from pathlib import Path

from panelkit.errors import InputDataError, UsageError
from panelkit.records import Opening
from panelkit.runtime import write_whole

__all__ = ["read_openings", "record_opening"]

WAIT_S = 10.0
"""How long another process may take to record its own opening."""


def read_openings(path: "str | os.PathLike[str]") -> tuple[Opening, ...]:
    """Return every opening recorded so far, after the chain was checked.

    Parameters
    ----------
    path : path
        The openings file: JSON, an opening a line. It need not exist yet.

    Returns
    -------
    tuple of Opening
        In order; empty when there is no file.

    Raises
    ------
    InputDataError
        When a line is no opening, or was changed, removed or put in.
    """
    file = Path(path)
    if not file.exists():
        return ()
    found: list[Opening] = []
    try:
        lines = file.read_text(encoding="utf-8").splitlines()
    except (OSError, UnicodeDecodeError) as error:
        raise _broken(file, 1, "the file cannot be read") from error
    for number, line in enumerate(lines, 1):
        opening = _opening(file, number, line)
        before = found[-1] if found else None
        expected = Opening.of((), "", before)
        if (opening.number, opening.previous_sha256) != (
            expected.number,
            expected.previous_sha256,
        ):
            raise _broken(file, number, "it does not follow the line before it")
        found.append(opening)
    return tuple(found)


def record_opening(
    path: "str | os.PathLike[str]", ids: Iterable[str], reason: str
) -> tuple[Opening, ...]:
    """Append an opening to the file and return all of them.

    Parameters
    ----------
    path : path
        The openings file; made when it does not exist.
    ids : iterable of str
        Samples that are opened.
    reason : str
        Why.

    Returns
    -------
    tuple of Opening
        The new one is the last.

    Raises
    ------
    UsageError
        When no reason is given, or another process holds the file.
    InputDataError
        When the chain is broken.
    RunFolderError
        When the file cannot be written.
    """
    if not isinstance(reason, str) or not reason.strip():
        raise UsageError(
            code="opening-without-reason",
            where="open_set_aside",
            what=f"no reason is given (got {reason!r})",
            accepted="the reason for opening the rows, in words",
            next_step="Say why they are opened now",
        )
    file = Path(path)
    with _alone(file):
        known = read_openings(file)
        opening = Opening.of(ids, reason.strip(), known[-1] if known else None)
        everything = (*known, opening)
        with write_whole(file) as target:
            for entry in everything:
                line = json.dumps(asdict(entry) | {"sha256": entry.sha256})
                target.write(f"{line}\n".encode())
    return everything


@contextmanager
def _alone(file: Path) -> Iterator[None]:
    """Keep other processes from recording at the same time: none may be lost."""
    lock = file.with_name(f"{file.name}.lock")
    file.parent.mkdir(parents=True, exist_ok=True)
    deadline = time.monotonic() + WAIT_S
    while True:
        try:
            os.close(os.open(lock, os.O_CREAT | os.O_EXCL | os.O_WRONLY))
            break
        except FileExistsError as error:
            if time.monotonic() > deadline:
                raise UsageError(
                    code="openings-held",
                    where=str(lock),
                    what="another process is recording an opening",
                    accepted="one at a time",
                    next_step="Wait for it, or remove this file if there is none",
                ) from error
            time.sleep(0.05)
    try:
        yield
    finally:
        lock.unlink(missing_ok=True)


def _opening(file: Path, number: int, line: str) -> Opening:
    try:
        content = json.loads(line)
        digest = content.pop("sha256")
        opening = Opening(**content)
    except (ValueError, TypeError, KeyError, AttributeError, RecursionError) as error:
        raise _broken(file, number, "it is no opening") from error
    for field in fields(Opening):
        if type(getattr(opening, field.name)) is not field.type:
            raise _broken(file, number, "it is no opening")
    if digest != opening.sha256:
        raise _broken(file, number, "its content does not fit its hash")
    return opening


def _broken(file: Path, number: int, what: str) -> InputDataError:
    return InputDataError(
        code="openings-changed",
        where=f"{file}, line {number}",
        what=f"the record of openings was changed: {what}",
        accepted="the file as panelkit wrote it, to which lines are only added",
        next_step="Restore the file; how often the rows were opened can't be known "
        "without it",
    )
