"""How the analysed samples belong together, from the columns of the sample sheet."""

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import InputDataError
from panelkit.ingest.cells import is_missing
from panelkit.ingest.outcome_column import CELL_ADVICE, named_cells
from panelkit.ingest.outcome_number import numbers_of
from panelkit.ingest.roles import Roles
from panelkit.ingest.sheet import Sheet, Text
from panelkit.ingest.wording import quoted
from panelkit.records import Design

__all__ = ["design_of"]


def design_of(
    sheet: Sheet | None, samples: Text, rows: NDArray[np.int64], roles: Roles
) -> Design:
    """Return how the analysed samples belong together.

    Parameters
    ----------
    sheet : Sheet or None
        The sample sheet.
    samples : ndarray of shape (n_samples,), object
        Ids of the analysed samples.
    rows : ndarray of shape (n_samples,), int64
        Their rows of the sheet.
    roles : Roles
        Columns for subject, site, batch, matched set, run order and folds.

    Returns
    -------
    Design
        Subjects in order of first row; weights 1 / rows of the subject, summing to 1.

    Raises
    ------
    InputDataError
        When a subject or a fold is blank, or a place in the run order is no number.
    """

    def cells(name: str | None, role: str) -> Text | None:
        if sheet is None or name is None:
            return None
        return sheet.column(name, role)[rows]

    subjects = cells(roles.subject, "subject")
    if subjects is None:
        subjects = samples
    else:
        _refuse_blank_subjects(subjects, samples, roles.subject)
    codes, subject_ids = _coded(subjects)
    weights = 1.0 / np.bincount(codes)[codes]
    sets = cells(roles.matched_set, "matched_set")
    set_codes, set_ids = (None, None) if sets is None else _coded(sets)
    folds = cells(roles.folds, "folds")
    if folds is not None:
        _refuse_blank_folds(folds, samples, roles.folds)
    fold_codes, fold_ids = (None, None) if folds is None else _coded(folds)
    return Design(
        subject=codes,
        subject_ids=subject_ids,
        weights=weights / weights.sum(),
        site=cells(roles.site, "site"),
        batch=cells(roles.batch, "batch"),
        matched_set=set_codes,
        matched_set_ids=set_ids,
        run_order=_order(cells(roles.run_order, "run_order"), samples, roles.run_order),
        fold=fold_codes,
        fold_ids=fold_ids,
    )


def _coded(names: Text) -> tuple[NDArray[np.int64], Text]:
    """Return codes in order of first row, -1 where blank, and the names as written."""
    places: dict[str, int] = {}
    codes = [
        -1 if is_missing(name) else places.setdefault(name, len(places))
        for name in names
    ]
    return np.array(codes, np.int64), np.array(list(places), dtype=object)


def _order(
    cells: Text | None, samples: Text, column: str | None
) -> NDArray[np.float64] | None:
    if cells is None:
        return None
    numbers = numbers_of(cells)
    text = np.isnan(numbers) & ~np.array([is_missing(cell) for cell in cells], bool)
    if text.any():
        raise InputDataError(
            code="run-order-not-numeric",
            where=f"samples, column {column!r}",
            what="places in the run order are no numbers "
            + named_cells(text, samples, cells),
            accepted="a number that grows with the order of measurement, or blank",
            next_step=CELL_ADVICE,
        )
    return numbers


def _blank(cells: Text, samples: Text) -> list[str]:
    return [s for s, name in zip(samples, cells, strict=True) if is_missing(name)]


def _refuse_blank_subjects(cells: Text, samples: Text, column: str | None) -> None:
    if blank := _blank(cells, samples):
        raise InputDataError(
            code="blank-subject",
            where=f"samples, column {column!r}",
            what=f"{len(blank)} samples have no subject: {quoted(blank)}",
            accepted="every sample belongs to a subject",
            next_step="Fill in the subjects, or leave these samples out with keep",
        )


def _refuse_blank_folds(cells: Text, samples: Text, column: str | None) -> None:
    if blank := _blank(cells, samples):
        raise InputDataError(
            code="blank-fold",
            where=f"samples, column {column!r}",
            what=f"{len(blank)} samples have no fold: {quoted(blank)}",
            accepted="every sample is tested in one fold",
            next_step="Fill in the folds, or leave these samples out with keep",
        )
