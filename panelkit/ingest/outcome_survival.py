"""Survival outcomes: a time, and whether the event was seen or the time is censored."""

from collections import Counter
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import InputDataError, UsageError
from panelkit.ingest.cells import cell_number, is_missing
from panelkit.ingest.outcome_column import (
    CELL_ADVICE,
    MIN_SUBJECTS,
    OutcomeWords,
    named_cells,
    with_counts,
)
from panelkit.ingest.outcome_number import numbers_of
from panelkit.ingest.sheet import Sheet, Text
from panelkit.ingest.wording import as_text, nearest_hint
from panelkit.records import Outcome

__all__ = ["OutcomeSurvival", "outcome_survival"]

EVENT, CENSORED = "event", "censored"
PLAIN_CODES = ("1", "0")

Mask = NDArray[np.bool_]


@dataclass(frozen=True, slots=True, eq=False)
class OutcomeSurvival:
    """A column of times and a column of event codes.

    Attributes
    ----------
    sheet : str
        The sheet, for messages.
    words : OutcomeWords
        Columns, unit, horizon.
    ids, times, codes : ndarray of shape (n_rows,), object
        Samples, and both columns as written; codes that are 0 and 1 as such.
    values : ndarray of shape (n_rows,), float64
        Times, NaN where there is no number.
    labels : ndarray of shape (n_rows,), object
        ``"event"`` or ``"censored"``, ``""`` where time and code are blank; rows with
        another code count as ``"event"`` until they are refused.
    meanings : tuple of str
        The codes that mean event and censored.
    """

    sheet: str
    words: OutcomeWords
    ids: Text
    times: Text
    codes: Text
    values: NDArray[np.float64]
    labels: Text
    meanings: tuple[str, str]

    @property
    def where(self) -> str:
        """Sheet and columns."""
        return f"{self.sheet}, columns {self.words.time!r} and {self.words.event!r}"

    def usable(self) -> Mask:
        """Return which rows have a time or an event code."""
        return np.asarray(self.labels != "", dtype=bool)

    def settle(self, rows: Mask) -> tuple[str, ...]:
        """Return the two groups, after every time and code has been looked at.

        Parameters
        ----------
        rows : ndarray of shape (n_rows,), bool
            Rows that were matched, have an outcome and were kept.

        Returns
        -------
        tuple of str
            Event and censored.

        Raises
        ------
        InputDataError
            When a time or a code is missing alone, a time is no number or not above
            0, or a code is neither of the two.
        """
        self._refuse_halves(rows)
        self._refuse_times(rows)
        self._refuse_other_codes(rows)
        return (EVENT, CENSORED)

    @property
    def _where_time(self) -> str:
        return f"{self.sheet}, column {self.words.time!r}"

    @property
    def _where_event(self) -> str:
        return f"{self.sheet}, column {self.words.event!r}"

    def _refuse_halves(self, rows: Mask) -> None:
        """Refuse a code without a time, and a time without a code."""
        advice = "blank both cells of a sample without follow-up"
        wrong = rows & np.array([is_missing(cell) for cell in self.times], bool)
        if wrong.any():
            raise InputDataError(
                code="time-missing",
                where=self._where_time,
                what="samples with an event code have no time "
                + named_cells(wrong, self.ids, self.codes),
                accepted=f"a time for each; {advice}",
                next_step=CELL_ADVICE,
            )
        wrong = rows & np.asarray(self.codes == "", bool)
        if wrong.any():
            raise InputDataError(
                code="event-missing",
                where=self._where_event,
                what="samples with a time have no event code "
                + named_cells(wrong, self.ids, self.times),
                accepted=f"a code for each; {advice}",
                next_step=CELL_ADVICE,
            )

    def _refuse_times(self, rows: Mask) -> None:
        """Refuse times that are no numbers, or not above 0."""
        wrong = rows & np.isnan(self.values)
        if wrong.any():
            raise InputDataError(
                code="time-not-numeric",
                where=self._where_time,
                what=f"times are no numbers {named_cells(wrong, self.ids, self.times)}",
                accepted="finite numbers with a decimal point",
                next_step=CELL_ADVICE,
            )
        wrong = rows & (self.values <= 0.0)
        if wrong.any():
            raise InputDataError(
                code="time-not-positive",
                where=self._where_time,
                what="times are not above 0 "
                + named_cells(wrong, self.ids, self.times),
                accepted="times above 0, counted from the same start for everybody",
                next_step=CELL_ADVICE,
            )

    def _refuse_other_codes(self, rows: Mask) -> None:
        others = Counter(str(c) for c in self.codes[rows] if c not in self.meanings)
        if others:
            raise InputDataError(
                code="other-event-codes",
                where=self._where_event,
                what=f"codes other than {self.meanings[0]!r} (event) and "
                f"{self.meanings[1]!r} (censored) occur: {with_counts(others)}",
                accepted="one event and censoring; events that compete with it are "
                "not modelled",
                next_step="Write a column that counts the other event as this event "
                "(any of both) or as censored at its time (this event alone), "
                "whichever is asked, or leave these samples out with keep",
            )

    def record(
        self, rows: NDArray[np.int64], groups: tuple[str, ...], subjects: Text
    ) -> Outcome:
        """Return the outcome of the analysed rows.

        Raises
        ------
        InputDataError
            When fewer than four subjects have an event.
        """
        event = np.asarray(self.labels[rows] == EVENT, bool)
        n_events = len(set(subjects[event]))
        if n_events < MIN_SUBJECTS:
            raise InputDataError(
                code="too-few-events",
                where=self.where,
                what=f"{n_events} of {len(set(subjects))} subjects have an event",
                accepted=f"at least {MIN_SUBJECTS} need one",
                next_step="Follow the people for longer, or look at event_value",
            )
        return Outcome(
            kind="survival",
            column=str(self.words.time),
            negative="",
            positive="",
            values=self.values[rows],
            event=event,
            event_column=str(self.words.event),
            event_codes=self.meanings,
            unit=self.words.time_unit,
            horizon=self.words.horizon,
        )


