"""Progress as events: work tells, somebody else shows."""

from collections.abc import Callable
from dataclasses import dataclass

__all__ = ["Listener", "Progress", "silent"]


@dataclass(frozen=True, slots=True)
class Progress:
    """One step forward.

    Attributes
    ----------
    stage : str
        Name of the stage, in words.
    done, total : int
        Blocks finished and blocks in all; ``total`` 0 announces a stage whose
        length is not known.
    remembered : bool
        The block came from the store and was not computed again.
    """

    stage: str
    done: int
    total: int
    remembered: bool = False


Listener = Callable[[Progress], None]


def silent(event: Progress) -> None:
    """Show nothing."""
