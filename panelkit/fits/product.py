"""The product that proposes: which features may matter to which refit.

Residuals of all refits times a tile of the matrix, in float32 while the tile is in
cache. It only filters, with its rounding error as a margin: whatever the canonical
kernel could decide on is let through, so no result depends on it.
"""

import threading
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from panelkit.fits.kernel_cache import kernel_cache
from panelkit.records import MatrixSource

with kernel_cache():
    from panelkit.fits import kernel_paths as kernels

__all__ = ["Question", "TileProduct"]

TILE = 2048  # features a tile: its products stay in a core's cache
ROUNDING = 2.0**-24  # unit roundoff of float32
COPY_LIMIT = 512 * 2**20  # bytes of a float32 copy that serves the product
TAME = (1e-12, 1e12)  # root mean squares that float32 products bear without scaling


@dataclass(frozen=True, slots=True, eq=False)
class Question:
    """What one pass over the matrix asks.

    Attributes
    ----------
    live : ndarray of int64
        Refits that are asked for.
    residuals : ndarray of shape (n_live, K, columns), float32
        Their weighted residuals.
    threshold : ndarray of shape (n_live,), float32
        |gradient| over deviation (and feature weight) from which a feature matters.
    length : ndarray of shape (n_live,), float32
        Euclidean length of the residuals, from above.
    """

    live: NDArray[np.int64]
    residuals: NDArray[np.float32]
    threshold: NDArray[np.float32]
    length: NDArray[np.float32]


