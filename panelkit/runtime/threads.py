"""How many threads to use."""

import os

from panelkit.errors import UsageError

__all__ = ["thread_count"]


def thread_count(asked: int | None = None) -> int:
    """Return the number of threads to use.

    Parameters
    ----------
    asked : int, optional
        None means the processors that this process may use.

    Returns
    -------
    int
        At least one.

    Raises
    ------
    UsageError
        Fewer than one was asked for.
    """
    if asked is None:
        if hasattr(os, "sched_getaffinity"):
            return max(1, len(os.sched_getaffinity(0)))
        return max(1, os.cpu_count() or 1)
    if asked < 1:
        raise UsageError(
            code="threads-out-of-range",
            where="--threads",
            what=f"too few (got {asked})",
            accepted="1 or more",
            next_step="Leave it out to use every processor of this process",
        )
    return asked
