"""What determines a run's results, and nothing else."""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, Literal

__all__ = ["RunRecord"]


@dataclass(frozen=True, slots=True)
class RunRecord:
    """Content of ``record.json``.

    Attributes
    ----------
    format : int
        Version of this layout.
    panelkit : str
        Version of panelkit.
    study : mapping of str to object
        Every setting that determines results, defaults filled in.
    inputs : mapping of str to str
        Role of each input file to its SHA-256.
    versions : mapping of str to str
        Python and the libraries whose arithmetic enters results.
    openings : int
        How often the rows that were set aside have been opened so far.
    """

    format: Literal[1]
    panelkit: str
    study: Mapping[str, Any]
    inputs: Mapping[str, str]
    versions: Mapping[str, str]
    openings: int = 0
