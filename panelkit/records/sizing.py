"""How large a study has to be, or what an assay has to reach: one answer."""

from collections.abc import Mapping
from dataclasses import dataclass, fields
from typing import TYPE_CHECKING, Any

from panelkit.records.record import Record, frame

if TYPE_CHECKING:
    import pandas as pd

__all__ = ["Cell", "SizingAnswer", "SizingCurve", "SizingSeries", "SizingTable"]

Cell = str | int | float | None


@dataclass(frozen=True, slots=True, eq=False)
class SizingTable(Record):
    """A table of an answer.

    Attributes
    ----------
    name : str
        Stem of its file.
    title : str
        What it holds.
    header : tuple of str
        Column names.
    rows : tuple of tuple of (str, int, float or None)
        Cells; None where there is no number.
    """

    name: str
    title: str
    header: tuple[str, ...]
    rows: tuple[tuple[Cell, ...], ...]

    def to_frame(self) -> "pd.DataFrame":
        """Return the table as a data frame."""
        return frame(
            {
                name: [row[place] for row in self.rows]
                for place, name in enumerate(self.header)
            }
        )


@dataclass(frozen=True, slots=True, eq=False)
class SizingSeries(Record):
    """One line of a picture.

    Attributes
    ----------
    name : str
        What it shows.
    x, y : tuple of float
        Its points, ascending in `x`.
    low, high : tuple of float
        Interval of each point; empty where there is none.
    points_only : bool
        Whether the points are not joined.
    """

    name: str
    x: tuple[float, ...]
    y: tuple[float, ...]
    low: tuple[float, ...] = ()
    high: tuple[float, ...] = ()
    points_only: bool = False


@dataclass(frozen=True, slots=True, eq=False)
class SizingCurve(Record):
    """A picture of an answer, as numbers.

    Attributes
    ----------
    name : str
        Stem of its files.
    title, caption : str
        What is drawn, and what it says.
    x_label, y_label : str
        The axes.
    series : tuple of SizingSeries
        Its lines.
    target : float or None
        Height that was asked for.
    marked : tuple of (str, float)
        Places along x that answer the question.
    logarithmic : bool
        Whether both axes are drawn so.
    ticks : tuple of str
        Words below 1, 2, ... along x; empty for numbers.
    """

    name: str
    title: str
    caption: str
    x_label: str
    y_label: str
    series: tuple[SizingSeries, ...]
    target: float | None = None
    marked: tuple[tuple[str, float], ...] = ()
    logarithmic: bool = False
    ticks: tuple[str, ...] = ()

    def to_frame(self) -> "pd.DataFrame":
        """Return the points of every line, one row a point."""
        rows = [
            (
                line.name,
                line.x[k],
                line.y[k],
                line.low[k] if line.low else None,
                line.high[k] if line.high else None,
            )
            for line in self.series
            for k in range(len(line.x))
        ]
        names = ("series", self.x_label, self.y_label, "low", "high")
        return frame(
            {name: [row[place] for row in rows] for place, name in enumerate(names)}
        )


@dataclass(frozen=True, slots=True, eq=False)
class SizingAnswer(Record):
    """What a question about sizes or assays is answered.

    Attributes
    ----------
    question : str
        What was asked, in words.
    sentence : str
        The answer in words.
    figures : mapping of str to (float, int, str or None)
        The numbers of the answer by name.
    inputs : mapping of str to (float, int or str)
        What was given or taken as default.
    assumptions : tuple of str
        Everything that the answer rests on, in words.
    tables : tuple of SizingTable
        What stands behind it.
    curve : SizingCurve or None
        Its picture.
    sources : tuple of str
        Publications of the formulas.
    """

    question: str
    sentence: str
    figures: Mapping[str, Cell]
    inputs: Mapping[str, Cell]
    assumptions: tuple[str, ...]
    tables: tuple[SizingTable, ...]
    curve: SizingCurve | None
    sources: tuple[str, ...]

    def to_frame(self) -> "pd.DataFrame":
        """Return the numbers of the answer as a data frame of one row."""
        return frame({key: [value] for key, value in self.figures.items()})

    def content(self) -> dict[str, Any]:
        """Return the answer as plain values, for JSON."""
        plain = {
            each.name: getattr(self, each.name)
            for each in fields(self)
            if each.name not in ("tables", "curve")
        }
        return {
            **plain,
            "figures": dict(self.figures),
            "inputs": dict(self.inputs),
            "assumptions": list(self.assumptions),
            "sources": list(self.sources),
            "tables": {
                table.name: [
                    dict(zip(table.header, row, strict=True)) for row in table.rows
                ]
                for table in self.tables
            },
        }
