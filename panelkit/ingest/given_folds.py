"""The user's own folds: checked before they take the place of drawn ones."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import InputDataError
from panelkit.ingest.wording import counted, quoted
from panelkit.records import Cohort, Finding

__all__ = ["check_given_folds"]


def check_given_folds(cohort: Cohort, column: str | None) -> list[Finding]:
    """Refuse folds that cannot judge anything; return what is weak about the others.

    Parameters
    ----------
    cohort : Cohort
        Its design may hold folds.
    column : str or None
        The column they came from.

    Returns
    -------
    list of Finding
        Folds whose test samples are all of one class.

    Raises
    ------
    InputDataError
        When there is one fold only, a subject or a matched set is split, or a training
        set lacks a class.
    """
    design = cohort.design
    fold, names = design.fold, design.fold_ids
    if fold is None or names is None:
        return []
    where = f"samples, column {column!r}"
    if len(names) < 2:
        raise InputDataError(
            code="folds-too-few",
            where=where,
            what=f"there is one fold only ({names[0]!r})",
            accepted="at least 2 folds among the analysed samples",
            next_step="Correct the column or the row filters, or take folds out to "
            "have them drawn",
        )
    _refuse_split(fold, design.subject, design.subject_ids, "subject", where)
    if design.matched_set is not None and design.matched_set_ids is not None:
        _refuse_split(
            fold, design.matched_set, design.matched_set_ids, "matched set", where
        )
    if cohort.outcome is None:
        return []
    groups, codes = cohort.outcome.groups
    if not groups:
        return []
    table = np.zeros((len(names), len(groups)), np.int64)
    np.add.at(table, (fold, codes), 1)
    _refuse_empty_training(table, names, groups, where)
    return _one_sided(table, names, where)


def _refuse_split(
    fold: NDArray[np.int64],
    units: NDArray[np.int64],
    names: NDArray[np.object_],
    what: str,
    where: str,
) -> None:
    split = [
        names[unit]
        for unit in range(len(names))
        if len(np.unique(fold[units == unit])) > 1
    ]
    if split:
        raise InputDataError(
            code="folds-split",
            where=where,
            what=f"{counted(len(split), what, what + 's')} lie in more than one fold: "
            f"{quoted(split)}",
            accepted=f"all samples of a {what} in one fold: else training would know "
            "the people that it is tested on",
            next_step="Give them one fold each",
        )


def _refuse_empty_training(
    table: NDArray[np.int64],
    names: NDArray[np.object_],
    groups: Sequence[str],
    where: str,
) -> None:
    outside = table.sum(axis=0) - table
    for fold, group in np.argwhere(outside == 0):
        raise InputDataError(
            code="fold-training-one-class",
            where=where,
            what=f"outside fold {names[fold]!r} there is no sample of "
            f"{groups[group]!r}",
            accepted="every class in every training set",
            next_step="Spread the classes over several folds",
        )


def _one_sided(
    table: NDArray[np.int64], names: NDArray[np.object_], where: str
) -> list[Finding]:
    lacking = (table == 0).any(axis=1)
    if not lacking.any():
        return []
    everywhere = bool(lacking.all())
    return [
        Finding(
            code="folds-with-one-class",
            severity="stop" if everywhere else "warning",
            where=where,
            message=f"{lacking.sum()} of {len(names)} folds do not hold every class: "
            f"{quoted(names[lacking])}; within them no area under the ROC curve can be "
            "had" + ("" if everywhere else ", and they do not enter its average"),
            next_step="Join such folds with others.",
        )
    ]
