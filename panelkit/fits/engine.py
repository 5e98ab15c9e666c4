"""The lockstep engine: all refits of a block walk down the penalty path together.

One product of all residuals with a tile of the matrix proposes, for every refit,
which features may matter; the canonical kernel decides (see `kernel_paths`). The
product of step k is both its optimality check and the strong rule of step k + 1
(Tibshirani et al. 2012, JRSS-B 74:245). No bit of a result depends on the product,
its tiles, its threads, the storage type or the other refits of the block.
"""

import threading
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray
from threadpoolctl import threadpool_limits

from panelkit.fits.kernel_cache import kernel_cache
from panelkit.records import MatrixSource

with kernel_cache():
    from panelkit.fits import kernel_paths as kernels

__all__ = ["BlockSpecification", "run_block"]

TILE = 2048  # features a tile: its products stay in a core's cache
CHUNK = 4  # refits settled per kernel call
ROUNDING = 2.0**-24  # unit roundoff of float32
FIRST_WORKING = 64  # working features for which space is made at first
COPY_LIMIT = 512 * 2**20  # bytes of a float32 copy that serves the product


@dataclass(frozen=True, slots=True)
class BlockSpecification:
    """What a block of refits has to solve.

    Attributes
    ----------
    family : int
        `kernel_paths.GAUSSIAN` or `kernel_paths.BINOMIAL`.
    rows : sequence of ndarray of int64
        Rows of each refit.
    y : ndarray of shape (n_samples,)
        Outcome.
    weights : ndarray of shape (n_samples,)
        Observation weights; rescaled to sum to one in each refit.
    feature_weights : ndarray of shape (n_features,)
        0 unpenalised, infinity excluded.
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

    family: int
    rows: Sequence[NDArray[np.int64]]
    y: NDArray[np.float64]
    weights: NDArray[np.float64]
    feature_weights: NDArray[np.float64]
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
        self.copy, used = _product_copy(source, block)  # for the product only
        self.n_columns = len(used)
        self.rules = kernels.Rules(
            block.family,
            block.scaled,
            block.relative,
            block.mixing,
            block.tol,
            block.steps,
            block.max_markers,
        )
        self.refits = _new_refits(block, used)
        n_refits = len(block.rows)
        self.member = np.zeros((n_refits, self.n_columns), np.float32)
        for b, rows in enumerate(block.rows):
            own = self.refits.slots[b, : len(rows)]
            self.member[b, own] = self.refits.weight[b, : len(rows)]
        self.code = np.zeros((self.n_features, n_refits), np.uint8)
        self.scale = np.empty(self.n_features, np.float32)
        self.margin = np.empty(self.n_features, np.float32)
        self.has_missing = np.zeros(-(-self.n_features // TILE), np.bool_)
        self.starts = list(range(0, self.n_features, TILE))
        self.local = threading.local()
        weights = block.feature_weights
        never = ~source.included | ~np.isfinite(weights)
        self.code[never | (weights == 0.0)] = kernels.CODE_SETTLED
        self.finite_weights = np.where(never, 1.0, weights).astype(np.float32)
        self.unpenalised = np.flatnonzero(~never & (weights == 0.0))

    def run(self, mapper: Mapper) -> None:
        """Advance until every refit is done."""
        self._start()
        tops = mapper(self._first_tile, self.starts)
        self.top = np.max(tops, axis=0)
        while len(live := np.flatnonzero(self.refits.state[:, kernels.DONE] == 0)):
            self._pass(live, mapper)

    def _start(self) -> None:
        unpenalised = self.unpenalised
        self._make_room(len(unpenalised))
        shape = (len(self.block.rows), len(unpenalised), self.refits.rows.shape[1])
        columns = np.zeros(shape)
        for b, rows in enumerate(self.block.rows):
            for c, feature in enumerate(unpenalised):
                columns[b, c, : len(rows)] = self.source.column(int(feature), rows)
        kernels.start_refits(
            self.refits, self.rules, unpenalised, columns, self.block.feature_weights
        )

    def _buffers(self) -> Any:
        local = self.local
        if not hasattr(local, "products"):
            n_refits = len(self.block.rows)
            local.products = np.empty((3, TILE * n_refits), np.float32)
            local.tiles = np.empty((2, TILE, self.n_columns), np.float32)
            local.found_refit = np.empty(1 << 14, np.int32)
            local.found_feature = np.empty(1 << 14, np.int32)
        return local

    def _tile(self, start: int, buffer: NDArray[np.float32]) -> NDArray[np.float32]:
        """Return the tile in float32 with missing cells filled, for the product."""
        stop = min(self.n_features, start + TILE)
        if self.copy is not None:
            return self.copy[start:stop]
        raw = self.source.base[start:stop]
        if raw.dtype == np.float32 and not self.has_missing[start // TILE]:
            return raw
        tile = buffer[: stop - start]
        tile[...] = raw
        if self.has_missing[start // TILE]:
            _fill_missing(tile, self.source.fill[start:stop])
        return tile

    def _first_tile(self, start: int) -> NDArray[np.float32]:
        """Encode deviations of a tile; return lower bounds of largest gradients."""
        local = self._buffers()
        stop = min(self.n_features, start + TILE)
        n_refits = len(self.block.rows)
        here = slice(start, stop)
        if self.copy is None:
            gap = np.isnan(self.source.base[here]).any()
            self.has_missing[start // TILE] = bool(gap)
        tile = self._tile(start, local.tiles[0])
        squares = np.einsum("ij,ij->i", tile, tile, dtype=np.float64)
        self.margin[here] = 1.1 * (self.n_columns + 4) * ROUNDING * np.sqrt(squares)
        constant = (tile == tile[:, :1]).all(axis=1)
        self.code[here][constant] = kernels.CODE_SETTLED
        # centring conditions the filter only; no result sees it
        centred, square = local.tiles[:, : stop - start]
        np.subtract(tile, tile.mean(1, keepdims=True), out=centred)
        np.multiply(centred, centred, out=square)
        self.scale[here] = np.sqrt(np.maximum(square.mean(1), 1e-30))
        first, second, gradient = (
            local.products[i, : (stop - start) * n_refits].reshape(-1, n_refits)
            for i in range(3)
        )
        np.matmul(centred, self.member.T, out=first)
        np.matmul(square, self.member.T, out=second)
        np.matmul(centred, self.refits.residuals.T, out=gradient)
        top = np.zeros(n_refits, np.float32)
        if self.block.scaled:
            slack = 4 * (self.n_columns + 8) * ROUNDING * self.n_columns
            kernels.encode_deviations(
                first,
                second,
                gradient,
                self.scale[here],
                (slack * self.refits.weight.max(axis=1)).astype(np.float32),
                self.finite_weights[here],
                self.code[here],
                top,
            )
        else:  # deviation one for every column; the bound 0 lets every feature through
            code = self.code[here]
            code[code != kernels.CODE_SETTLED] = 127
            self.scale[here] = 1.0
        self.scale[here] *= self.finite_weights[here]
        return top

    def _pass_tile(
        self, start: int, ask: "_Question"
    ) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
        """Return the pairs (refit, feature) of a tile that may matter."""
        local = self._buffers()
        stop = min(self.n_features, start + TILE)
        n_live = len(ask.live)
        tile = self._tile(start, local.tiles[0])
        product = local.products[0, : (stop - start) * n_live].reshape(-1, n_live)
        np.matmul(tile, ask.residuals.T, out=product)
        code = self.code[start:stop]
        if n_live < code.shape[1]:
            code = code[:, ask.live]
        while True:
            count = kernels.filter_tile(
                product,
                self.scale[start:stop],
                self.margin[start:stop],
                code,
                ask.threshold,
                ask.length,
                local.found_refit,
                local.found_feature,
                start,
            )
            if count <= len(local.found_refit):
                break
            local.found_refit = np.empty(2 * count, np.int32)
            local.found_feature = np.empty(2 * count, np.int32)
        return (
            ask.live[local.found_refit[:count]],
            local.found_feature[:count].astype(np.int64),
        )

    def _question(self, live: NDArray[np.int64]) -> "_Question":
        """Return what this pass asks: thresholds that miss nothing that matters."""
        refits = self.refits
        step = refits.state[live, kernels.STEP]
        last = refits.penalties.shape[1] - 1
        now = refits.penalties[live, np.maximum(step, 0)]
        following = refits.penalties[live, np.minimum(step + 1, last)]
        keep = np.maximum(2.0 * following - now, 0.5 * following)
        threshold = np.where(
            step < 0, self.top[live], np.minimum(keep, now) * self.block.mixing
        )
        length = np.sqrt(np.square(refits.r[live]).sum(axis=1))
        return _Question(
            live=live,
            residuals=refits.residuals
            if len(live) == len(refits.residuals)
            else np.ascontiguousarray(refits.residuals[live]),
            threshold=(threshold * 0.99999).astype(np.float32),
            length=(length * 1.00001).astype(np.float32),
        )

    def _pass(self, live: NDArray[np.int64], mapper: Mapper) -> None:
        """Ask the matrix once, then settle every living refit."""
        ask = self._question(live)
        found = mapper(lambda start: self._pass_tile(start, ask), self.starts)
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
            self.refits.rows,
            self.refits.n_rows,
            chunk,
            cut,
            candidates,
            fresh,
        )
        kernels.settle_chunk(
            self.refits,
            chunk,
            self.rules,
            cut,
            candidates,
            fresh,
            self.block.feature_weights,
            self.code,
        )

    def _make_room(self, working: int) -> None:
        """Grow the working-set arrays to hold this many features a refit."""
        refits = self.refits
        changes: dict[str, Any] = {}
        if working > refits.work.shape[1]:
            size = max(working, 2 * refits.work.shape[1])
            for name in _WORKING_ARRAYS:
                changes[name] = _grown(getattr(refits, name), size)
        stored = int(refits.stored_at.max()) + working
        if stored > refits.stored_work.shape[1]:
            size = max(stored, 2 * refits.stored_work.shape[1])
            for name in ("stored_work", "stored_beta"):
                changes[name] = _grown(getattr(refits, name), size)
        if changes:
            self.refits = refits._replace(**changes)


@dataclass(frozen=True, slots=True)
class _Question:
    live: NDArray[np.int64]
    residuals: NDArray[np.float32]
    threshold: NDArray[np.float32]
    length: NDArray[np.float32]


_WORKING_ARRAYS = (
    "Z", "work", "pull", "mean", "deviation", "beta", "grad", "grad_before",
    "entered", "order", "order_step",
)  # fmt: skip


def _grown(array: NDArray[Any], size: int) -> NDArray[Any]:
    """Return the array with its second axis grown by zeros."""
    shape = (array.shape[0], size - array.shape[1], *array.shape[2:])
    return np.concatenate([array, np.zeros(shape, array.dtype)], axis=1)


def _chunks(live: NDArray[np.int64]) -> Iterator[NDArray[np.int64]]:
    for start in range(0, len(live), CHUNK):
        yield live[start : start + CHUNK]


def _fill_missing(tile: NDArray[np.float32], fill: NDArray[np.float64]) -> None:
    np.copyto(tile, fill[:, None].astype(np.float32), where=np.isnan(tile))


def _product_copy(
    source: MatrixSource, block: BlockSpecification
) -> tuple[NDArray[np.float32] | None, NDArray[np.int64]]:
    """Return a filled float32 copy of the rows in use, and those rows.

    None, and all rows, where the matrix can be read as it stands or the copy would be
    large; then tiles are converted one by one, pass after pass.
    """
    n_features, n_samples = source.base.shape
    every = np.arange(n_samples)
    used = np.unique(np.concatenate(list(block.rows)))
    if 4 * n_features * len(used) > COPY_LIMIT:
        return None, every
    starts = range(0, n_features, TILE)
    as_it_stands = source.base.dtype == np.float32 and len(used) == n_samples
    if as_it_stands and not any(
        np.isnan(source.base[start : start + TILE]).any() for start in starts
    ):
        return None, every
    copy = np.empty((n_features, len(used)), np.float32)
    for start in starts:
        here = slice(start, start + TILE)
        copy[here] = source.base[here][:, used]
        _fill_missing(copy[here], source.fill[here])
    return copy, used


def _new_refits(block: BlockSpecification, used: NDArray[np.int64]) -> "kernels.Refits":
    """Return the refits' arrays before the null model is fitted."""
    n_refits = len(block.rows)
    n_rows = np.array([len(rows) for rows in block.rows], np.int64)
    shape = (n_refits, int(n_rows.max()))
    n_penalties = len(block.penalties)
    rows, slots = np.zeros(shape, np.int64), np.zeros(shape, np.int64)
    y, weight = np.zeros(shape), np.zeros(shape)
    for b, chosen in enumerate(block.rows):
        n = len(chosen)
        rows[b, :n] = chosen
        slots[b, :n] = np.searchsorted(used, chosen)
        y[b, :n] = block.y[chosen]
        share = block.weights[chosen]
        weight[b, :n] = share / share.sum()
    state = np.zeros((n_refits, 4), np.int64)
    state[:, kernels.STEP] = -1
    working = (n_refits, FIRST_WORKING)
    return kernels.Refits(
        rows=rows,
        n_rows=n_rows,
        y=y,
        weight=weight,
        eta=np.zeros(shape),
        r=np.zeros(shape),
        slots=slots,
        residuals=np.zeros((n_refits, len(used)), np.float32),
        Z=np.zeros((n_refits, FIRST_WORKING, shape[1])),
        work=np.zeros(working, np.int64),
        pull=np.zeros(working),
        mean=np.zeros(working),
        deviation=np.ones(working),
        beta=np.zeros(working),
        grad=np.zeros(working),
        grad_before=np.zeros(working),
        entered=np.zeros(working, np.bool_),
        order=np.zeros(working, np.int64),
        order_step=np.zeros(working, np.int64),
        penalties=np.tile(block.penalties, (n_refits, 1)),
        certificate=np.full((n_refits, n_penalties), np.nan),
        intercept=np.full((n_refits, n_penalties), np.nan),
        stored_at=np.zeros((n_refits, n_penalties + 1), np.int64),
        stored_work=np.zeros((n_refits, 4 * FIRST_WORKING), np.int64),
        stored_beta=np.zeros((n_refits, 4 * FIRST_WORKING)),
        state=state,
        value=np.zeros((n_refits, 2)),
    )
