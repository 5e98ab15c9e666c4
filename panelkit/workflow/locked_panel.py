"""`LockedPanel`: a panel file that scores new samples."""

import csv
import hashlib
import io
import os
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from panelkit.errors import InputDataError, name_some
from panelkit.ingest import MarkerTable, read_markers
from panelkit.lock import (
    Scores,
    panel_bytes,
    read_panel,
    score_samples,
)
from panelkit.records import RESEARCH_USE, PanelContent, frame
from panelkit.runtime import json_bytes, write_whole

__all__ = ["LockedPanel", "ScoredTable", "score_bytes", "score_table"]


@dataclass(frozen=True, slots=True, eq=False)
class ScoredTable:
    """Scores of a table of samples.

    Attributes
    ----------
    panel : PanelContent
        What scored them.
    scores : Scores
        Log-odds, chances, calls, flags, contributions.
    table : MarkerTable
        What was scored.
    """

    panel: PanelContent
    scores: Scores
    table: MarkerTable

    @property
    def samples(self) -> tuple[str, ...]:
        """Ids of the samples."""
        return self.scores.samples

    @property
    def log_odds(self) -> Any:
        """Log-odds of the positive class, shape (n_samples,)."""
        return self.scores.log_odds

    @property
    def chances(self) -> Any:
        """Chances of the positive class, shape (n_samples,)."""
        return self.scores.chances

    @property
    def flags(self) -> tuple[str, ...]:
        """What is to be kept in mind of each sample; ``""`` for nothing."""
        return self.scores.flags

    def to_frame(self) -> Any:
        """Return one row a sample: score, calls, flags, contributions."""
        return frame(dict(self.scores.columns(self.panel)))


@dataclass(frozen=True, slots=True, eq=False)
class LockedPanel:
    """A locked panel.

    Attributes
    ----------
    content : PanelContent
        All that the file holds.
    """

    content: PanelContent

    @classmethod
    def read(cls, path: "str | os.PathLike[str]") -> "LockedPanel":
        """Return the panel that a file holds.

        Parameters
        ----------
        path : path
            A panel file.

        Returns
        -------
        LockedPanel
            Checked: layout, hash, sense.

        Raises
        ------
        PanelFileError
            The file cannot be read or was changed.
        """
        return cls(read_panel(Path(path)))

    def write(self, path: "str | os.PathLike[str]") -> None:
        """Write the panel file, whole or not at all.

        Raises
        ------
        RunFolderError
            It cannot be written.
        """
        with write_whole(Path(path)) as file:
            file.write(panel_bytes(self.content))

    def score(
        self,
        table: Any,
        *,
        unit: str | None = None,
    ) -> ScoredTable:
        """Return scores with flags; nothing is learnt from the samples.

        Parameters
        ----------
        table : path, AnnData or pandas.DataFrame
            Samples with the panel's features, measured as the training samples were.
        unit : str, optional
            Unit of the values; refused where the panel was learnt in another one.

        Returns
        -------
        ScoredTable
            A sample's bits depend on no other sample.

        Raises
        ------
        InputDataError
            A missing marker without fallback, another unit or another scale.
        """
        panel = self.content
        read = read_markers(table, panel.features)
        _refuse_units(panel, read, unit)
        scores = score_samples(
            panel, read.samples, read.values, lost_marker(panel, read), read.where
        )
        return ScoredTable(panel, scores, read)


def lost_marker(panel: PanelContent, table: MarkerTable) -> str:
    """Return the one marker that a table does not have, or ``""``.

    Raises
    ------
    InputDataError
        More than one is missing, or a reference is.
    """
    markers = [marker.feature for marker in panel.markers]
    lost = list(table.missing)
    if len(lost) > 1 or (lost and lost[0] not in markers):
        raise InputDataError(
            code="marker-missing",
            where=table.where,
            what=f"the panel's assays {name_some(lost)} are missing",
            accepted="every marker and reference, or all but one marker that the panel "
            "has a fallback for",
            next_step="Add them to the table",
        )
    return lost[0] if lost else ""


def _refuse_units(panel: PanelContent, table: MarkerTable, unit: str | None) -> None:
    own = [marker.unit for marker in panel.markers]
    for k, learnt in enumerate(own):
        for said in (unit, table.units[k]):
            if said and said != learnt:
                known = f"'{learnt}'" if learnt else "a unit that its study left open"
                raise InputDataError(
                    code="unit-unknown",
                    where=f"{table.where}, marker {panel.markers[k].feature}",
                    what=f"the values are said to be in another unit (got {said!r})",
                    accepted=f"the panel was learnt in {known}",
                    next_step="Convert the values, or leave the unit out if they are "
                    "as the training samples had them",
                )


def score_bytes(scored: ScoredTable) -> bytes:
    """Return the score file: CSV, floats so that they read back to the same bits."""
    columns = scored.scores.columns(scored.panel)
    text = io.StringIO()
    writer = csv.writer(text, lineterminator="\n")
    writer.writerow(columns)
    writer.writerows(
        [_cell(value) for value in row] for row in zip(*columns.values(), strict=True)
    )
    return text.getvalue().encode()


def _cell(value: object) -> str:
    if isinstance(value, float | np.floating):
        return "" if np.isnan(value) else repr(float(value))
    return str(value)


def score_table(
    panel: "str | os.PathLike[str]",
    table: "str | os.PathLike[str]",
    out: "str | os.PathLike[str]",
    *,
    unit: str | None = None,
) -> Mapping[str, Any]:
    """Score a table and write the score file, and a JSON file that vouches for it.

    Parameters
    ----------
    panel, table : path
        Panel file; table of samples.
    out : path
        The CSV file; beside it comes one of the same name with ``.json``.
    unit : str, optional
        Unit of the values.

    Returns
    -------
    mapping of str to object
        What the JSON file holds: hashes, counts, research use.

    Raises
    ------
    PanelFileError, InputDataError, RunFolderError
        With exit codes 6, 3 and 7.
    """
    scored = LockedPanel.read(panel).score(table, unit=unit)
    data = score_bytes(scored)
    with write_whole(Path(out)) as file:
        file.write(data)
    content = {
        "panel": scored.panel.name,
        "panel_sha256": scored.panel.content_sha256,
        "table_sha256": scored.table.sha256,
        "scores_sha256": hashlib.sha256(data).hexdigest(),
        "scores": Path(out).name,
        "samples": len(scored.samples),
        "flagged": sum(flag != "" for flag in scored.flags),
        "without_score": int(np.isnan(scored.log_odds).sum()),
        "positive_class": scored.panel.positive,
        "missing_marker": scored.scores.missing,
        "cautions": list(scored.panel.cautions),
        "research_use": RESEARCH_USE,
    }
    with write_whole(Path(f"{out}.json")) as file:
        file.write(json_bytes(content))
    return content
