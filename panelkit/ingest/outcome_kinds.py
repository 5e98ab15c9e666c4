"""From what the user says about the outcome to a column of the right kind."""

from collections.abc import Iterator

from panelkit.config import outcome_kind
from panelkit.errors import UsageError
from panelkit.ingest.outcome_classes import many_classes, outcome_classes
from panelkit.ingest.outcome_column import OutcomeColumn, OutcomeWords
from panelkit.ingest.outcome_number import outcome_number
from panelkit.ingest.outcome_survival import outcome_survival
from panelkit.ingest.sheet import Sheet

__all__ = ["check_words", "kind_of", "outcome_columns", "read_outcome"]

BELONGS = {
    "binary": ("outcome", "positive", "negative"),
    "classes": ("outcome", "classes"),
    "number": ("outcome", "unit"),
    "survival": (
        "time", "event", "event_value", "censored_value", "horizon", "time_unit"
    ),
}  # fmt: skip
NEEDED = {
    "binary": ("outcome",),
    "classes": ("outcome",),
    "number": ("outcome",),
    "survival": ("time", "event"),
}


def kind_of(words: OutcomeWords) -> str:
    """Return the kind of outcome, ``""`` when there is none.

    Parameters
    ----------
    words : OutcomeWords
        What the user says.

    Returns
    -------
    str
        binary, classes, number, survival or nothing.
    """
    if not any(_said(words)):
        return ""
    return outcome_kind(words.kind, words.time, words.event, words.classes)


def _said(words: OutcomeWords) -> Iterator[str]:
    names = dict.fromkeys(name for group in BELONGS.values() for name in group)
    for name in names:
        if getattr(words, name) not in (None, (), ""):
            yield name
    if words.kind is not None:
        yield "kind"


def outcome_columns(words: OutcomeWords) -> Iterator[tuple[str, str]]:
    """Yield each column of the outcome with its role.

    Parameters
    ----------
    words : OutcomeWords
        What the user says.

    Yields
    ------
    role, name : str
        For example ``"time"`` and ``"days"``.
    """
    for role in ("outcome", "time", "event"):
        if (name := getattr(words, role)) is not None:
            yield role, name


def check_words(words: OutcomeWords) -> None:
    """Refuse what cannot be meant together, before any file is read.

    Parameters
    ----------
    words : OutcomeWords
        What the user says.

    Raises
    ------
    UsageError
        An unknown kind, a part that is missing, or one of another kind.
    """
    kind = kind_of(words)
    if not kind:
        return
    if kind not in BELONGS:
        raise UsageError(
            code="outcome-kind-unknown",
            where="kind",
            what=f"there is no such kind of outcome (got {kind!r})",
            accepted=f"kinds are {', '.join(BELONGS)}",
            next_step="Name one of these, or leave it out",
        )
    needed = NEEDED[kind]
    missing = [name for name in needed if getattr(words, name) is None]
    if missing:
        raise UsageError(
            code="outcome-missing",
            where=", ".join(missing),
            what=f"a {kind} outcome is described, but {' and '.join(missing)} not "
            "named",
            accepted=f"{' and '.join(needed)} name columns of the sample sheet",
            next_step=f"Name {' and '.join(missing)}",
        )
    foreign = [name for name in _said(words) if name not in (*BELONGS[kind], "kind")]
    if foreign:
        raise UsageError(
            code="outcome-contradiction",
            where=", ".join(foreign),
            what=f"the outcome is {kind}, to which {' and '.join(foreign)} does not "
            "belong",
            accepted=f"a {kind} outcome takes {', '.join(BELONGS[kind])}",
            next_step="Take it out, or state another kind",
        )
    if words.horizon is not None and not words.horizon > 0.0:
        raise UsageError(
            code="horizon-not-positive",
            where="horizon",
            what=f"this is no time that can be reached (got {words.horizon!r})",
            accepted="a number above 0, in the unit of the times",
            next_step="Correct the horizon",
        )


def read_outcome(sheet: Sheet | None, words: OutcomeWords) -> OutcomeColumn | None:
    """Return the outcome's column, None when no outcome was asked for.

    Parameters
    ----------
    sheet : Sheet or None
        The sample sheet.
    words : OutcomeWords
        Checked by `check_words`.

    Returns
    -------
    OutcomeColumn or None
        Of the kind that was asked for.

    Raises
    ------
    UsageError
        When the coding is not stated.
    InputDataError
        When a column or a class does not exist.
    """
    kind = kind_of(words)
    if sheet is None or not kind:
        return None
    if kind == "survival":
        return outcome_survival(sheet, words)
    column = str(words.outcome)
    if kind == "number":
        return outcome_number(sheet, column, words.unit)
    if kind == "classes":
        return many_classes(sheet, column, words.classes)
    return outcome_classes(sheet, column, words.positive, words.negative)
