"""What a step of a recipe is, and how its parameters are written and checked."""

import difflib
from collections.abc import Callable, Mapping
from dataclasses import Field, field, fields
from typing import Any, ClassVar, Protocol, runtime_checkable

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import StudyFileError, name_some
from panelkit.preparation.values import Values
from panelkit.records import RecipeContext

__all__ = [
    "BATCHES",
    "COLLAPSE",
    "FILL",
    "FILTER",
    "SCALE",
    "WHOLE",
    "Learnt",
    "NeedsContext",
    "PerSample",
    "Step",
    "choice",
    "made",
    "names",
    "nothing",
    "number",
    "parameters_of",
    "whole",
]

Learnt = Mapping[str, NDArray[Any]]

# places in a recipe, in this order; filters may stand anywhere behind the scale
SCALE = "scale"
WHOLE = "whole sample"
BATCHES = "batches and references"
COLLAPSE = "collapse"
FILTER = "filter"
FILL = "fill"


class Step(Protocol):
    """One step of a recipe: a frozen dataclass of its parameters.

    Attributes
    ----------
    name : str
        As the study file writes it.
    place : str
        What the step does, which decides where it may stand.
    assay : bool
        Whether it can belong to the assay part.
    """

    name: ClassVar[str]
    place: ClassVar[str]
    assay: ClassVar[bool]

    def words(self) -> str:
        """Return what the step does, for the report."""
        ...

    def learn(
        self, values: Values, rows: NDArray[np.int64], context: RecipeContext
    ) -> Learnt:
        """Return what is learnt from the training rows; no other value is read."""
        ...

    def apply(self, values: Values, learnt: Learnt, context: RecipeContext) -> Values:
        """Return the values of any samples after the step, each by itself."""
        ...

    def needs(self, learnt: Learnt, markers: NDArray[np.int64]) -> NDArray[np.int64]:
        """Return the features without which one new sample cannot be prepared."""
        ...


@runtime_checkable
class PerSample(Protocol):
    """A step that learns nothing: all folds share what it gives."""

    def change(self, values: NDArray[np.floating[Any]]) -> None:
        """Change the values, features by samples, in place."""
        ...


@runtime_checkable
class NeedsContext(Protocol):
    """A step that cannot be learnt without something beside the values."""

    def check(self, context: RecipeContext) -> None:
        """Refuse a cohort that does not have it."""
        ...


def _field(
    default: Any,
    accepted: str,
    check: Callable[[Any], bool],
    convert: Callable[[Any], Any] = lambda value: value,
) -> Any:
    """Return a parameter: what is accepted, in words and as a check."""
    rules = {"accepted": accepted, "check": check, "convert": convert}
    return field(default=default, metadata=rules)


def _is_number(value: object) -> bool:
    return isinstance(value, int | float) and not isinstance(value, bool)


def number(
    default: float | None, least: float, most: float = np.inf, *, above: bool = False
) -> Any:
    """Return a parameter that is a number.

    Parameters
    ----------
    default : float or None
        Its default.
    least, most : float
        Bounds.
    above : bool
        Whether the lower bound itself is refused.

    Returns
    -------
    dataclasses.Field
        Checked by `made`.
    """
    words = "a number"
    if np.isfinite(least):
        words += f" {'above' if above else 'of at least'} {least:g}"
    words += f" and at most {most:g}" if np.isfinite(most) else ""

    def check(value: Any) -> bool:
        if value is None and default is None:
            return True
        if not _is_number(value) or not np.isfinite(value):
            return False
        return bool(least <= value <= most and not (above and value == least))

    return _field(default, words, check, lambda v: None if v is None else float(v))


def whole(default: int, least: int) -> Any:
    """Return a parameter that is a whole number of at least `least`."""

    def check(value: Any) -> bool:
        return isinstance(value, int) and _is_number(value) and value >= least

    return _field(default, f"a whole number of at least {least}", check)


def choice(default: str, options: tuple[str, ...]) -> Any:
    """Return a parameter that is one of some words."""
    listed = name_some(options, len(options))
    return _field(default, f"one of {listed}", lambda value: value in options)


def names() -> Any:
    """Return a parameter that is a list of feature ids, empty by default."""

    def check(value: Any) -> bool:
        return isinstance(value, tuple) and all(isinstance(each, str) for each in value)

    return _field((), "a list of feature ids", check)


def parameters_of(kind: Any) -> tuple["Field[Any]", ...]:
    """Return the parameters of a step."""
    return fields(kind)


def made(kind: type[Any], given: Mapping[str, Any], where: str) -> Any:
    """Return a step with the given parameters.

    Parameters
    ----------
    kind : type
        A step.
    given : mapping of str to object
        Parameters by name; the others keep their defaults.
    where : str
        For the error.

    Returns
    -------
    Step
        The step.

    Raises
    ------
    StudyFileError
        A parameter that is unknown or has a value that is not accepted.
    """
    known = {each.name: each for each in parameters_of(kind)}
    for key, value in given.items():
        if key not in known:
            near = difflib.get_close_matches(key, known, n=1)
            hint = f"perhaps '{near[0]}' is meant; " if near else ""
            listed = name_some(known, len(known)) if known else "none"
            raise StudyFileError(
                code="step-parameter-unknown",
                where=f"{where}, step '{kind.name}'",
                what=f"no such parameter is known (got {key!r})",
                accepted=f"{hint}its parameters are {listed}",
                next_step="Rename or remove it",
            )
        if not known[key].metadata["check"](value):
            raise StudyFileError(
                code="step-parameter-refused",
                where=f"{where}, step '{kind.name}', parameter '{key}'",
                what=f"the value cannot be used (got {value!r})",
                accepted=f"accepted is {known[key].metadata['accepted']}",
                next_step="Correct the value",
            )
    exact = {key: known[key].metadata["convert"](value) for key, value in given.items()}
    return kind(**exact)


def nothing() -> NDArray[np.int64]:
    """Return no feature: what a step of single markers needs."""
    return np.empty(0, np.int64)
