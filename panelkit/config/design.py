"""``[design]``: how people came into the study, and what contradicts it."""

from typing import Annotated

from pydantic import BeforeValidator, Field

from panelkit.config.defaults import DESIGN, DesignKind
from panelkit.config.sections import Section, plain_number
from panelkit.errors import StudyFileError

__all__ = ["DesignSection", "check_design", "outcome_kind"]


class DesignSection(Section):
    """``[design]``: how people came into the study.

    Attributes
    ----------
    kind : str
        cohort (people as they came), case-control (each class sampled on its own) or
        matched (controls chosen for their likeness to cases; needs matched_set).
    prevalence : float or None
        Share of the positive class among the people that the test is meant for, where
        the study's own share isn't theirs.
    """

    kind: DesignKind = DESIGN.kind
    prevalence: Annotated[
        Annotated[float, Field(gt=0, lt=1)] | None, BeforeValidator(plain_number)
    ] = None


def outcome_kind(kind: str | None, time: object, event: object, classes: object) -> str:
    """Return the kind of outcome that is asked for, as stated or by the other keys.

    Parameters
    ----------
    kind : str or None
        As stated.
    time, event, classes : object
        The keys that belong to one kind only.

    Returns
    -------
    str
        binary, classes, number or survival.
    """
    if kind is not None:
        return kind
    if time is not None or event is not None:
        return "survival"
    return "classes" if classes else "binary"


def check_design(
    kind: str, prevalence: float | None, matched_set: object, outcome: str, where: str
) -> None:
    """Refuse a design that contradicts the columns or the outcome.

    Parameters
    ----------
    kind : {"cohort", "case-control", "matched"}
        How people came into the study.
    prevalence : float or None
        Of the positive class.
    matched_set : object
        The column of matched sets, None for none.
    outcome : {"binary", "classes", "number", "survival", ""}
        Kind of the outcome, ``""`` for none.
    where : str
        Study file or call, for the message.

    Raises
    ------
    StudyFileError
        The parts cannot be meant together.
    """
    if prevalence is not None and not 0.0 < prevalence < 1.0:
        raise StudyFileError(
            code="prevalence-out-of-range",
            where=f"{where}, prevalence",
            what=f"this is no share of people (got {prevalence!r})",
            accepted="a number above 0 and below 1",
            next_step="Correct the value",
        )
    if kind == "matched" and matched_set is None:
        raise StudyFileError(
            code="matched-without-sets",
            where=f"{where}, kind",
            what="the design is matched, but no column of matched sets is named",
            accepted="matched_set names the column that says who was matched to whom",
            next_step="Name matched_set under [cohort], or correct the kind",
        )
    if kind != "matched" and matched_set is not None:
        raise StudyFileError(
            code="sets-without-matched",
            where=f"{where}, kind",
            what=f"matched sets are named ({matched_set!r}), but the design is {kind}",
            accepted="matched sets belong to a matched design",
            next_step='Write kind = "matched" under [design], or take matched_set out',
        )
    if outcome in ("", "binary"):
        return
    if kind != "cohort" or prevalence is not None:
        got = f"kind {kind!r}" if kind != "cohort" else "a prevalence"
        raise StudyFileError(
            code="design-needs-two-classes",
            where=where,
            what=f"{got} goes with a binary outcome (the outcome is {outcome})",
            accepted="case-control and matched designs and a prevalence speak of a "
            "positive class",
            next_step="Take it out, or name a binary outcome",
        )
