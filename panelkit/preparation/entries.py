"""From what a study file writes to steps, and the rules of their order."""

from collections.abc import Mapping, Sequence
from dataclasses import fields
from typing import Any

from panelkit.errors import StudyFileError, name_some
from panelkit.preparation.registry import STEP_KINDS
from panelkit.preparation.step import (
    BATCHES,
    COLLAPSE,
    FILL,
    FILTER,
    SCALE,
    WHOLE,
    Step,
    made,
)

__all__ = ["check_assay", "check_order", "steps_from", "table_of"]

ORDER = (SCALE, WHOLE, BATCHES, COLLAPSE, FILL)
FILTERS_OF_RAW_VALUES = ("prevalence", "detection")


def steps_from(
    entries: Sequence[str | Mapping[str, Any] | Step],
    defaults: Mapping[str, Mapping[str, Any]],
    where: str,
) -> tuple[Step, ...]:
    """Return the steps that a list names.

    Parameters
    ----------
    entries : sequence of str, mapping or Step
        A name, or a table with the name under ``step`` and parameters beside it.
    defaults : mapping of str to mapping
        Parameters of a step that count where an entry gives none.
    where : str
        For errors.

    Returns
    -------
    tuple of Step
        In order.

    Raises
    ------
    StudyFileError
        An unknown step or parameter.
    """
    names = [_name(entry) for entry in entries]
    unknown = [name for name in names if name not in STEP_KINDS]
    if unknown:
        raise StudyFileError(
            code="unknown-step",
            where=where,
            what=f"no such step: {name_some(unknown)}",
            accepted=f"steps are {name_some(STEP_KINDS, len(STEP_KINDS))}",
            next_step="Correct the name or leave the key out for the default",
        )
    steps = []
    for name, entry in zip(names, entries, strict=True):
        if not isinstance(entry, str | Mapping):
            steps.append(entry)
            continue
        given = dict(defaults.get(name, {}))
        if isinstance(entry, Mapping):
            given |= {key: _plain(entry[key]) for key in entry if key != "step"}
        steps.append(made(STEP_KINDS[name], given, where))
    return tuple(steps)


def _name(entry: "str | Mapping[str, Any] | Step") -> str:
    if isinstance(entry, str):
        return entry
    return str(entry.get("step")) if isinstance(entry, Mapping) else entry.name


def _plain(value: Any) -> Any:
    return tuple(value) if isinstance(value, list) else value


def table_of(step: Step) -> dict[str, Any]:
    """Return a step as the study file writes it, every parameter written out."""
    table: dict[str, Any] = {"step": step.name}
    for each in fields(step):  # type: ignore[arg-type]  # steps are dataclasses
        value = getattr(step, each.name)
        if value is not None:
            table[each.name] = list(value) if isinstance(value, tuple) else value
    return table


def check_order(steps: Sequence[Step], where: str) -> None:
    """Refuse steps that are repeated, missing, or in an order without sense.

    Parameters
    ----------
    steps : sequence of Step
        In order.
    where : str
        For errors.

    Raises
    ------
    StudyFileError
        Codes ``step-order``, ``step-missing-or-repeated``, ``scale-twice``.
    """
    shown = [step.name for step in steps]
    ranks = [ORDER.index(step.place) for step in steps if step.place in ORDER]
    first = [_behind_scale(steps, k) for k in range(len(steps))]
    if ranks != sorted(ranks) or any(first):
        raise StudyFileError(
            code="step-order",
            where=where,
            what=f"a step stands behind one that it has to come before (got {shown})",
            accepted="first the scale (logarithms, counts), then whole samples, then "
            "batches and references, then 'collapse', then the fill; filters anywhere "
            f"behind the scale, {name_some(FILTERS_OF_RAW_VALUES)} also before it",
            next_step="Put them in that order",
        )
    repeated = len(set(shown)) < len(shown)
    fills = [step.name for step in steps if step.place == FILL]
    if repeated or len(fills) != 1:
        known = [n for n, kind in STEP_KINDS.items() if kind.place == FILL]
        raise StudyFileError(
            code="step-missing-or-repeated",
            where=where,
            what=f"a step is repeated, or there is not one fill (got {shown})",
            accepted=f"each step once, one of {name_some(known)} among them, since "
            "every fit needs a value in every cell",
            next_step="Correct the list or leave the key out for the default",
        )
    scales = [step.name for step in steps if step.place == SCALE]
    if len(scales) > 1:
        raise StudyFileError(
            code="scale-twice",
            where=where,
            what=f"{name_some(scales)} all take logarithms",
            accepted="one of them",
            next_step="Remove the others",
        )


def check_assay(steps: Sequence[Step], where: str) -> None:
    """Refuse steps that a panel's assays alone cannot do.

    Parameters
    ----------
    steps : sequence of Step
        Of the assay part.
    where : str
        For errors.

    Raises
    ------
    StudyFileError
        Code ``step-not-for-assay``.
    """
    wrong = [
        step.name
        for step in steps
        if not step.assay or step.place in (FILTER, COLLAPSE)
    ]
    if wrong:
        possible = [
            name
            for name, kind in STEP_KINDS.items()
            if kind.assay and kind.place not in (FILTER, COLLAPSE)
        ]
        raise StudyFileError(
            code="step-not-for-assay",
            where=where,
            what=f"{name_some(wrong)} cannot be done on one new sample with the "
            "panel's assays alone, or has nothing to do there",
            accepted=f"steps are {name_some(possible, len(possible))}",
            next_step="Take it out of the assay part",
        )


def _behind_scale(steps: Sequence[Step], k: int) -> bool:
    """Whether a filter stands before a change of scale that it has to follow."""
    early = steps[k].place == FILTER and steps[k].name not in FILTERS_OF_RAW_VALUES
    return early and any(step.place == SCALE for step in steps[k + 1 :])
