"""Covariates as columns that enter the fits without a penalty."""

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import InputDataError, name_some

__all__ = ["CovariateCoding", "learn_covariates"]


@dataclass(frozen=True, slots=True)
class _Number:
    mean: float
    deviation: float


@dataclass(frozen=True, slots=True)
class _Categories:
    levels: tuple[str, ...]  # without the first, which the others are compared with
    reference: str
    means: tuple[float, ...]
    deviations: tuple[float, ...]


@dataclass(frozen=True, slots=True)
class CovariateCoding:
    """How covariates become columns, learnt on training rows.

    Attributes
    ----------
    columns : mapping of str to coding
        A number is standardised; a missing one stands at the mean. A category gets an
        indicator for each level but the most frequent, standardised too; a missing one
        and a level that no training row has stand at 0, the training rows' mean.
    """

    columns: Mapping[str, _Number | _Categories]

    @property
    def names(self) -> tuple[str, ...]:
        """Names of the coded columns."""
        found: list[str] = []
        for name, coding in self.columns.items():
            if isinstance(coding, _Number):
                found.append(name)
            else:
                found += [f"{name}={level}" for level in coding.levels]
        return tuple(found)

    def apply(
        self, covariates: Mapping[str, NDArray[np.object_]], rows: NDArray[np.int64]
    ) -> NDArray[np.float64]:
        """Return the coded columns of any rows.

        Parameters
        ----------
        covariates : mapping of str to ndarray of shape (n_samples,), object
            As written in the sample sheet; ``""`` is missing.
        rows : ndarray of int64
            Which samples.

        Returns
        -------
        ndarray of shape (n_rows, n_columns), float64
            For `fit_paths(unpenalised=...)`.

        Raises
        ------
        InputDataError
            A covariate of numbers with a value that is none.
        """
        found: list[NDArray[np.float64]] = []
        for name, coding in self.columns.items():
            cells = [str(cell).strip() for cell in covariates[name][rows]]
            if isinstance(coding, _Number):
                values = _numbers(name, cells)
                known = np.where(np.isnan(values), coding.mean, values)
                found.append((known - coding.mean) / coding.deviation)
                continue
            seen = {*coding.levels, coding.reference}
            unseen = np.array([cell not in seen for cell in cells], np.bool_)
            for level, mean, deviation in zip(
                coding.levels, coding.means, coding.deviations, strict=True
            ):
                indicator = np.array([cell == level for cell in cells], np.float64)
                found.append(np.where(unseen, 0.0, (indicator - mean) / deviation))
        return np.stack(found, axis=1) if found else np.empty((len(rows), 0))


def learn_covariates(
    covariates: Mapping[str, NDArray[np.object_]], rows: NDArray[np.int64]
) -> CovariateCoding:
    """Learn from training rows how covariates are coded.

    Parameters
    ----------
    covariates : mapping of str to ndarray of shape (n_samples,), object
        As written in the sample sheet; ``""`` is missing. A column in which every
        filled training cell is a number is one of numbers.
    rows : ndarray of int64
        Training rows.

    Returns
    -------
    CovariateCoding
        Columns that do not vary on the training rows are left out.
    """
    found: dict[str, _Number | _Categories] = {}
    for name, column in covariates.items():
        cells = [str(column[i]).strip() for i in np.sort(rows)]
        filled = [cell for cell in cells if cell]
        if not filled:
            continue
        coding = _number(filled) if all(map(_is_number, filled)) else _levels(filled)
        if coding is not None:
            found[name] = coding
    return CovariateCoding(found)


def _is_number(cell: str) -> bool:
    try:
        return bool(np.isfinite(float(cell)))
    except ValueError:
        return False


def _number(cells: list[str]) -> _Number | None:
    values = np.array(cells, np.float64)
    deviation = float(values.std())
    return _Number(float(values.mean()), deviation) if deviation > 0.0 else None


def _levels(cells: list[str]) -> _Categories | None:
    levels, counts = np.unique(cells, return_counts=True)
    if len(levels) < 2:
        return None
    most = int(counts.argmax())
    share = np.delete(counts, most) / len(cells)
    return _Categories(
        levels=tuple(str(level) for level in np.delete(levels, most)),
        reference=str(levels[most]),
        means=tuple(float(each) for each in share),
        deviations=tuple(float(each) for each in np.sqrt(share * (1.0 - share))),
    )


def _numbers(name: str, cells: list[str]) -> NDArray[np.float64]:
    wrong = [cell for cell in cells if cell and not _is_number(cell)]
    if wrong:
        raise InputDataError(
            code="covariate-not-numeric",
            where=f"sample sheet, column '{name}'",
            what=f"{name_some(dict.fromkeys(wrong))} among numbers",
            accepted="numbers, since every training row has one",
            next_step="Correct the cells, or write the column as words",
        )
    return np.array([float(cell) if cell else np.nan for cell in cells])
