"""One thing to worry about."""

from dataclasses import dataclass

__all__ = ["Worry"]


@dataclass(frozen=True, slots=True)
class Worry:
    """One thing to worry about.

    Attributes
    ----------
    severity : {"stop", "warning"}
        As of findings.
    where : str
        What it is about.
    text : str
        What was seen, and what to do.
    next_step : str
        What to do about it.
    """

    severity: str
    where: str
    text: str
    next_step: str
