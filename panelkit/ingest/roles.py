"""Which column of the sample sheet plays which part."""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from panelkit.errors import UsageError
from panelkit.ingest.outcome_column import OutcomeWords
from panelkit.ingest.outcome_kinds import check_words, outcome_columns
from panelkit.ingest.sheet import Sheet
from panelkit.ingest.wording import quoted

SINGLE = (
    "subject", "site", "batch", "replicate_of", "matched_set", "run_order", "folds"
)  # fmt: skip
SEVERAL = ("covariates", "nuisance")

__all__ = ["Roles"]


@dataclass(frozen=True, slots=True)
class Roles:
    """Columns by the part they play, as named by the user.

    Attributes
    ----------
    words : OutcomeWords
        What is said of the outcome, its columns among it.
    subject, site, batch, replicate_of, matched_set, run_order, folds : str or None
        One column each.
    covariates, nuisance : sequence of str
        Several columns each.
    """

    words: OutcomeWords
    subject: str | None = None
    site: str | None = None
    batch: str | None = None
    replicate_of: str | None = None
    matched_set: str | None = None
    run_order: str | None = None
    folds: str | None = None
    covariates: Sequence[str] = ()
    nuisance: Sequence[str] = ()

    def columns(self) -> Iterator[tuple[str, str]]:
        """Yield each role with a column that was named for it."""
        yield from outcome_columns(self.words)
        for role in SINGLE:
            name = getattr(self, role)
            if name is not None:
                yield role, name
        for role in SEVERAL:
            for name in getattr(self, role):
                yield role, name

    def check(self, sheet: Sheet | None) -> None:
        """Refuse columns that do not exist and an outcome that cannot be meant.

        Parameters
        ----------
        sheet : Sheet or None
            The sample sheet, if there is one.

        Raises
        ------
        UsageError
            When columns are named without a sheet, the outcome contradicts itself, or
            a text stands where several columns are expected.
        InputDataError
            When a column does not exist.
        """
        for role in SEVERAL:
            if isinstance(getattr(self, role), str):
                raise UsageError(
                    code="list-expected",
                    where=role,
                    what=f"this is one text (got {getattr(self, role)!r})",
                    accepted="a list of column names is needed",
                    next_step="Put the name into a list",
                )
        check_words(self.words)
        named = list(self.columns())
        if sheet is None and named:
            raise UsageError(
                code="sample-sheet-missing",
                where="samples",
                what="there is no sample sheet, but columns of it are named: "
                f"{quoted(name for _, name in named)}",
                accepted="columns are looked up in the sample sheet",
                next_step="Pass the sample sheet as samples",
            )
        for role, name in named:
            if sheet is not None:
                sheet.column(name, role)
