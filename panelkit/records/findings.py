"""What was noticed about the data: findings, dropped things, participant flow."""

from collections.abc import Iterator, Sequence
from dataclasses import astuple, dataclass, fields
from typing import TYPE_CHECKING, Literal, get_args, overload

from panelkit.records.record import Record, frame

if TYPE_CHECKING:
    import pandas as pd

__all__ = ["Dropped", "Finding", "Findings", "Flow", "Severity"]

Severity = Literal["info", "warning", "stop"]


@dataclass(frozen=True, slots=True)
class Finding:
    """One thing noticed about the data.

    Attributes
    ----------
    code : str
        Stable word code, for example ``"outcome-tied-to-batch"``.
    severity : {"info", "warning", "stop"}
        ``stop`` means that results would mislead.
    where : str
        File, column, sample or feature.
    message : str
        What was seen, with figures.
    next_step : str
        What to do about it.
    """

    code: str
    severity: Severity
    where: str
    message: str
    next_step: str


@dataclass(frozen=True, slots=True, eq=False)
class Findings(Record, Sequence[Finding]):
    """All findings of a cohort, in the order in which they were made."""

    items: tuple[Finding, ...] = ()

    @overload
    def __getitem__(self, index: int) -> Finding: ...
    @overload
    def __getitem__(self, index: slice) -> "Findings": ...
    def __getitem__(self, index: int | slice) -> "Finding | Findings":
        if isinstance(index, slice):
            return Findings(self.items[index])
        return self.items[index]

    def __len__(self) -> int:
        return len(self.items)

    def __iter__(self) -> Iterator[Finding]:
        return iter(self.items)

    def of(self, severity: Severity) -> tuple[Finding, ...]:
        """Return the findings of one severity."""
        return tuple(item for item in self.items if item.severity == severity)

    def ordered(self) -> "Findings":
        """Return each finding once: what stops first, then warnings, then info."""
        rank = {severity: place for place, severity in enumerate(get_args(Severity))}
        once = dict.fromkeys(self.items)
        return Findings(tuple(sorted(once, key=lambda item: -rank[item.severity])))

    def to_frame(self) -> "pd.DataFrame":
        """Return one row a finding: code, severity, where, message, next_step."""
        names = [field.name for field in fields(Finding)]
        rows = [astuple(item) for item in self.items]
        return frame({name: [row[i] for row in rows] for i, name in enumerate(names)})


@dataclass(frozen=True, slots=True)
class Dropped:
    """One thing that was left out, and why.

    Attributes
    ----------
    kind : {"sample", "feature"}
        What was dropped.
    id : str
        Its own id.
    stage : str
        The stage that dropped it.
    reason : str
        Why, in words.
    """

    kind: Literal["sample", "feature"]
    id: str
    stage: str
    reason: str


@dataclass(frozen=True, slots=True)
class Flow:
    """Samples of one class on their way to the analysis (one row of `flow.csv`).

    Attributes
    ----------
    outcome_class : str
        The class as written in the sample sheet; ``""`` for none.
    received : int
        Rows of the sample sheet.
    matched : int
        Of these, with a row of the expression matrix.
    with_outcome : int
        Of these, with a usable outcome.
    kept : int
        Of these, kept by the row filters.
    analysed : int
        Of these, analysed (technical replicates left out).
    set_aside : int
        Rows of the sample sheet that nothing may read yet. They have an entry of
        their own, since their class is not read either.
    """

    outcome_class: str
    received: int
    matched: int
    with_outcome: int
    kept: int
    analysed: int
    set_aside: int = 0
