"""How ingest words figures, shares and the nearest name."""

from collections.abc import Iterable, Sequence
from difflib import get_close_matches

from panelkit.errors import name_some

__all__ = ["as_text", "counted", "figure", "nearest_hint", "percent", "quoted"]


def figure(value: float) -> str:
    """Return a number with three figures, in powers of ten only beyond 1e15.

    Parameters
    ----------
    value : float
        The number.

    Returns
    -------
    str
        ``"285,004"``, ``"7.62"`` or ``"0.0312"``.
    """
    if 1000 <= abs(value) < 1e15:
        return f"{value:,.0f}"
    return f"{value:.3g}"


def percent(share: float) -> str:
    """Return a share as a percentage with at most three figures.

    Parameters
    ----------
    share : float
        Between 0 and 1.

    Returns
    -------
    str
        For example ``"2.4 %"``.
    """
    return f"{figure(100 * share)} %"


def counted(count: int, one: str, many: str) -> str:
    """Return a count with the words that agree with it.

    Parameters
    ----------
    count : int
        How many.
    one, many : str
        What follows "1", and what follows any other count.

    Returns
    -------
    str
        For example ``"1 feature has"`` or ``"1,204 features have"``.
    """
    return f"{count:,} {one if count == 1 else many}"


def quoted(names: Iterable[object], limit: int = 5) -> str:
    """Return names in quotes, so that blanks can be seen, the first few of them.

    Parameters
    ----------
    names : iterable of object
        What to name.
    limit : int
        Largest number of names shown.

    Returns
    -------
    str
        ``"'S03', 'S17' and 37 more"``.
    """
    return name_some([repr(str(name)) for name in names], limit)


def nearest_hint(name: str, known: Sequence[str]) -> str:
    """Return "nearest is 'lineage'; " for the closest known name, or nothing.

    Parameters
    ----------
    name : str
        What was asked for.
    known : sequence of str
        What exists.

    Returns
    -------
    str
        Empty when nothing known is close.
    """
    folded = {entry.strip().casefold(): entry for entry in reversed(known)}
    close = get_close_matches(name.strip().casefold(), folded, n=1, cutoff=0.6)
    return f"the nearest is {folded[close[0]]!r}; " if close else ""


def as_text(value: object) -> str:
    """Return one value as a sample sheet would have it written.

    Parameters
    ----------
    value : object
        Text, number, truth value or None.

    Returns
    -------
    str
        Whole floating-point numbers lose their ``.0`` (a column of 0 and 1 turns
        into floats as soon as one entry is missing); missing ones are ``""``.
    """
    if value is None:
        return ""
    if isinstance(value, float):
        if value != value:
            return ""
        if value.is_integer():
            return str(int(value))
    return str(value)
