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

from panelkit.fits.decisions import Candidates, DecisionRules, decide, take_in
from panelkit.fits.families import Problem, Solver, SolveRules
from panelkit.fits.kernel_cache import kernel_cache
from panelkit.fits.product import Question, TileProduct
from panelkit.fits.refits import (
    DONE,
    FRESH,
    PENDING,
    STEP,
    WORKING,
    Refits,
    new_refits,
)
from panelkit.records import MatrixSource

with kernel_cache():
    from panelkit.fits import kernel_paths as kernels

__all__ = ["BlockSpecification", "run_block"]

CHUNK = 8  # refits per kernel call
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
) -> Refits:
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
    Refits
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
        self.rules = DecisionRules(
            block.relative, block.mixing, block.tol, block.max_markers
        )
        self.solve_rules = SolveRules(block.mixing, block.tol, block.steps)
        weights = block.feature_weights
        self.product = TileProduct(
            source, block.rows, block.problem.n_predictors, weights, block.scaled
        )
        self.refits = new_refits(
            block.rows,
            block.problem.weights,
            block.penalties,
            block.problem.n_predictors,
            self.product.columns,
        )
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
        self._start(everyone, mapper)
        self._solve(mapper)
        mapper(self.product.survey, self.product.starts)
        self.product.copy_tiles(mapper)
        self.top = self._largest(mapper)
        while len(live := np.flatnonzero(self.refits.state[:, DONE] == 0)):
            self._pass(live, mapper)

    def _start(self, everyone: NDArray[np.int64], mapper: Mapper) -> None:
        """Prepare the null model of each refit: intercepts and unpenalised features."""
        refits, count = self.refits, len(self.unpenalised)
        self._make_room(count)
        if count:
            for b, rows in enumerate(self.block.rows):
                for c, feature in enumerate(self.unpenalised):
                    refits.Z[b, c, : len(rows)] = self._column(int(feature), rows)
            refit = np.repeat(everyone, count)
            feature = np.tile(self.unpenalised, len(everyone))
            found = self._graded(everyone, refit, feature, mapper)
            usable = found.moments[:, 1] > 0.0
            where = take_in(refits, found, usable, self.weights)
            refits.entered[where] = True  # not picked: they were given
        self.solver.start(refits)
        refits.now[:] = NULL_MODEL_SCALE
        refits.state[:, PENDING] = 1

    def _column(self, feature: int, rows: NDArray[np.int64]) -> NDArray[np.float64]:
        if feature < self.n_features:
            return self.source.column(feature, rows)
        covariate: NDArray[np.float64]
        covariate = self.block.covariates[feature - self.n_features, rows]
        return covariate

    def _solve(self, mapper: Mapper) -> None:
        """Solve what is pending and hand the residuals to the product."""
        refits = self.refits
        pending = np.flatnonzero(refits.state[:, PENDING] == 1)

        def solve(chunk: NDArray[np.int64]) -> None:
            self.solver.solve(refits, chunk, self.solve_rules)
            kernels.publish_chunk(
                chunk, refits.n_rows, refits.slots, refits.r, refits.residuals
            )

        mapper(solve, list(_chunks(pending)))
        refits.state[pending, PENDING] = 0
        violation = refits.violation[pending]
        step = refits.state[pending, STEP]
        on_path = step >= 0
        refits.certificate[pending[on_path], step[on_path]] = violation[on_path]
        refits.state[pending[~(violation <= self.block.tol)], DONE] = 2

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
        step = refits.state[live, STEP]
        fresh = refits.state[live, FRESH] == 1
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
        """Ask the matrix once, decide for every living refit, and solve."""
        ask = self._question(live)
        pairs = mapper(
            lambda start: self.product.candidates(start, ask), self.product.starts
        )
        refit = np.concatenate([pair[0] for pair in pairs])
        feature = np.concatenate([pair[1] for pair in pairs])
        order = np.argsort(refit, kind="stable")  # features ascend within a refit
        refit, feature = refit[order], feature[order]
        found = self._graded(live, refit, feature, mapper, gather=True)
        accepted = decide(self.refits, live, self.rules, found, self.weights)
        settled = accepted | (found.moments[:, 1] == 0.0)  # constant: out for good
        self.product.code[feature[settled], refit[settled]] = kernels.CODE_SETTLED
        self._solve(mapper)

    def _graded(
        self,
        live: NDArray[np.int64],
        refit: NDArray[np.int64],
        feature: NDArray[np.int64],
        mapper: Mapper,
        gather: bool = False,
    ) -> Candidates:
        """Return the candidates, standardised behind the working sets, and graded."""
        refits = self.refits
        borders = np.searchsorted(refit, np.arange(len(self.block.rows) + 1))
        working = refits.state[:, WORKING].copy()
        self._make_room(int((working + np.diff(borders))[live].max()))
        moments, gradient = np.empty((len(refit), 2)), np.empty(len(refit))

        def grade(chunk: NDArray[np.int64]) -> None:
            if gather:
                kernels.gather_chunk(
                    self.source.base,
                    self.source.fill,
                    *self.source.shift,
                    refits.rows,
                    refits.n_rows,
                    chunk,
                    borders,
                    feature,
                    working,
                    refits.Z,
                )
            kernels.grade_chunk(
                chunk,
                borders,
                working,
                refits.n_rows,
                refits.weight,
                self.block.scaled,
                refits.r,
                refits.Z,
                moments,
                gradient,
            )

        mapper(grade, list(_chunks(live)))
        if gather:
            gradient /= self.weights[feature]
        return Candidates(refit, feature, borders, moments, gradient)

    def _make_room(self, working: int) -> None:
        """Grow the refits' arrays to hold this many working features a refit."""
        refits = self.refits
        # every penalty at or above the largest one stores the unpenalised features
        given = len(self.unpenalised) * refits.penalties.shape[1]
        stored = int(refits.stored_at.max()) + max(working, given)
        refits.make_room(working, stored)


def _chunks(live: NDArray[np.int64]) -> Iterator[NDArray[np.int64]]:
    for start in range(0, len(live), CHUNK):
        yield live[start : start + CHUNK]
