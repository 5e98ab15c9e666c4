"""Several matrices of different samples, joined by their features."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any, Literal, get_args

import numpy as np

from panelkit.errors import InputDataError, UsageError
from panelkit.ingest.alignment import FeatureMajor, mismatch_hint
from panelkit.ingest.expression_source import (
    Expressions,
    ExpressionSource,
    TurnedMatrix,
    open_expression,
)
from panelkit.ingest.joined_sheets import joined_feature_sheet
from panelkit.ingest.matrix_table import (
    DeferredValues,
    Numbers,
    Positions,
    values_of_samples,
)
from panelkit.ingest.reader import ReadOptions, new_matrix
from panelkit.ingest.sheet import Sheet, Text
from panelkit.ingest.wording import counted, nearest_hint, quoted
from panelkit.records import Finding

__all__ = ["ORIGIN", "Join", "JoinedSources", "open_expressions"]

Join = Literal["refuse", "intersection"]

ORIGIN = "source_file"
"""The column of the sample sheet that says which file a sample came from."""


@dataclass(slots=True, eq=False)
class JoinedSources:
    """Expression data of several sources; satisfies `Expressions`.

    Attributes
    ----------
    parts : sequence of ExpressionSource
        In the order named.
    names : sequence of str
        What the column `source_file` calls them, unique.
    join : {"refuse", "intersection"}
        What is done when features differ.
    """

    parts: Sequence[ExpressionSource]
    names: Sequence[str]
    join: Join
    _turned: tuple[TurnedMatrix, ...] = ()

    @property
    def where(self) -> str:
        """The files, for messages."""
        return " and ".join(self.names)

    def sample_sheet(self, orientation: str) -> Sheet | None:
        """Return the sheets of all parts below one another, if all have one.

        Parameters
        ----------
        orientation : {"auto", "samples-in-rows", "features-in-rows"}
            Which way round the matrices are.

        Returns
        -------
        Sheet or None
            Columns of some parts only are blank in the others.

        Raises
        ------
        InputDataError
            When a sample occurs in several parts.
        """
        sheets = [part.sample_sheet(orientation) for part in self.parts]
        known = [sheet for sheet in sheets if sheet is not None]
        if len(known) < len(sheets):
            return None
        self._refuse_shared([list(sheet.ids) for sheet in known])
        columns = dict.fromkeys(name for sheet in known for name in sheet.columns)
        return Sheet(
            self.where,
            np.concatenate([sheet.ids for sheet in known]),
            {
                name: np.concatenate([_column(sheet, name) for sheet in known])
                for name in columns
            },
            tuple(finding for sheet in known for finding in sheet.findings),
        )

    def with_origin(
        self, sheet: Sheet | None, orientation: str, max_bad_cells: int
    ) -> Sheet | None:
        """Return the sample sheet with the column `source_file`.

        Parameters
        ----------
        sheet : Sheet or None
            As given, or as the data brought it.
        orientation : {"auto", "samples-in-rows", "features-in-rows"}
            Which way round the matrices are.
        max_bad_cells : int
            Largest number of non-numeric cells of each part.

        Returns
        -------
        Sheet
            Blank for samples of no file. A column of that name that is there already
            is kept as it is.

        Raises
        ------
        InputDataError
            When a part cannot be read, or a sample occurs in several of them.
        """
        own = sheet is None or sheet.where == self.where
        self._turned = tuple(
            part.turned(_of_part(sheet, part, own, orientation), own, orientation,
                        max_bad_cells)
            for part in self.parts
        )  # fmt: skip
        samples = [turned.matrix.samples for turned in self._turned]
        self._refuse_shared(samples)
        origin = {
            name: label
            for label, ids in zip(self.names, samples, strict=True)
            for name in ids
        }
        if sheet is None:
            sheet = Sheet(self.where, np.array(list(origin), dtype=object), {})
        if ORIGIN in sheet.columns:
            return sheet
        column = np.array([origin.get(name, "") for name in sheet.ids], dtype=object)
        return replace(sheet, columns={**sheet.columns, ORIGIN: column})

    def _refuse_shared(self, samples: Sequence[Sequence[str]]) -> None:
        seen: dict[str, str] = {}
        shared: list[str] = []
        for label, ids in zip(self.names, samples, strict=True):
            shared += [f"{i} ({seen[i]}, {label})" for i in ids if i in seen]
            seen.update(dict.fromkeys(ids, label))
        if shared:
            raise InputDataError(
                code="samples-in-several-files",
                where=self.where,
                what=f"{counted(len(shared), 'sample occurs', 'samples occur')} in "
                f"more than one file: {quoted(shared)}",
                accepted="every sample stands in one of the files",
                next_step="Remove the repeated samples, or give repeated measurements "
                "ids of their own and name the person in a subject column",
            )

    def turned(
        self, sheet: Sheet | None, own: bool, orientation: str, max_bad_cells: int
    ) -> TurnedMatrix:
        """Return the joined matrix; `with_origin` has read the parts.

        Parameters
        ----------
        sheet : Sheet or None
            The sample sheet.
        own : bool
            Whether it came with the data.
        orientation : str
            Which way round the matrices are.
        max_bad_cells : int
            Largest number of non-numeric cells of each part.

        Returns
        -------
        TurnedMatrix
            Features in the order of the first part.

        Raises
        ------
        InputDataError
            When the features differ and `join` does not say what to do.
        """
        matrices = [turned.matrix for turned in self._turned]
        features, findings = _shared_features(matrices, self.names, self.join)
        rows = [_rows_of(features, matrix) for matrix in matrices]
        ends = np.cumsum([len(matrix.samples) for matrix in matrices])
        samples = [name for matrix in matrices for name in matrix.samples]
        where = self.where

        def take_columns(positions: Positions) -> Numbers:
            part_of = np.searchsorted(ends, positions, side="right")
            taken: Numbers | None = None
            for number, matrix in enumerate(matrices):
                turns = np.flatnonzero(part_of == number)
                if not len(turns):
                    continue
                start = ends[number] - len(matrix.samples)
                values = values_of_samples(matrix.values, positions[turns] - start)
                kind = np.result_type(values, taken if taken is not None else values)
                if taken is None:
                    taken = new_matrix(where, len(features), len(positions), kind)
                elif taken.dtype != kind:
                    taken = taken.astype(kind)
                taken[:, turns] = (
                    values if rows[number] is None else values[rows[number]]
                )
            return taken if taken is not None else np.empty((len(features), 0))

        def take_rows(positions: Positions) -> Numbers:
            every = np.arange(len(samples))
            return np.ascontiguousarray(take_columns(every)[positions].T)

        values = DeferredValues((len(features), len(samples)), take_rows, take_columns)
        sheets = [turned.feature_sheet for turned in self._turned]
        return TurnedMatrix(
            FeatureMajor(where, features, samples, values),
            joined_feature_sheet(sheets, self.names, features),
            [*(f for turned in self._turned for f in turned.noted), *findings],
            tuple(bad for turned in self._turned for bad in turned.bad_cells),
        )

    def refuse_strangers(
        self, sheet: Sheet, missing: Sequence[str], max_bad_cells: int
    ) -> None:
        """Return: `with_origin` has held every part against the sheet.

        Parameters
        ----------
        sheet : Sheet
            The sample sheet.
        missing : sequence of str
            Columns that it does not have.
        max_bad_cells : int
            Largest number of non-numeric cells of each part.
        """

    def hashes(self) -> dict[str, str]:
        """Return the SHA-256 of each file, numbered in the order named."""
        return {
            role.replace("expression", f"expression-{number}", 1): digest
            for number, part in enumerate(self.parts, 1)
            for role, digest in part.hashes().items()
        }


def _column(sheet: Sheet, name: str) -> Text:
    blank = np.full(len(sheet.ids), "", dtype=object)
    return sheet.columns.get(name, blank)


def _of_part(
    sheet: Sheet | None, part: ExpressionSource, own: bool, orientation: str
) -> Sheet | None:
    """Return the sheet that decides how a part lies: its own one, if it has one."""
    return part.sample_sheet(orientation) if own else sheet


def _rows_of(features: list[str], matrix: FeatureMajor) -> Positions | None:
    """Return where the features stand in a part, None for the same order."""
    if features == matrix.features:
        return None
    place = {name: position for position, name in enumerate(matrix.features)}
    return np.array([place[name] for name in features], dtype=np.int64)


def _shared_features(
    matrices: Sequence[FeatureMajor], names: Sequence[str], join: Join
) -> tuple[list[str], list[Finding]]:
    """Return the features that all parts have, in the order of the first."""
    first = matrices[0].features
    shared = set(first).intersection(*(matrix.features for matrix in matrices[1:]))
    if all(len(shared) == len(matrix.features) for matrix in matrices):
        return first, []
    counts = ", ".join(
        f"{label} has {len(matrix.features):,}"
        for label, matrix in zip(names, matrices, strict=True)
    )
    alone = [
        f"{name} ({label})"
        for label, matrix in zip(names, matrices, strict=True)
        for name in matrix.features
        if name not in shared
    ]
    if join == "refuse" or not shared:
        hint = (
            mismatch_hint(first, matrices[1].features, names[1]) if not shared else ""
        )
        raise InputDataError(
            code="features-differ",
            where=" and ".join(names),
            what=f"the files do not have the same features ({counts}; {len(shared):,} "
            f"are in all of them; not in all: {quoted(alone)})"
            + (f"; {hint}" if hint else ""),
            accepted="the same features in every file, in any order",
            next_step="Correct the ids, or keep the features of all files with join = "
            "'intersection'"
            if shared
            else "Make the feature ids equal in all files",
        )
    return [name for name in first if name in shared], [
        Finding(
            code="features-not-in-all-files",
            severity="warning",
            where=" and ".join(names),
            message=f"{counts}; {len(shared):,} are in all of them and kept, "
            f"{len(alone):,} are left out: {quoted(alone)}",
            next_step="Check that nothing that matters is left out.",
        )
    ]


def open_expressions(
    expression: object, options: ReadOptions, join: str
) -> Expressions:
    """Return one or several sources of expression data opened.

    Parameters
    ----------
    expression : path, AnnData, pandas.DataFrame, or a list of them
        As handed to `read_cohort`.
    options : ReadOptions
        What the caller says beside them; it holds for every one.
    join : {"refuse", "intersection"}
        What is done when the features of several sources differ.

    Returns
    -------
    Expressions
        Ready to be read.

    Raises
    ------
    UsageError
        When `join` is another word, a list is empty or options cannot be meant.
    InputDataError
        When a file is missing, empty or cannot be read.
    """
    if join not in get_args(Join):
        raise UsageError(
            code="unknown-join",
            where="join",
            what=f"{join!r} is no way to join matrices",
            accepted=f"{nearest_hint(join, get_args(Join))}accepted are "
            f"{quoted(get_args(Join))}",
            next_step="Use one of these words",
        )
    if not isinstance(expression, list | tuple):
        return open_expression(expression, options)
    if len(expression) == 1:
        return open_expression(expression[0], options)
    if not expression:
        raise UsageError(
            code="expression-not-understood",
            where="expression",
            what="the list of matrices is empty",
            accepted="a list names at least one matrix",
            next_step="Name the matrices",
        )
    parts = [open_expression(each, options) for each in expression]
    kind: Any = "intersection" if join == "intersection" else "refuse"
    return JoinedSources(parts, _labels(parts), kind)


def _labels(parts: Sequence[ExpressionSource]) -> list[str]:
    """Return a name for each part: the file's, with its folder where names repeat."""
    plain = [part.where for part in parts]
    paths: list[Mapping[str, Path]] = [part.files for part in parts]
    labels = [
        name
        if plain.count(name) == 1 or "expression" not in files
        else "/".join(files["expression"].parts[-2:])
        for name, files in zip(plain, paths, strict=True)
    ]
    return [
        label if labels.count(label) == 1 else f"{label} ({number})"
        for number, label in enumerate(labels, 1)
    ]
