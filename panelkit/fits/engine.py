"""The lockstep engine: all refits of a block walk down the penalty path together.

One product of all residuals with a tile of the matrix proposes, for every refit,
which features may matter; the canonical kernel decides (see `kernel_paths`). The
product of step k is both its optimality check and the strong rule of step k + 1
(Tibshirani et al. 2012, JRSS-B 74:245). No bit of a result depends on the product,
its tiles, its threads, the storage type or the other refits of the block.
"""

from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray
from threadpoolctl import threadpool_limits

from panelkit.fits.families import Problem, Solver, SolveRules
from panelkit.fits.kernel_cache import kernel_cache
from panelkit.fits.product import Question, TileProduct
from panelkit.records import MatrixSource

with kernel_cache():
    from panelkit.fits import kernel_paths as kernels

__all__ = ["BlockSpecification", "run_block"]

CHUNK = 8  # refits settled per kernel call
FIRST_WORKING = 64  # working features for which space is made at first
NULL_MODEL_SCALE = 1e-3  # what the tolerance is relative to before there is a penalty


@dataclass(frozen=True, slots=True)
class BlockSpecification:
    """What a block of refits has to solve.

    Attributes
    ----------
    problem : Problem
        Family, outcome and observation weights.
    rows : sequence of ndarray of int64
        Rows of each refit.
    feature_weights : ndarray of shape (n_features,)
        0 unpenalised, infinity excluded.
    covariates : ndarray of shape (n_covariates, n_samples)
        Unpenalised columns beside the matrix.
    penalties : ndarray of shape (n_penalties,)
        Descending; relative to each refit's largest when `relative`.
    relative, scaled : bool
        Whether penalties are relative, whether columns are scaled to deviation one.
    mixing : float
        Share of the L1 part, above 0 to 1.
    max_markers : int
        A refit stops once it has picked this many features.
    tol : float
        Largest KKT violation relative to the penalty.
    steps : int
        Newton steps allowed for one penalty.
    """

    problem: Problem
    rows: Sequence[NDArray[np.int64]]
    feature_weights: NDArray[np.float64]
    covariates: NDArray[np.float64]
    penalties: NDArray[np.float64]
    relative: bool
    scaled: bool
    mixing: float
    max_markers: int
    tol: float
    steps: int


def run_block(
    source: MatrixSource, block: BlockSpecification, threads: int = 1
) -> "kernels.Refits":
    """Solve a block of refits in lockstep.

    Parameters
    ----------
    source : MatrixSource
        The matrix; shared, never written to.
    block : BlockSpecification
        Refits and rules.
    threads : int
        Threads for tiles and refits; no result depends on it.

    Returns
    -------
    kernel_paths.Refits
        Final state: penalties, stored solutions, order of entry, certificate.
        Refits with ``state[:, DONE] == 2`` did not reach the tolerance.
    """
    engine = _Lockstep(source, block)
    with threadpool_limits(1, "blas"):
        if threads == 1:
            engine.run(lambda task, items: [task(item) for item in items])
        else:
            with ThreadPoolExecutor(threads) as pool:
                engine.run(lambda task, items: list(pool.map(task, items)))
    return engine.refits


Mapper = Callable[[Callable[[Any], Any], Sequence[Any]], list[Any]]


