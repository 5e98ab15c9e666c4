"""Whether the outcome goes along with site, batch or another nuisance column."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from panelkit.ingest.cells import cell_number, is_missing
from panelkit.ingest.cohort_views import Text, binary_outcome, one_row_a_subject
from panelkit.ingest.wording import counted, figure, quoted
from panelkit.metrics import (
    auc,
    auc_score_interval,
    contingency_table,
    cramers_v,
    cramers_v_corrected,
)
from panelkit.records import Cohort, Finding

__all__ = ["check_ties"]

TIED = 0.3
TIED_AUC = 0.15
"""Distance of an area from one half that is worth a warning."""
CONFIDENCE = 0.95
NUMERIC_ROLES = ("nuisance", "covariate")  # numbers of sites and batches are names
MANY_NUMBERS = 10
"""More different numbers than that are a scale, fewer are levels."""


def check_ties(
    cohort: Cohort, nuisance: Sequence[str] = (), covariates: Sequence[str] = ()
) -> list[Finding]:
    """Return where the outcome goes along with site, batch or another column.

    Parameters
    ----------
    cohort : Cohort
        The cohort.
    nuisance, covariates : sequence of str
        Further columns of the sample sheet. One with many different numbers is
        judged by its AUC, and cut into quarters to see whether any holds both
        classes.

    Returns
    -------
    list of Finding
        ``outcome-tied-to-...``: stop where no level holds 2 samples of each class
        (a warning for covariates, which travel with the panel), warning above a
        bias-corrected Cramer's V of 0.3, or where the AUC lies 0.15 or more from one
        half and its interval excludes one half; ``...-blank`` for blank entries.
    """
    findings = []
    for role, column in (("site", cohort.design.site), ("batch", cohort.design.batch)):
        if column is not None:
            findings += _tie(cohort, column, role, f"samples, {role}")
    for role, names in (("nuisance", nuisance), ("covariate", covariates)):
        for name in names:
            cells = cohort.sample_columns[name]
            findings += _tie(cohort, cells, role, f"samples, column {name!r}")
    return findings


def _tie(cohort: Cohort, cells: Text, role: str, where: str) -> list[Finding]:
    present = np.array([not is_missing(cell) for cell in cells], dtype=bool)
    findings = []
    if not present.all():
        blank = int((~present).sum())
        findings.append(
            Finding(
                code=f"{role}-blank",
                severity="warning",
                where=where,
                message=f"{counted(blank, 'sample has', 'samples have')} "
                f"a blank entry: {quoted(cohort.samples[~present])}",
                next_step="Fill them in; they are left out of this check.",
            )
        )
    outcome = binary_outcome(cohort)
    if outcome is None:
        return findings
    numbers = _many_numbers(cells, present) if role in NUMERIC_ROLES else None
    tied, area = False, ""
    if numbers is not None:
        tied, area = _area(cohort, numbers, outcome)
        cells = _quarters(numbers)
    classes = outcome[present].astype(int).astype(str).astype(object)
    table, levels, _ = contingency_table(cells[present], classes)
    if min(table.shape) < 2:
        return findings
    return findings + _tie_finding(table, levels, role, where, tied, area)


def _many_numbers(
    cells: Text, present: NDArray[np.bool_]
) -> NDArray[np.float64] | None:
    """Return a column of many different numbers, NaN where blank; None for others."""
    read = [cell_number(str(cell)) for cell in cells]
    if any(number is None for number in read):
        return None
    numbers = np.array(read, dtype=np.float64)
    return numbers if len(np.unique(numbers[present])) > MANY_NUMBERS else None


def _area(
    cohort: Cohort, numbers: NDArray[np.float64], outcome: NDArray[np.float64]
) -> tuple[bool, str]:
    """Return whether a number tells the classes apart, and its AUC in words."""
    rows = one_row_a_subject(cohort)
    rows = rows[~np.isnan(numbers[rows])]
    cases = int(outcome[rows].sum())
    controls = len(rows) - cases
    if min(cases, controls) < 2:
        return False, ""
    area = auc(numbers[rows], outcome[rows])
    low, high = auc_score_interval(area, cases, controls, CONFIDENCE)
    tied = abs(area - 0.5) >= TIED_AUC and not low <= 0.5 <= high
    return tied, f"AUC {figure(area)} ({figure(low)} to {figure(high)}); "


def _quarters(numbers: NDArray[np.float64]) -> Text:
    cuts = np.quantile(numbers[~np.isnan(numbers)], [0.25, 0.5, 0.75])
    quarter = np.searchsorted(cuts, numbers, side="left") + 1
    return np.array(
        [
            "" if np.isnan(v) else f"quarter {q}"
            for v, q in zip(numbers, quarter, strict=True)
        ],
        dtype=object,
    )


def _tie_finding(
    table: NDArray[np.int64],
    levels: list[str],
    role: str,
    where: str,
    tied: bool,
    area: str,
) -> list[Finding]:
    plain, corrected = cramers_v(table), cramers_v_corrected(table)
    comparable = table.min(axis=1) >= 2
    # matched sets (one of each class in a level) are balanced, not confounded
    confounded = not comparable.any() and plain > TIED
    if not confounded and not tied and corrected <= TIED:
        return []
    level = role if role in ("site", "batch") else "level"
    shared = int(table[table.min(axis=1) >= 1].sum())
    figures = (
        f"{area}Cramer's V {figure(plain)}, bias-corrected {figure(corrected)}; "
        f"{shared} of {table.sum()} samples sit in a {level} with both classes; "
        f"{_level_counts(table, levels)}"
    )
    if confounded:
        return [
            Finding(
                code=f"outcome-tied-to-{role}",
                severity="warning" if role == "covariate" else "stop",
                where=where,
                message=f"no {level} holds at least 2 samples of each class, so that "
                f"outcome and {role} cannot be told apart ({figures})",
                next_step="Measure both classes in the same runs, or compare other "
                "classes; no correction can mend this.",
            )
        ]
    return [
        Finding(
            code=f"outcome-tied-to-{role}",
            severity="warning",
            where=where,
            message=f"the outcome goes along with {role} ({figures})",
            next_step=f"Keep to {_plural(level)} that hold both classes, or validate "
            "where the two are balanced.",
        )
    ]


def _plural(level: str) -> str:
    return {"batch": "batches", "site": "sites"}.get(level, "levels")


def _level_counts(table: NDArray[np.int64], levels: list[str]) -> str:
    order = np.argsort(-table.sum(axis=1), kind="stable")
    shown = [f"{levels[i]!r} {table[i, 1]}/{table[i, 0]}" for i in order]
    more = f" and {len(shown) - 5} more" if len(shown) > 5 else ""
    return ", ".join(shown[:5]) + more + " (positive/negative)"
