"""Everything that `panelkit shortlist` shows, ready-made."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from panelkit.records.findings import Findings
from panelkit.records.record import Record
from panelkit.records.stability import ErrorBound, ShortlistTable
from panelkit.records.stability_details import (
    Agreement,
    Companions,
    Convergence,
    NullShortlist,
    PathFrequencies,
    SelectorResult,
)

__all__ = ["ShortlistResults"]


@dataclass(frozen=True, slots=True, eq=False)
class ShortlistResults(Record):
    """A finished shortlist.

    Attributes
    ----------
    study, outcome : str
        Name of the study file; the outcome in words.
    n_samples, n_subjects : int
        Analysed samples, their subjects.
    features : ndarray of shape (n_features,), object
        Every feature of the matrix.
    n_candidates_asked : int
        M: companion groups, and univariate features, that become candidates.
    findings : Findings
        What was noticed about the data.
    bound : ErrorBound
        Of the shortlist.
    shortlist : ShortlistTable
        Features that were picked at least once, or are candidates.
    paths : PathFrequencies
        At equal relative penalty.
    convergence : Convergence
        As pairs were added.
    companions : Companions
        Pairs that travel together.
    null : NullShortlist or None
        None where no shuffles were asked for.
    selectors : tuple of SelectorResult
        The same subsamples by other selectors.
    agreement : Agreement
        Of the picked sets.
    """

    study: str
    outcome: str
    n_samples: int
    n_subjects: int
    features: NDArray[np.object_]
    n_candidates_asked: int
    findings: Findings
    bound: ErrorBound
    shortlist: ShortlistTable
    paths: PathFrequencies
    convergence: Convergence
    companions: Companions
    null: NullShortlist | None
    selectors: tuple[SelectorResult, ...]
    agreement: Agreement

    def sentences(self) -> list[str]:
        """Return what was found, sentence by sentence, the most important first."""
        table = self.shortlist
        named = [str(name) for name in table.feature[table.picked]]
        n_candidates = int(table.candidate.sum())
        if named:
            shown = ", ".join(named[:5]) + (
                f" and {len(named) - 5} more" if len(named) > 5 else ""
            )
            first = (
                f"Shortlist (frequency of {self.bound.threshold:g} or more): {shown}."
            )
        else:
            first = (
                "The shortlist is empty: no feature reaches a frequency of "
                f"{self.bound.threshold:g}. Every marker is a candidate only."
            )
        said = [
            first,
            f"{n_candidates} candidates: the first {self.n_candidates_asked} companion "
            f"groups, the first {self.n_candidates_asked} features by the univariate "
            "statistic, and those forced in; what is a candidate only is under no "
            "error control.",
            self.bound.sentence(),
            self._saturation(),
            "" if self.null is None else self.null.sentence(),
            self._split_votes(),
            self.convergence.sentence(),
            self.agreement.sentence(),
        ]
        return [sentence for sentence in said if sentence]

    def _saturation(self) -> str:
        """Return what separation of the subsamples does to late picks; or ""."""
        separated = self.paths.separated_share
        half = np.flatnonzero(separated > 0.5)
        told = self.bound.saturation()
        if len(half):
            active = self.paths.n_active[half[0]]
            told = (
                f"{told} Most subsamples are told apart without an error from about "
                f"{active:.2g} features on: picks after that are path order only."
            )
        return told.strip()

    def _split_votes(self) -> str:
        """Return which companion groups reach the threshold though no member does."""
        split = self.companions
        groups = np.unique(split.group[split.vote_split])
        if not len(groups):
            return ""
        members = []
        for group in groups[:5]:
            here = split.group == group
            own = np.unique(np.concatenate([split.first[here], split.second[here]]))
            members.append(" / ".join(str(self.features[j]) for j in own[:4]))
        more = f"; and {len(groups) - 5} more" if len(groups) > 5 else ""
        return (
            f"Companions share the votes of {len(groups)} group(s) that reach the "
            f"threshold together and not alone: {'; '.join(members)}{more}."
        )
