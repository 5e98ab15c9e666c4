"""New samples for a locked panel: scored first, outcomes joined afterwards."""

import os
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from panelkit.errors import InputDataError, name_some
from panelkit.ingest import MarkerTable, read_cohort
from panelkit.lock import NewPeople, Scores, score_samples
from panelkit.records import Cohort, PanelContent, frame
from panelkit.workflow.locked_panel import LockedPanel, ScoredTable, lost_marker

__all__ = ["SheetColumns", "joined", "people_of", "scored_cohort"]


@dataclass(frozen=True, slots=True)
class SheetColumns:
    """Columns of a sample sheet of new people.

    Attributes
    ----------
    outcome : str or None
        None: as the panel's study calls it.
    positive, negative : str or None
        Classes as written; None: as in the panel's study.
    subject, replicate_of : str or None
        The person; the sample of which a row is a technical replicate.
    subgroups : sequence of str
        By which accuracy is looked at in parts.
    """

    outcome: str | None = None
    positive: str | None = None
    negative: str | None = None
    subject: str | None = None
    replicate_of: str | None = None
    subgroups: Sequence[str] = ()


def joined(
    scored: ScoredTable,
    samples: "str | os.PathLike[str]",
    columns: SheetColumns,
) -> tuple[Scores, NewPeople, list[str]]:
    """Return scored samples with the outcomes of a sample sheet.

    Parameters
    ----------
    scored : ScoredTable
        Made without the sheet.
    samples : path
        The sample sheet.
    columns : SheetColumns
        What its columns are.

    Returns
    -------
    scores : Scores
        Of the samples that have an outcome, in the order of the sheet.
    people : NewPeople
        These samples.
    notes : list of str
        Who was left out.

    Raises
    ------
    InputDataError
        The sheet cannot be used, or has not a column that is named.
    """
    panel, table = scored.panel, scored.table
    there = [k for k, name in enumerate(panel.features) if name not in table.missing]
    # whatever else the table holds has nothing to say about the outcome's rows
    narrow = frame({panel.features[k]: table.values[k] for k in there})
    narrow.index = list(table.samples)
    cohort = read_cohort(
        narrow,
        samples,
        outcome=columns.outcome or panel.outcome,
        positive=columns.positive or panel.positive,
        negative=columns.negative or panel.negative,
        subject=columns.subject,
        replicate_of=columns.replicate_of,
    )
    place = {name: i for i, name in enumerate(table.samples)}
    rows = [place[str(name)] for name in cohort.samples]
    values = table.values[:, rows]
    scores = score_samples(
        panel,
        [str(name) for name in cohort.samples],
        values,
        lost_marker(panel, table),
        table.where,
    )
    people = people_of(panel, cohort, table, columns.subgroups)
    return scores, people, _left_out(cohort)


def people_of(
    panel: PanelContent, cohort: Cohort, table: MarkerTable, subgroups: Sequence[str]
) -> NewPeople:
    """Return the samples of a cohort as those who judge a panel.

    Raises
    ------
    InputDataError
        The sheet has not a column that is named, or the cohort no outcome.
    """
    unknown = [name for name in subgroups if name not in cohort.sample_columns]
    if unknown or cohort.outcome is None:
        raise InputDataError(
            code="unknown-column",
            where="sample sheet",
            what=f"there is no column {name_some(unknown) or panel.outcome}",
            accepted=f"columns are {name_some(cohort.sample_columns, 20)}",
            next_step="Correct the name",
        )
    place = {name: i for i, name in enumerate(table.samples)}
    rows = [place[str(name)] for name in cohort.samples]
    design = cohort.design
    return NewPeople(
        samples=cohort.samples,
        subject_ids=design.subject_ids[design.subject],
        subjects=design.subject,
        outcome=cohort.outcome.values,
        values=table.values[:, rows],
        groups={name: cohort.sample_columns[name] for name in subgroups},
        openings=len(cohort.openings),
    )


def _left_out(cohort: Cohort) -> list[str]:
    left = [item for item in cohort.dropped if item.kind == "sample"]
    if not left:
        return []
    reasons: dict[str, int] = {}
    for item in left:
        reasons[item.reason] = reasons.get(item.reason, 0) + 1
    listed = "; ".join(f"{n} {reason}" for reason, n in sorted(reasons.items()))
    return [f"Left out: {listed}."]


def scored_cohort(panel: LockedPanel, cohort: Cohort) -> ScoredTable:
    """Return the scores of a cohort in memory; its outcome is not looked at.

    Raises
    ------
    InputDataError
        A missing marker without fallback, or another scale.
    """
    content = panel.content
    place = {str(name): j for j, name in enumerate(cohort.features)}
    values = np.full((len(content.features), cohort.n_samples), np.nan)
    for k, name in enumerate(content.features):
        if name in place:
            values[k] = cohort.values[place[name]]
    table = MarkerTable(
        where="rows set aside",
        samples=tuple(map(str, cohort.samples)),
        values=values,
        missing=tuple(name for name in content.features if name not in place),
        units=("",) * len(content.features),
        sha256=(cohort.sources or {}).get("expression", ""),
    )
    scores = score_samples(
        content, table.samples, values, lost_marker(content, table), table.where
    )
    return ScoredTable(content, scores, table)
