"""Which outcomes a run can take; `check` takes all of them."""

from panelkit.config import Study
from panelkit.errors import StudyFileError
from panelkit.records import Cohort

__all__ = ["can_run", "refuse_unsupported"]

KINDS = ("binary",)


def can_run(cohort: Cohort) -> bool:
    """Return whether panels can be built for the outcome of a cohort."""
    return cohort.outcome is not None and cohort.outcome.kind in KINDS


def refuse_unsupported(study: Study, cohort: Cohort) -> None:
    """Refuse to run a study whose outcome can be checked, but not run yet.

    Raises
    ------
    StudyFileError
        The outcome is of another kind than those supported.
    """
    if cohort.outcome is not None and not can_run(cohort):
        raise StudyFileError(
            code="outcome-not-supported",
            where=f"{study.path}, [cohort]",
            what=f"panels can't be built yet for a {cohort.outcome.kind} outcome "
            f"(got column {cohort.outcome.column!r})",
            accepted=f"a {' or '.join(KINDS)} outcome: outcome with positive",
            next_step="Name two classes by outcome and positive; `panelkit check` "
            "reads and checks this study as it is",
        )
