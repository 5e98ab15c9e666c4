"""Recorded sex against the expression of genes of the sex chromosomes."""

import numpy as np
from numpy.typing import NDArray

from panelkit.ingest.cohort_views import Text
from panelkit.ingest.scale import ScaleGuess
from panelkit.ingest.sketch import in_logs
from panelkit.ingest.wording import counted, quoted
from panelkit.records import Cohort, Finding

__all__ = ["check_sex"]

MALE = {  # Y-linked, expressed in most tissues; symbol to Ensembl gene
    "RPS4Y1": "ENSG00000129824",
    "DDX3Y": "ENSG00000067048",
    "KDM5D": "ENSG00000012817",
    "USP9Y": "ENSG00000114374",
    "EIF1AY": "ENSG00000198692",
    "UTY": "ENSG00000183878",
    "ZFY": "ENSG00000067646",
}
FEMALE = {"XIST": "ENSG00000229807"}  # from the inactive X
COLUMNS = ("sex", "gender", "recorded_sex", "reported_sex", "patient_sex")
WORDS = {
    **dict.fromkeys(("m", "male", "man"), 1.0),
    **dict.fromkeys(("f", "female", "woman"), 0.0),
}
LEAST = 3
"""Samples of each sex needed to place the cut-off."""
CLEAR = 5.0
HAZY = 2.5
"""Distance of the sexes' medians, in median absolute deviations, of a gene that may
contradict the recorded sex, and of one that may only speak for it."""
UNDECIDED = 0.1
"""Closer to the cut-off, in distances of the medians, a sample is on neither side."""


def check_sex(cohort: Cohort, scale: ScaleGuess) -> list[Finding]:
    """Return samples whose sex-linked genes contradict their recorded sex.

    The genes of the Y chromosome are averaged, XIST stands apart; the cut-off of each
    lies midway between the medians of the recorded sexes. A sample contradicts when
    genes that separate the sexes well put it on the other side and none speaks for
    what is recorded; it is unclear when they disagree, or when it lies at a cut-off.

    Parameters
    ----------
    cohort : Cohort
        With a column for sex and gene symbols or Ensembl genes; otherwise nothing is
        checked.
    scale : ScaleGuess
        Scale of its values.

    Returns
    -------
    list of Finding
        ``sex-contradicted``, ``sex-unclear`` or ``sex-confirmed``. The check itself
        is common practice in laboratories.
    """
    found = _recorded(cohort)
    if found is None:
        return []
    column, recorded = found
    against = np.zeros(cohort.n_samples, dtype=bool)
    doubtful, spoken_for, known = against.copy(), against.copy(), against.copy()
    for genes, points_to in ((MALE, 1.0), (FEMALE, 0.0)):
        score, clear = _side(cohort, scale, genes, points_to, recorded)
        # a positive score speaks for what is recorded
        score = np.where(recorded == points_to, score, -score)
        spoken_for |= score > 0.0
        if clear:
            known |= np.isfinite(score)
            against |= score < 0.0
            doubtful |= np.abs(score) < UNDECIDED
    if not known.any():
        return []
    against &= known
    unclear = known & (doubtful | (against & spoken_for))
    return _findings(cohort, column, known, against & ~unclear, unclear)


def _recorded(cohort: Cohort) -> tuple[str, NDArray[np.float64]] | None:
    for name, cells in cohort.sample_columns.items():
        if name.strip().casefold() not in COLUMNS:
            continue
        codes = np.array(
            [WORDS.get(str(cell).strip().casefold(), np.nan) for cell in cells]
        )
        if min((codes == 0.0).sum(), (codes == 1.0).sum()) >= LEAST:
            return name, codes
    return None


def _names(cohort: Cohort) -> Text:
    for name, cells in cohort.feature_columns.items():
        if name.strip().casefold() in ("symbol", "gene_symbol", "gene"):
            return cells
    return cohort.features


def _side(
    cohort: Cohort,
    scale: ScaleGuess,
    genes: dict[str, str],
    points_to: float,
    recorded: NDArray[np.float64],
) -> tuple[NDArray[np.float64], bool]:
    """Return how far samples lie on the side of one sex, and whether that is clear.

    The medians of the recorded sexes lie at -0.5 and 0.5; NaN where nothing is
    measured, or where the genes do not separate the sexes.
    """
    wanted = {*genes, *genes.values()}
    rows = [
        row
        for row, (name, own) in enumerate(
            zip(_names(cohort), cohort.features, strict=True)
        )
        if str(name).strip().upper() in wanted
        or str(own).partition(".")[0].upper() in wanted
    ]
    scores: dict[bool, list[NDArray[np.float64]]] = {True: [], False: []}
    for values in in_logs(cohort.values[rows], scale) if rows else ():
        own, own_spread = _middle(values[recorded == points_to])
        other, other_spread = _middle(values[recorded == 1.0 - points_to])
        apart, spread = own - other, max(own_spread, other_spread)
        if apart > HAZY * spread and apart > 0.0:
            score = (values - 0.5 * (own + other)) / apart
            scores[bool(apart > CLEAR * spread)].append(score)
    for clear in (True, False):
        if scores[clear]:
            return np.asarray(np.mean(scores[clear], axis=0)), clear
    return np.full(cohort.n_samples, np.nan), False


def _middle(values: NDArray[np.float64]) -> tuple[float, float]:
    values = values[np.isfinite(values)]
    if not len(values):
        return np.nan, np.nan
    middle = float(np.median(values))
    return middle, float(np.median(np.abs(values - middle)))


def _findings(
    cohort: Cohort,
    column: str,
    known: NDArray[np.bool_],
    against: NDArray[np.bool_],
    unclear: NDArray[np.bool_],
) -> list[Finding]:
    where = f"samples, column {column!r}"
    total = int(known.sum())
    findings = []
    if against.any():
        findings.append(
            Finding(
                code="sex-contradicted",
                severity="warning",
                where=where,
                message=f"{counted(int(against.sum()), 'sample has', 'samples have')} "
                f"sex-linked expression against the recorded sex, of {total}: "
                f"{quoted(cohort.samples[against])}",
                next_step="Check for swapped specimens: their other entries may belong "
                "to someone else, too.",
            )
        )
    if unclear.any():
        findings.append(
            Finding(
                code="sex-unclear",
                severity="info",
                where=where,
                message=f"{counted(int(unclear.sum()), 'sample has', 'samples have')} "
                f"sex-linked genes that disagree or lie between the sexes, of {total}: "
                f"{quoted(cohort.samples[unclear])}",
                next_step="Check for mixed specimens; a lost Y or X chromosome in a "
                "tumour looks alike.",
            )
        )
    if not findings:
        findings.append(
            Finding(
                code="sex-confirmed",
                severity="info",
                where=where,
                message=f"sex-linked expression agrees with the recorded sex of all "
                f"{total} samples",
                next_step="Nothing.",
            )
        )
    return findings
