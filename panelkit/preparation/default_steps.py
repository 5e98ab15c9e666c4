"""The steps that are taken where the study names none."""

from collections.abc import Mapping, Sequence
from typing import Any

from panelkit.preparation.registry import STEP_KINDS
from panelkit.preparation.step import SCALE

__all__ = ["DEFAULT_REASONS", "default_steps", "fitted_to_scale"]

LEARNT = ("filter", "median-fill")
DEFAULT_REASONS = {
    "counts": "the size of each library has to go; a count of 0 becomes one value in "
    "every sample",
    "linear": "spread grows with level, which logarithms even out",
    "log2": "the values are logarithms already",
    "z-scores": "the values are standardised already",
    "beta-values": "differences of shares can be read as they stand, and M-values "
    "stretch those near 0 and 1; name 'm-values' to have them",
    "unknown": "nothing is known about the scale",
}
"""Why these steps, by the scale that was found."""


def default_steps(scale: str) -> tuple[str, ...]:
    """Return the discovery steps for data on the scale that was found.

    Parameters
    ----------
    scale : str
        ``"counts"`` become log counts per million, ``"linear"`` values logarithms;
        everything else is left on its scale.

    Returns
    -------
    tuple of str
        Names of steps in order.
    """
    first = {"counts": ("log-cpm",), "linear": ("log2",)}.get(scale, ())
    return (*first, *LEARNT)


def fitted_to_scale(
    entries: Sequence[str | Mapping[str, Any]], scale: str
) -> tuple[str | Mapping[str, Any], ...]:
    """Return steps with the scale of the values told to those that depend on it.

    Parameters
    ----------
    entries : sequence of str or mapping
        Names of steps, or tables.
    scale : str
        The scale that was found.

    Returns
    -------
    tuple of str or mapping
        ``half-minimum`` and ``below-limit`` with their ``scale`` written out, unless
        it is given: ``linear`` for linear values without a step that takes logarithms.
    """
    names = [e if isinstance(e, str) else str(e.get("step")) for e in entries]
    logs = any(n in STEP_KINDS and STEP_KINDS[n].place == SCALE for n in names)
    plain = not logs and scale in ("counts", "linear", "beta-values")
    found: list[str | Mapping[str, Any]] = []
    for name, entry in zip(names, entries, strict=True):
        if plain and name in ("half-minimum", "below-limit"):
            given = {} if isinstance(entry, str) else entry
            found.append({"step": name, "scale": "linear", **given})
        else:
            found.append(entry)
    return tuple(found)
