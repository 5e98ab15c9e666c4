"""`open_set_aside`: the rows of a study that nothing has read so far."""

import os
from pathlib import Path

from panelkit.config import Study, read_study
from panelkit.records import Cohort
from panelkit.workflow.cohort import load_cohort

__all__ = ["open_set_aside"]


def open_set_aside(study: "str | os.PathLike[str] | Study", reason: str) -> Cohort:
    """Return the rows that a study set aside, after the opening has been recorded.

    Parameters
    ----------
    study : path or Study
        The study file, with `set_aside` and `openings` under ``[cohort]``.
    reason : str
        Why the rows are opened.

    Returns
    -------
    Cohort
        These rows and no other; `openings` holds every opening so far.

    Raises
    ------
    StudyFileError
        The study sets nothing aside, or names no openings file.
    UsageError
        No reason is given.
    InputDataError
        The data cannot be used, or the openings file was changed.
    """
    plan = study if isinstance(study, Study) else read_study(Path(study))
    return load_cohort(plan, open_set_aside=reason)