def outcome_survival(sheet: Sheet, words: OutcomeWords) -> OutcomeSurvival:
    """Return a survival outcome.

    Parameters
    ----------
    sheet : Sheet
        The sample sheet.
    words : OutcomeWords
        With `time` and `event`.

    Returns
    -------
    OutcomeSurvival
        Cells that cannot be meant are refused when the rows are settled.

    Raises
    ------
    UsageError
        When the codes are not 0 and 1 and their meaning is not stated.
    InputDataError
        When a column or a stated code does not exist.
    """
    times = sheet.column(str(words.time), "time")
    cells = sheet.column(str(words.event), "event")
    where = f"{sheet.where}, column {words.event!r}"
    stated = tuple(
        None if value is None else as_text(value)
        for value in (words.event_value, words.censored_value)
    )
    codes = np.array([_code(cell, stated) for cell in cells], object)
    meanings = _meanings(codes, stated, where)
    labels = np.full(len(codes), EVENT, object)
    labels[codes == meanings[1]] = CENSORED
    blank_time = np.array([is_missing(cell) for cell in times], bool)
    labels[(codes == "") & blank_time] = ""
    return OutcomeSurvival(
        sheet.where, words, sheet.ids, times, codes, numbers_of(times), labels, meanings
    )


def _code(cell: str, stated: tuple[str | None, ...]) -> str:
    """Return an event code; 1.0 is 1, unless the user named codes as written."""
    if cell in stated:
        return str(cell)
    if is_missing(cell):
        return ""
    number = cell_number(cell)
    if stated == (None, None) and number in (0.0, 1.0):
        return str(int(number))
    return str(cell)


def _meanings(
    codes: Text, stated: tuple[str | None, ...], where: str
) -> tuple[str, str]:
    counts = Counter(str(code) for code in codes if code)
    event, censored = stated
    # with 0 and 1 there, any further code is another event, refused with the rows
    plain = set(counts) <= set(PLAIN_CODES) or set(counts) >= set(PLAIN_CODES)
    if plain and event is None and censored is None:
        return PLAIN_CODES[0], PLAIN_CODES[1]
    if event is None or censored is None:
        raise UsageError(
            code="event-coding-missing",
            where=where,
            what=f"the codes are not 0 and 1 (got {with_counts(counts)})",
            accepted="other codes with their meaning: event_value is the code of the "
            "event, censored_value that of a time without it",
            next_step="Name event_value and censored_value",
        )
    if event == censored:
        raise UsageError(
            code="classes-equal",
            where=where,
            what=f"event_value and censored_value are the same code {event!r}",
            accepted=f"two of the codes {with_counts(counts)}",
            next_step="Name two different codes",
        )
    for name, role in ((event, "event_value"), (censored, "censored_value")):
        if name not in counts:
            raise InputDataError(
                code="class-missing",
                where=where,
                what=f"{role} {name!r} does not occur",
                accepted=f"{nearest_hint(name, list(counts))}the codes are "
                f"{with_counts(counts)}",
                next_step="Name one of these codes as written",
            )
    return event, censored
