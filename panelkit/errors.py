"""The tree of errors.

::

    PanelkitError
    ├── UsageError        2   a command or call that cannot be meant
    │   └── StudyFileError    a study, platform or programme file
    ├── InputDataError    3   expression, sample, feature or price data
    ├── FitError          4   a model that cannot be fitted
    ├── NoPanelError      5   no panel meets the demand
    ├── PanelFileError    6   a locked panel's file
    ├── RunFolderError    7   the run folder or the machine's resources
    └── Interrupted     130   stopped by the user

Every error says where it happened, what is wrong (with what was got), what is
accepted and what to do next; `code` is a stable word for programs to test.
Only `panelkit.cli.app` catches `PanelkitError`; anything else is a bug and keeps
its traceback.
"""

from collections.abc import Iterable
from typing import ClassVar

__all__ = [
    "FitError",
    "InputDataError",
    "Interrupted",
    "NoPanelError",
    "PanelFileError",
    "PanelkitError",
    "RunFolderError",
    "StudyFileError",
    "UsageError",
    "name_some",
]

N_EXAMPLES = 5


def name_some(names: Iterable[object], limit: int = N_EXAMPLES) -> str:
    """Return names in one phrase: at most `limit` of them, then "and N more".

    Parameters
    ----------
    names : iterable of object
        What to name; each is shown by `str`.
    limit : int
        Largest number of names shown.

    Returns
    -------
    str
        ``"S03, S17 and 37 more"`` or, when all fit, ``"S03, S17"``.
    """
    listed = [str(name) for name in names]
    shown = ", ".join(listed[:limit])
    left = len(listed) - limit
    return f"{shown} and {left} more" if left > 0 else shown


class PanelkitError(Exception):
    """What went wrong, in one sentence that a user can act on.

    Parameters
    ----------
    code : str
        Stable word code, for example ``"unknown-key"``.
    where : str
        The file, column, key or argument.
    what : str
        What is wrong, with what was got.
    accepted : str
        What is accepted there.
    next_step : str
        What to do now, as an imperative.
    """

    exit_code: ClassVar[int] = 1

    def __init__(
        self, *, code: str, where: str, what: str, accepted: str, next_step: str
    ) -> None:
        self.code = code
        self.where = where
        self.what = what
        self.accepted = accepted
        self.next_step = next_step
        super().__init__(f"{where}: {what}; {accepted}. {next_step}.")

    def __reduce__(self) -> tuple[object, ...]:
        """Keep keywords and notes when the error crosses a process border."""
        return (_rebuild, (type(self), self.as_dict()), self.__dict__)

    def as_dict(self) -> dict[str, str]:
        """Return the five parts by name."""
        return {
            "code": self.code,
            "where": self.where,
            "what": self.what,
            "accepted": self.accepted,
            "next_step": self.next_step,
        }


def _rebuild(kind: type[PanelkitError], parts: dict[str, str]) -> PanelkitError:
    return kind(**parts)


class UsageError(PanelkitError):
    """A command line or a call that cannot be meant."""

    exit_code = 2


class StudyFileError(UsageError):
    """A study, platform or programme file that cannot be used."""


class InputDataError(PanelkitError):
    """Expression, sample, feature or price data that cannot be used."""

    exit_code = 3


class FitError(PanelkitError):
    """A model that cannot be fitted, or did not reach its tolerance."""

    exit_code = 4


class NoPanelError(PanelkitError):
    """No panel meets what was demanded."""

    exit_code = 5


class PanelFileError(PanelkitError):
    """A panel file that cannot be read or may not be used."""

    exit_code = 6


class RunFolderError(PanelkitError):
    """A run folder that cannot be used, or resources that do not suffice."""

    exit_code = 7


class Interrupted(PanelkitError):
    """Stopped by the user; finished work is kept."""

    exit_code = 130