class _Lockstep:
    """Arrays of a block, and the passes over the matrix that advance it."""

    def __init__(self, source: MatrixSource, block: BlockSpecification) -> None:
        self.source = source
        self.block = block
        self.n_features = source.base.shape[0]
        self.rules = kernels.Rules(
            block.scaled, block.relative, block.mixing, block.tol, block.max_markers
        )
        self.solve_rules = SolveRules(block.mixing, block.tol, block.steps)
        weights = block.feature_weights
        self.product = TileProduct(
            source, block.rows, block.problem.n_predictors, weights, block.scaled
        )
        self.refits = _new_refits(block, self.product.columns)
        self.solver: Solver = block.problem.solver(block.rows, self.refits.weight)
        # relative penalties: the first working set is known with the largest gradient
        self.opening = 1.0
        below = block.penalties[block.penalties < 1.0]
        if block.relative and len(below):
            self.opening = max(2.0 * below[0] - 1.0, 0.5 * below[0])
        free = source.included & (weights == 0.0)
        # covariates are numbered behind the matrix's own features
        extra = self.n_features + np.arange(len(block.covariates))
        self.unpenalised = np.concatenate([np.flatnonzero(free), extra])
        self.weights = np.concatenate([weights, np.zeros(len(extra))])

    def run(self, mapper: Mapper) -> None:
        """Advance until every refit is done."""
        everyone = np.arange(len(self.block.rows))
        self._start(everyone)
        mapper(self._solve, list(_chunks(everyone)))
        mapper(self.product.survey, self.product.starts)
        self.product.copy_tiles(mapper)
        self.top = self._largest(mapper)
        while len(live := np.flatnonzero(self.refits.state[:, kernels.DONE] == 0)):
            self._pass(live, mapper)

    def _start(self, everyone: NDArray[np.int64]) -> None:
        """Prepare the null model of each refit: intercepts and unpenalised features."""
        unpenalised = self.unpenalised
        self._make_room(len(unpenalised))
        shape = (len(everyone), len(unpenalised), self.refits.rows.shape[1])
        columns = np.zeros(shape)
        for b, rows in enumerate(self.block.rows):
            for c, feature in enumerate(unpenalised):
                columns[b, c, : len(rows)] = self._column(int(feature), rows)
        kernels.start_refits(
            self.refits, self.block.scaled, unpenalised, columns, self.weights
        )
        self.solver.start(self.refits)
        self.refits.now[:] = NULL_MODEL_SCALE
        self.refits.state[:, kernels.PENDING] = 1

    def _column(self, feature: int, rows: NDArray[np.int64]) -> NDArray[np.float64]:
        if feature < self.n_features:
            return self.source.column(feature, rows)
        covariate: NDArray[np.float64]
        covariate = self.block.covariates[feature - self.n_features, rows]
        return covariate

    def _solve(self, chunk: NDArray[np.int64]) -> None:
        """Solve what is pending in a chunk and hand its residuals to the product."""
        refits = self.refits
        pending = chunk[refits.state[chunk, kernels.PENDING] == 1]
        if not len(pending):
            return
        self.solver.solve(refits, pending, self.solve_rules)
        kernels.publish_chunk(
            pending,
            self.block.tol,
            refits.n_rows,
            refits.slots,
            refits.r,
            refits.violation,
            refits.state,
            refits.certificate,
            refits.residuals,
        )

    def _largest(self, mapper: Mapper) -> NDArray[np.float32]:
        """Return a lower bound of each refit's largest |gradient| over deviation."""
        refits = self.refits
        member = np.zeros((len(self.block.rows), len(self.product.columns)), np.float32)
        for b, rows in enumerate(self.block.rows):
            member[b, refits.slots[b, : len(rows)]] = refits.weight[b, : len(rows)]
        length = self._lengths(np.arange(len(member)))
        tops = mapper(
            lambda start: self.product.prepare(start, member, refits.residuals, length),
            self.product.starts,
        )
        return np.asarray(np.max(tops, axis=0), np.float32)

    def _lengths(self, live: NDArray[np.int64]) -> NDArray[np.float32]:
        squares = np.square(self.refits.r[live]).sum(axis=(1, 2))
        return np.asarray(1.00001 * np.sqrt(squares), np.float32)

    def _question(self, live: NDArray[np.int64]) -> Question:
        """Return what this pass asks: thresholds below every decision's own."""
        refits = self.refits
        step = refits.state[live, kernels.STEP]
        fresh = refits.state[live, kernels.FRESH] == 1
        last = refits.penalties.shape[1] - 1
        now = refits.penalties[live, np.maximum(step, 0)]
        following = refits.penalties[live, np.minimum(step + 1, last)]
        following = np.where(fresh, now, following)
        before = np.where(fresh, refits.largest[live], now)
        keep = np.maximum(2.0 * following - before, 0.5 * following)
        # violators are taken in from 0.999 of the penalty on
        keep = np.where(fresh, keep, np.minimum(keep, 0.999 * now)) * self.block.mixing
        # a refit whose first answer held nothing usable asks for everything
        opening = self.top[live] * self.opening
        opening = np.where(refits.largest[live] < 0.0, 0.0, opening)
        threshold = np.where(step < 0, opening, keep)
        whole = len(live) == len(refits.residuals)
        return Question(
            live=live,
            residuals=refits.residuals if whole else refits.residuals[live],
            threshold=(threshold * 0.99999).astype(np.float32),
            length=self._lengths(live),
        )

    def _pass(self, live: NDArray[np.int64], mapper: Mapper) -> None:
        """Ask the matrix once, then settle every living refit."""
        ask = self._question(live)
        found = mapper(
            lambda start: self.product.candidates(start, ask), self.product.starts
        )
        refit = np.concatenate([pair[0] for pair in found])
        feature = np.concatenate([pair[1] for pair in found])
        order = np.argsort(refit, kind="stable")  # features ascend within a refit
        refit, feature = refit[order], feature[order]
        borders = np.searchsorted(refit, np.arange(len(self.block.rows) + 1))
        working = self.refits.state[:, kernels.WORKING] + np.diff(borders)
        self._make_room(int(working[live].max()))

        def settle(chunk: NDArray[np.int64]) -> None:
            self._settle(chunk, borders, feature)

        mapper(settle, list(_chunks(live)))

    def _settle(
        self,
        chunk: NDArray[np.int64],
        borders: NDArray[np.int64],
        feature: NDArray[np.int64],
    ) -> None:
        cut = np.zeros(len(chunk) + 1, np.int64)
        np.cumsum(borders[chunk + 1] - borders[chunk], out=cut[1:])
        candidates = np.concatenate(
            [feature[borders[b] : borders[b + 1]] for b in chunk]
        )
        fresh = np.empty((len(candidates), self.refits.rows.shape[1]))
        kernels.gather_chunk(
            self.source.base,
            self.source.fill,
            *self.source.shift,
            self.refits.rows,
            self.refits.n_rows,
            chunk,
            cut,
            candidates,
            fresh,
        )
        kernels.decide_chunk(
            self.refits,
            chunk,
            self.rules,
            cut,
            candidates,
            fresh,
            self.weights,
            self.product.code,
        )
        self._solve(chunk)

    def _make_room(self, working: int) -> None:
        """Grow the working-set arrays to hold this many features a refit."""
        refits = self.refits
        changes: dict[str, Any] = {}
        if working > refits.work.shape[1]:
            size = max(working, 2 * refits.work.shape[1])
            for name in _WORKING_ARRAYS:
                changes[name] = _grown(getattr(refits, name), size)
            changes["beta"] = _grown(refits.beta, size, axis=2)
        # every penalty at or above the largest one stores the unpenalised features
        given = len(self.unpenalised) * refits.penalties.shape[1]
        stored = int(refits.stored_at.max()) + max(working, given)
        if stored > refits.stored_work.shape[1]:
            size = max(stored, 2 * refits.stored_work.shape[1])
            for name in ("stored_work", "stored_beta"):
                changes[name] = _grown(getattr(refits, name), size)
        if changes:
            self.refits = refits._replace(**changes)