class TileProduct:
    """Tiles of one matrix, ready to be asked by a block of refits.

    Parameters
    ----------
    source : MatrixSource
        The matrix.
    rows : sequence of ndarray of int64
        Rows of each refit.
    n_predictors : int
        Linear predictors of a refit.
    feature_weights : ndarray of shape (n_features,)
        0 and infinity: such features are never proposed.
    scaled : bool
        Whether gradients are taken relative to the columns' deviations.
    """

    def __init__(
        self,
        source: MatrixSource,
        rows: Sequence[NDArray[np.int64]],
        n_predictors: int,
        feature_weights: NDArray[np.float64],
        scaled: bool,
    ) -> None:
        self._source = source
        self._scaled = scaled
        self._n_refits = len(rows)
        self._n_predictors = n_predictors
        n_features = source.base.shape[0]
        self.starts = list(range(0, n_features, TILE))
        self.columns = self._columns(rows)
        self._copy: NDArray[np.float32] | None = None
        self._direct = source.base.dtype == np.float32
        self._rank = source.shift[0].shape[1]
        self._has_missing = np.zeros(len(self.starts), np.bool_)
        self._exponent: dict[int, NDArray[np.int32]] = {}  # of tiles that need scaling
        self.code = np.zeros((n_features, self._n_refits), np.uint8)
        self._scale = np.empty(n_features, np.float32)
        self._margin = np.empty(n_features, np.float32)
        self._squares = np.empty(n_features)  # of a feature, as the product reads it
        never = ~source.included | ~np.isfinite(feature_weights)
        self.code[never | (feature_weights == 0.0)] = kernels.CODE_SETTLED
        finite = np.where(never, 1.0, feature_weights)
        self._feature_weights = finite.astype(np.float32)
        self._local = threading.local()

    def _columns(self, rows: Sequence[NDArray[np.int64]]) -> NDArray[np.int64]:
        """Return the samples that the product reads: those in use, or all of them."""
        n_features, n_samples = self._source.base.shape
        used = np.unique(np.concatenate(list(rows)))
        if 4 * n_features * len(used) > COPY_LIMIT:
            return np.arange(n_samples)
        return used

    @property
    def _copies(self) -> bool:
        """Whether a float32 copy serves all passes, rather than tile conversions."""
        n_features, n_samples = self._source.base.shape
        if 4 * n_features * len(self.columns) > COPY_LIMIT:
            return False
        as_it_stands = self._direct and len(self.columns) == n_samples
        as_it_stands = as_it_stands and not self._rank
        return not as_it_stands or bool(self._has_missing.any() or self._exponent)

    def _values(self, start: int) -> NDArray[np.floating[Any]]:
        """Return a tile of the base with its shift added, NaN where missing."""
        raw = self._source.base[start : start + TILE]
        if len(self.columns) < raw.shape[1]:
            raw = raw[:, self.columns]
        if self._rank:
            left, right = self._source.shift
            raw = raw + left[start : start + TILE] @ right[:, self.columns]
        return raw

    def survey(self, start: int) -> None:
        """Look at a tile once: missing cells, sizes beyond float32's comfort."""
        raw = self._values(start)
        squares = self._squares[start : start + len(raw)]
        kernels.row_squares(raw, squares)
        if np.isnan(squares).any():
            self._has_missing[start // TILE] = True
            raw = np.where(np.isnan(raw), self._fill(start)[:, None], raw)
            kernels.row_squares(raw, squares)
        size = np.sqrt(squares / len(self.columns))
        doubtful = (size > TAME[1]) | (size < TAME[0])
        if doubtful.any() and np.abs(raw[doubtful]).any():
            largest = np.abs(raw).max(axis=1)
            self._exponent[start] = np.frexp(largest.astype(np.float64))[1]
            squares *= np.ldexp(1.0, -2 * self._exponent[start])

    def copy_tiles(self, mapper: Callable[..., Any]) -> None:
        """Make the float32 copy that serves all passes, where one is worth while."""
        if self._copies:
            copy = np.empty((len(self.code), len(self.columns)), np.float32)
            mapper(
                lambda start: self._convert(start, copy[start : start + TILE]),
                self.starts,
            )
            self._copy = copy

    def _fill(self, start: int) -> NDArray[np.float64]:
        return self._source.fill[start : start + TILE]

    def _convert(self, start: int, out: NDArray[np.float32]) -> None:
        """Write a tile in float32: missing cells filled, extreme features scaled.

        A feature may be scaled by a power of two: its gradient and its deviation change
        alike.
        """
        raw = self._values(start)
        exponent = self._exponent.get(start)
        if exponent is None:
            out[...] = raw
            if self._has_missing[start // TILE]:
                fill = self._fill(start)[:, None].astype(np.float32)
                np.copyto(out, fill, where=np.isnan(out))
            return
        exact = raw.astype(np.float64)
        np.copyto(exact, self._fill(start)[:, None], where=np.isnan(exact))
        out[...] = np.ldexp(exact, -exponent[:, None])

    def _tile(self, start: int, buffer: NDArray[np.float32]) -> NDArray[np.float32]:
        if self._copy is not None:
            return self._copy[start : start + TILE]
        raw = self._source.base[start : start + TILE]
        plain = not self._has_missing[start // TILE] and start not in self._exponent
        if self._direct and plain and not self._rank:
            return np.asarray(raw, np.float32)
        tile = buffer[: len(raw)]
        self._convert(start, tile)
        return tile

    def _buffers(self) -> Any:
        local = self._local
        if not hasattr(local, "products"):
            n_products = self._n_refits * self._n_predictors
            local.products = np.empty((3, TILE * n_products), np.float32)
            local.norms = np.empty(TILE * self._n_refits, np.float32)
            local.tiles = np.empty((2, TILE, len(self.columns)), np.float32)
            local.found_refit = np.empty(1 << 14, np.int32)
            local.found_feature = np.empty(1 << 14, np.int32)
        return local

    def _gradient(
        self,
        tile: NDArray[np.float32],
        residuals: NDArray[np.float32],
        local: Any,
        buffer: int,
    ) -> NDArray[np.float32]:
        """Return gradients, or their norms over predictors, (features, refits)."""
        n_refits, n_predictors = residuals.shape[:2]
        size = len(tile) * n_refits * n_predictors
        product: NDArray[np.float32] = local.products[buffer, :size]
        product = product.reshape(len(tile), -1)
        np.matmul(tile, residuals.reshape(n_refits * n_predictors, -1).T, out=product)
        if n_predictors == 1:
            return product
        norms: NDArray[np.float32] = local.norms[: len(tile) * n_refits]
        norms = norms.reshape(len(tile), n_refits)
        kernels.norms_over_classes(product, n_predictors, norms)
        return norms

    def prepare(
        self,
        start: int,
        member: NDArray[np.float32],
        residuals: NDArray[np.float32],
        length: NDArray[np.float32],
    ) -> NDArray[np.float32]:
        """Encode a tile's deviations; return lower bounds of largest gradients.

        Parameters
        ----------
        start : int
            First feature of the tile.
        member : ndarray of shape (n_refits, columns), float32
            Observation weights of each refit, 0 elsewhere.
        residuals : ndarray of shape (n_refits, K, columns), float32
            Residuals of the null models.
        length : ndarray of shape (n_refits,), float32
            Their lengths, from above.

        Returns
        -------
        ndarray of shape (n_refits,), float32
            No refit's largest |gradient| over deviation is below it.
        """
        local = self._buffers()
        tile = self._tile(start, local.tiles[0])
        here = slice(start, start + len(tile))
        n_columns = len(self.columns)
        squares = self._squares[here]
        self._margin[here] = 1.1 * (n_columns + 8) * ROUNDING * np.sqrt(squares)
        top = np.zeros(self._n_refits, np.float32)
        if not self._scaled:
            self._prepare_unscaled(start, tile, residuals, length, local, top)
            return top
        centred, square = local.tiles[:, : len(tile)]
        kernels.centre_tile(tile, centred, square, self._scale[here])
        self._settle_constants(here, squares)
        first, second = (
            local.products[i, : len(tile) * self._n_refits].reshape(len(tile), -1)
            for i in range(2)
        )
        np.matmul(centred, member.T, out=first)
        np.matmul(square, member.T, out=second)
        widest = member.max(axis=1)
        blur = 2.0 * ROUNDING * np.sqrt(squares * widest.max())
        kernels.encode_deviations(
            first,
            second,
            self._gradient(centred, residuals, local, 2),
            self._scale[here],
            blur.astype(np.float32),
            self._margin[here],
            (4 * (n_columns + 8) * ROUNDING * n_columns * widest).astype(np.float32),
            length,
            self._feature_weights[here],
            self.code[here],
            top,
        )
        self._scale[here] *= self._feature_weights[here]
        return top

    def _settle_constants(self, here: slice, squares: NDArray[np.float64]) -> None:
        """Rule out features whose stored values are all the same."""
        near = self._scale[here] <= 1e-6 * np.sqrt(squares / len(self.columns))
        suspects = here.start + np.flatnonzero(near)
        if self._rank or not len(suspects):
            return
        raw = self._source.base[suspects]
        self.code[suspects[(raw == raw[:, :1]).all(axis=1)]] = kernels.CODE_SETTLED

    def _prepare_unscaled(
        self,
        start: int,
        tile: NDArray[np.float32],
        residuals: NDArray[np.float32],
        length: NDArray[np.float32],
        local: Any,
        top: NDArray[np.float32],
    ) -> None:
        """Prepare a tile whose columns count with deviation one."""
        here = slice(start, start + len(tile))
        code = self.code[here]
        code[code != kernels.CODE_SETTLED] = 127
        exponent = self._exponent.get(start)
        unit = np.ones(len(tile)) if exponent is None else np.ldexp(1.0, -exponent)
        self._scale[here] = unit * self._feature_weights[here]
        gradient = np.abs(self._gradient(tile, residuals, local, 2))
        below = gradient - self._margin[here][:, None] * length
        ratio = below / np.maximum(self._scale[here], 1e-30)[:, None]
        ratio[code == kernels.CODE_SETTLED] = 0.0
        np.maximum(top, ratio.max(axis=0), out=top)

    def candidates(
        self, start: int, ask: Question
    ) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
        """Return the pairs (refit, feature) of a tile that may matter.

        Parameters
        ----------
        start : int
            First feature of the tile.
        ask : Question
            Thresholds and residuals.

        Returns
        -------
        refits, features : ndarray of int64
            Features ascend within a refit.
        """
        local = self._buffers()
        tile = self._tile(start, local.tiles[0])
        here = slice(start, start + len(tile))
        product = self._gradient(tile, ask.residuals, local, 0)
        code = self.code[here]
        if len(ask.live) < code.shape[1]:
            code = code[:, ask.live]
        while True:
            count = kernels.filter_tile(
                product,
                self._scale[here],
                self._margin[here],
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
