"""The run record: what determines results."""

import platform
from collections.abc import Mapping
from dataclasses import asdict
from importlib.metadata import version
from typing import Any

from panelkit.config import Study
from panelkit.records import RunRecord
from panelkit.runtime import json_bytes

__all__ = ["record_bytes", "run_record"]

LIBRARIES = ("anndata", "numba", "numpy", "pandas", "scikit-learn", "scipy")


def run_record(
    study: Study,
    inputs: Mapping[str, str],
    steps: Mapping[str, Any],
    openings: int = 0,
) -> RunRecord:
    """Return the record of a run.

    Parameters
    ----------
    study : Study
        Its effective settings enter, not its text.
    inputs : mapping of str to str
        Role of each input file to its SHA-256.
    steps : mapping of str to object
        Discovery and assay part with every default written out.
    openings : int
        How often the rows that were set aside have been opened so far.

    Returns
    -------
    RunRecord
        Equal for equal results.
    """
    settings = study.effective()
    settings["preparation"] = {**settings["preparation"], **steps}
    return RunRecord(
        format=1,
        panelkit=version("panelkit"),
        study=settings,
        inputs=dict(sorted(inputs.items())),
        versions={
            "python": platform.python_version(),
            **{name: version(name) for name in LIBRARIES},
        },
        openings=openings,
    )


def record_bytes(record: RunRecord) -> bytes:
    """Return the content of ``record.json``."""
    return json_bytes(asdict(record))
