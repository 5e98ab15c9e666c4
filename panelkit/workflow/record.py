"""The run record: what determines results."""

import json
import platform
from collections.abc import Mapping
from dataclasses import asdict
from importlib.metadata import version
from typing import Any

from panelkit.config import Study
from panelkit.costing import USING_PRICES
from panelkit.records import RunRecord
from panelkit.runtime import json_bytes

__all__ = ["record_bytes", "run_record", "without_prices"]

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


def without_prices(content: bytes) -> bytes:
    """Return what the finished folds of a run depend on: its record without prices.

    Unless a maker weighs prices no fold uses them, so that other quotes need no fold
    to be learnt again; whether anything is priced stays, since it decides which files
    there are.

    Parameters
    ----------
    content : bytes
        A ``record.json``.

    Returns
    -------
    bytes
        Equal for equal folds; the content itself where it is no record.
    """
    try:
        record = json.loads(content)
        study, inputs = dict(record["study"]), dict(record["inputs"])
    except (ValueError, KeyError, TypeError):
        return content
    makers = study.get("panels", {}).get("makers", ())
    if set(USING_PRICES) & set(makers):
        return content
    for name in ("platform", "kit"):
        study.pop(name, None)
    study["programme"] = "programme" in study
    for name in ("prices", "conflicts"):
        inputs.pop(name, None)
    return json_bytes({**record, "study": study, "inputs": inputs})
