"""On which platforms a feature can be measured, as the feature sheet says."""

from collections.abc import Sequence

import numpy as np

from panelkit.errors import InputDataError
from panelkit.ingest.outcome_column import named_cells
from panelkit.ingest.sheet import Sheet, Text
from panelkit.ingest.wording import nearest_hint, quoted

__all__ = ["read_assayable"]

COLUMN = "assayable"
PREFIX = f"{COLUMN}_"
SEPARATOR = ";"
YES = frozenset({"1", "yes", "y", "true"})
NO = frozenset({"", "0", "no", "n", "false"})


def read_assayable(sheet: Sheet, platforms: Sequence[str] | None) -> Text | None:
    """Return the platforms on which each feature can be measured.

    Parameters
    ----------
    sheet : Sheet
        The feature sheet, with the column ``assayable`` (platform names joined by
        ``;``) or a column ``assayable_NAME`` for each platform (yes or no), or both.
    platforms : sequence of str or None
        Platforms that exist; None when nothing is known of them.

    Returns
    -------
    ndarray of shape (n_rows,), object, or None
        Sorted names joined by ``;``, ``""`` for none; None without such a column.

    Raises
    ------
    InputDataError
        When a platform does not exist, or a cell is neither yes nor no.
    """
    own = [name for name in sheet.columns if name.startswith(PREFIX)]
    if COLUMN not in sheet.columns and not own:
        return None
    found: list[set[str]] = [set() for _ in sheet.ids]
    if COLUMN in sheet.columns:
        for names, cell in zip(found, sheet.columns[COLUMN], strict=True):
            names.update(part.strip() for part in cell.split(SEPARATOR) if part.strip())
    for column in own:
        cells = sheet.columns[column]
        plain = [cell.strip().casefold() for cell in cells]
        wrong = np.array([cell not in YES | NO for cell in plain], bool)
        if wrong.any():
            raise InputDataError(
                code="assayable-unclear",
                where=f"{sheet.where}, column {column!r}",
                what="cells are neither yes nor no "
                + named_cells(wrong, sheet.ids, cells),
                accepted="yes, y, true, 1, or no, n, false, 0, blank",
                next_step="Correct these cells",
            )
        for names, cell in zip(found, plain, strict=True):
            if cell in YES:
                names.add(column.removeprefix(PREFIX))
    named = {name for names in found for name in names}
    named |= {column.removeprefix(PREFIX) for column in own}
    _refuse_unknown(sheet, sorted(named), platforms)
    return np.array([SEPARATOR.join(sorted(names)) for names in found], object)


def _refuse_unknown(
    sheet: Sheet, named: Sequence[str], platforms: Sequence[str] | None
) -> None:
    if platforms is None:
        return
    unknown = [name for name in named if name not in platforms]
    if unknown:
        raise InputDataError(
            code="unknown-platform",
            where=f"{sheet.where}, column {COLUMN!r}",
            what=f"there is no platform {quoted(unknown)}",
            accepted=f"{nearest_hint(unknown[0], platforms)}the platforms of the study "
            f"are {quoted(platforms)}",
            next_step="Name these platforms as the study does, or add the platform",
        )
