"""The plan of a validation, written before outcomes are seen."""

from pathlib import Path
from typing import Annotated, Final, Literal

from pydantic import BeforeValidator, Field

from panelkit.config.defaults import LOCK
from panelkit.config.sections import Section, check_section, plain_number, read_toml

__all__ = ["ValidationPlan", "read_validation_plan"]

Share = Annotated[float, BeforeValidator(plain_number), Field(gt=0.0, lt=1.0)]


class ValidationPlan(Section):
    """What a validation has to show, under ``[validation]``.

    Attributes
    ----------
    panel : str
        Content hash of the panel file.
    primary : str
        ``auc``, ``sensitivity`` or ``specificity``.
    cutoff : str
        Name of the cut-off of a sensitivity or specificity; the first where empty.
    at_least : float
        The interval's lower end has to reach it to pass; fail where its upper end
        does not.
    confidence : float
        Of the interval.
    subgroups : tuple of str
        Columns of the sample sheet.
    cases, controls : int
        People of each class without whom nothing is concluded.
    """

    panel: str
    primary: Literal["auc", "sensitivity", "specificity"]
    at_least: Share
    cutoff: str = ""
    confidence: Share = LOCK.confidence
    subgroups: tuple[str, ...] = ()
    cases: Annotated[int, Field(ge=0)] = 0
    controls: Annotated[int, Field(ge=0)] = 0


_KEYS: Final = ("validation",)


def read_validation_plan(path: str | Path) -> ValidationPlan:
    """Return the plan of a validation.

    Parameters
    ----------
    path : str or Path
        A TOML file with a table ``[validation]``.

    Returns
    -------
    ValidationPlan
        Checked.

    Raises
    ------
    StudyFileError
        The file cannot be read, or holds another thing.
    """
    tables = read_toml(path, _KEYS)
    where = f"{path}, [validation]"
    return check_section(ValidationPlan, tables.get("validation", {}), where)
