"""Panels of markers drawn by lot: what any panel of that size reaches."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from panelkit.costing.comparisons.contract import FoldWork, LearntToo
from panelkit.costing.comparisons.halves import tuned_on_halves
from panelkit.costing.refits import columns_of, refit

__all__ = ["FROM_ALL", "FROM_CANDIDATES", "RandomPanels"]

FROM_ALL = "random panels from all"
FROM_CANDIDATES = "random panels from candidates"
TUNED = 20  # random panels that tune the ridge penalty of all of one size
TUNED_PAIRS = 2


@dataclass(frozen=True, slots=True, eq=False)
class RandomPanels:
    """Random panels at each size, from the filtered features and from the candidates.

    They are learnt on the folds of the first repeat. A panel from all features is drawn
    once and is the same in every fold, where it is refitted; features that a fold's
    filter leaves out count as absent. A panel from the candidates is drawn among each
    fold's own. One ridge penalty for all panels of a size is tuned on complementary
    halves: nothing was selected.

    Attributes
    ----------
    sizes : sequence of int
        Panel sizes.
    from_all : ndarray of shape (n_panels, largest size), int64
        Features of each panel; a smaller panel is the beginning of a larger one.
    from_candidates : ndarray of shape (n_panels, n_places), float64
        Lots: a fold's candidates come in ascending order of their lots.

    References
    ----------
    Venet, Dumont & Detours 2011, PLoS Comput Biol 7:e1002240.
    """

    sizes: Sequence[int]
    from_all: NDArray[np.int64]
    from_candidates: NDArray[np.float64]

    @classmethod
    def drawn(
        cls,
        sizes: Sequence[int],
        usable: NDArray[np.int64],
        n_panels: int,
        n_places: int,
        generator: np.random.Generator,
    ) -> "RandomPanels":
        """Draw the panels before the first fit.

        Parameters
        ----------
        sizes : sequence of int
            Panel sizes.
        usable : ndarray of int64
            Features that may be markers, by an outcome-blind filter.
        n_panels : int
            Panels of each size and kind.
        n_places : int
            Largest number of candidates that a fold may have.
        generator : numpy.random.Generator
            From the seed tree.

        Returns
        -------
        RandomPanels
            Ready to be learnt in every fold.
        """
        largest = min(max(sizes), len(usable))
        from_all = np.array(
            [generator.choice(usable, largest, replace=False) for _ in range(n_panels)]
        )
        return cls(sizes, from_all, generator.random((n_panels, n_places)))

    def __call__(self, work: FoldWork) -> LearntToo:
        """Return the metric of every random panel, (n_sizes, n_panels) a kind.

        NaN behind the first repeat: more folds would sharpen no comparison.
        """
        if work.repeat:
            nothing = np.full((len(self.sizes), len(self.from_all)), np.nan)
            return LearntToo(figures={FROM_ALL: nothing, FROM_CANDIDATES: nothing})
        candidates = work.learnt.selected.stability.candidates
        lots = self.from_candidates[:, : len(candidates)]
        chosen = candidates[np.argsort(lots, axis=1, kind="stable")]
        return LearntToo(
            figures={
                FROM_ALL: self._metrics(work, self.from_all),
                FROM_CANDIDATES: self._metrics(work, chosen),
            }
        )

    def _metrics(
        self, work: FoldWork, chosen: NDArray[np.int64]
    ) -> NDArray[np.float64]:
        data, split = work.data, work.split
        view = work.learnt.selected.view
        included = view.included
        features = np.unique(chosen)
        markers = work.procedure.markers(view, data, split.training)
        columns = columns_of(markers, features, data, split)
        found = np.full((len(self.sizes), len(chosen)), np.nan)
        for k, size in enumerate(self.sizes):
            panels = [
                np.searchsorted(features, panel[:size][included[panel[:size]]])
                for panel in chosen
            ]
            penalty = tuned_on_halves(
                lambda own: columns_of(
                    work.procedure.markers(view, data, own.training),
                    features,
                    data,
                    own,
                ),
                panels[:TUNED],
                data,
                split,
                work.procedure.ridge_penalties,
                TUNED_PAIRS,
            )
            grid = np.full((len(panels), 1), penalty)
            predicted = refit(columns, panels, data, split, grid)[:, 0]
            found[k] = data.task.all_scores(
                predicted, split.training, split.test, data.weights
            )
        return found