_WORKING_ARRAYS = (
    "Z", "work", "pull", "mean", "deviation", "grad", "grad_before", "entered",
    "order", "order_step",
)  # fmt: skip


def _grown(array: NDArray[Any], size: int, axis: int = 1) -> NDArray[Any]:
    """Return the array with one axis grown by zeros."""
    shape = list(array.shape)
    shape[axis] = size
    grown = np.zeros(shape, array.dtype)  # pages that nobody writes cost no memory
    grown[tuple(slice(0, extent) for extent in array.shape)] = array
    return grown


def _chunks(live: NDArray[np.int64]) -> Iterator[NDArray[np.int64]]:
    for start in range(0, len(live), CHUNK):
        yield live[start : start + CHUNK]


def _new_refits(block: BlockSpecification, used: NDArray[np.int64]) -> "kernels.Refits":
    """Return the refits' arrays before the null model is fitted."""
    n_refits = len(block.rows)
    n_rows = np.array([len(rows) for rows in block.rows], np.int64)
    shape = (n_refits, int(n_rows.max()))
    n_penalties = len(block.penalties)
    rows, slots = np.zeros(shape, np.int64), np.zeros(shape, np.int64)
    weight = np.zeros(shape)
    n_classes = block.problem.n_predictors
    for b, chosen in enumerate(block.rows):
        n = len(chosen)
        rows[b, :n] = chosen
        slots[b, :n] = np.searchsorted(used, chosen)
        share = block.problem.weights[chosen]
        weight[b, :n] = share / share.sum()
    state = np.zeros((n_refits, 6), np.int64)
    state[:, kernels.STEP] = -1
    working = (n_refits, FIRST_WORKING)
    return kernels.Refits(
        rows=rows,
        n_rows=n_rows,
        weight=weight,
        eta=np.zeros((n_refits, n_classes, shape[1])),
        r=np.zeros((n_refits, n_classes, shape[1])),
        slots=slots,
        residuals=np.zeros((n_refits, n_classes, len(used)), np.float32),
        Z=np.zeros((n_refits, FIRST_WORKING, shape[1])),
        work=np.zeros(working, np.int64),
        pull=np.zeros(working),
        mean=np.zeros(working),
        deviation=np.ones(working),
        beta=np.zeros((n_refits, n_classes, FIRST_WORKING)),
        grad=np.zeros(working),
        grad_before=np.zeros(working),
        entered=np.zeros(working, np.bool_),
        order=np.zeros(working, np.int64),
        order_step=np.zeros(working, np.int64),
        penalties=np.tile(block.penalties, (n_refits, 1)),
        certificate=np.full((n_refits, n_penalties), np.nan),
        now=np.zeros(n_refits),
        largest=np.zeros(n_refits),
        b0=np.zeros((n_refits, n_classes)),
        violation=np.zeros(n_refits),
        intercept=np.full((n_refits, n_penalties, n_classes), np.nan),
        stored_at=np.zeros((n_refits, n_penalties + 1), np.int64),
        stored_work=np.zeros((n_refits, 4 * FIRST_WORKING), np.int64),
        stored_beta=np.zeros((n_refits, 4 * FIRST_WORKING, n_classes)),
        state=state,
    )
