"""The outcome: what is to be told from the features, of four kinds."""

from dataclasses import dataclass
from typing import TYPE_CHECKING, Literal

import numpy as np
from numpy.typing import NDArray

from panelkit.records.record import Record, frame

if TYPE_CHECKING:
    import pandas as pd

__all__ = ["Outcome", "OutcomeKind"]

OutcomeKind = Literal["binary", "classes", "number", "survival"]


@dataclass(frozen=True, slots=True, eq=False)
class Outcome(Record):
    """The clinical outcome of each analysed sample.

    Attributes
    ----------
    kind : {"binary", "classes", "number", "survival"}
        Two classes; three or more; a number; a time until an event or until the end
        of observation.
    column : str
        Column of the sample sheet; for survival the one with the times.
    negative, positive : str
        The classes of a binary outcome as written; scores point to `positive`.
        ``""`` for other kinds.
    values : ndarray of shape (n_samples,), float64
        Binary: 1.0 for `positive`, 0.0 for `negative`. Classes: the position in
        `classes`. Number: the number. Survival: the time.
    classes : tuple of str
        Binary: `negative`, `positive`. Classes: all of them, in the order asked for.
        Empty for other kinds.
    event : ndarray of shape (n_samples,), bool, or None
        Survival: True where the event was seen, False where the time is censored.
    event_column : str
        Survival: column of the sample sheet with the event codes.
    event_codes : tuple of str
        Survival: the codes as written that mean event and censored.
    unit : str
        Unit of a number or of the times, in the user's words; may be ``""``.
    horizon : float or None
        Survival: the time up to which chances are asked for, in `unit`.
    """

    kind: OutcomeKind
    column: str
    negative: str
    positive: str
    values: NDArray[np.float64]
    classes: tuple[str, ...] = ()
    event: NDArray[np.bool_] | None = None
    event_column: str = ""
    event_codes: tuple[str, ...] = ()
    unit: str = ""
    horizon: float | None = None

    def __post_init__(self) -> None:
        """Give a binary outcome its two classes in the order of its values."""
        if self.kind == "binary" and not self.classes:
            object.__setattr__(self, "classes", (self.negative, self.positive))
        # slots replace the class, so that a bare super() would miss it
        Record.__post_init__(self)

    @property
    def groups(self) -> tuple[tuple[str, ...], NDArray[np.int64]]:
        """Names of the groups in which samples are counted, and each sample's group.

        Classes as they are; censored and event of survival; none for a number.
        """
        if self.event is not None:
            return ("censored", "event"), self.event.astype(np.int64)
        if self.classes:
            return self.classes, self.values.astype(np.int64)
        return (), np.zeros(len(self.values), np.int64)

    def to_frame(self) -> "pd.DataFrame":
        """Return one row a sample: value, and class or event where there is one."""
        if self.event is not None:
            return frame({"time": self.values, "event": self.event})
        names, codes = self.groups
        if not names:
            return frame({"value": self.values})
        written = np.array(names, dtype=object)[codes]
        return frame({"outcome_class": written, "value": self.values})
