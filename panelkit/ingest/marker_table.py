"""A table of new samples for a locked panel: known features, no sample sheet."""

import os
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from panelkit.config import COHORT
from panelkit.errors import InputDataError, name_some
from panelkit.ingest.alignment import orient
from panelkit.ingest.expression_source import open_expression
from panelkit.ingest.matrix_table import values_of_samples
from panelkit.ingest.reader import ReadOptions

if TYPE_CHECKING:
    import anndata
    import pandas as pd

__all__ = ["MarkerTable", "read_markers"]


@dataclass(frozen=True, slots=True, eq=False)
class MarkerTable:
    """Measured values of the features of a panel.

    Attributes
    ----------
    where : str
        The file or argument, for messages.
    samples : tuple of str
        Ids, in file order.
    values : ndarray of shape (n_features, n_samples), float64
        In the order asked for; NaN where missing.
    missing : tuple of str
        Features that the table does not have.
    units : tuple of str
        Of the features, where the table says so; ``""`` elsewhere.
    sha256 : str
        Hash of the file; empty for an object in memory.
    """

    where: str
    samples: tuple[str, ...]
    values: NDArray[np.float64]
    missing: tuple[str, ...]
    units: tuple[str, ...]
    sha256: str


def read_markers(
    table: "str | os.PathLike[str] | anndata.AnnData | pd.DataFrame",
    features: Sequence[str],
) -> MarkerTable:
    """Return the values of some features for every sample of a table.

    Parameters
    ----------
    table : path, AnnData or pandas.DataFrame
        A file of any format that `read_cohort` takes, or an object in memory; other
        features may stand beside. A file may be either way round: the features' ids
        decide.
    features : sequence of str
        Which features, in the order of the result.

    Returns
    -------
    MarkerTable
        One column a sample.

    Raises
    ------
    InputDataError
        The table cannot be read, or has none of the features.
    """
    source = open_expression(table, ReadOptions())
    raw = source.opened.table(COHORT.max_bad_cells)
    wanted = set(features)
    in_columns = len(wanted & set(raw.column_ids))
    in_rows = len(wanted & set(raw.row_ids))
    if not in_columns and not in_rows:
        raise InputDataError(
            code="markers-not-there",
            where=source.where,
            what=f"it has none of the panel's assays: {name_some(features)}",
            accepted="a table with a column (or row) for each of them",
            next_step="Check the ids, and that this is the right table",
        )
    turned = in_rows > in_columns
    matrix, _assumed = orient(
        raw, None, "features-in-rows" if turned else "samples-in-rows"
    )
    place = {name: k for k, name in enumerate(matrix.features)}
    read = values_of_samples(matrix.values, np.arange(len(matrix.samples)))
    values = np.full((len(features), len(matrix.samples)), np.nan)
    for k, name in enumerate(features):
        if name in place:
            values[k] = read[place[name]]
    own = source.opened.sheet("rows" if turned else "columns")
    units = [""] * len(features)
    if own is not None and "unit" in own.columns:
        said = dict(zip(map(str, own.ids), own.columns["unit"], strict=True))
        units = [str(said.get(name, "")).strip() for name in features]
    return MarkerTable(
        where=source.where,
        samples=tuple(map(str, matrix.samples)),
        values=values,
        missing=tuple(name for name in features if name not in place),
        units=tuple(units),
        sha256=source.hashes().get("expression", ""),
    )
