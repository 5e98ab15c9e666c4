"""The numbers behind the figures of lost markers, people and groups."""

from panelkit.records import Fragility, LearningPoint, Record, RunSummary, Subgroup
from panelkit.report.draw_fragility import fragility_rows
from panelkit.report.draw_subgroups import drawn_groups
from panelkit.report.tables import Table

__all__ = ["lost_markers_table", "people_table", "subgroup_table"]


def _table(
    kind: type[Record], rows: list[object], without: tuple[str, ...] = ()
) -> Table:
    slots: list[str] = list(kind.__slots__)
    names = [name for name in slots if name not in without]
    return [
        tuple(names),
        *(tuple(getattr(row, name) for name in names) for row in rows),
    ]


def lost_markers_table(summary: RunSummary) -> Table:
    """Return the drawn losses, the gravest marker first."""
    rows = [
        row for events in fragility_rows(summary).values() for row in events.values()
    ]
    return _table(Fragility, [*rows], ("level", "sentence"))


def people_table(summary: RunSummary) -> Table:
    """Return the points of the learning curve."""
    return _table(LearningPoint, [*summary.aftermath.learning_curve])


def subgroup_table(summary: RunSummary) -> Table:
    """Return the drawn groups."""
    return _table(Subgroup, [*drawn_groups(summary)], ("sentence",))
