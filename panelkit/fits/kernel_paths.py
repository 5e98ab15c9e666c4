"""Kernels of the lockstep engine: what is proposed, and graded for the decision.

The product proposes (`encode_deviations`, `filter_tile`: float32, may only let too
much through); the canonical kernel grades (`gather_chunk`, `grade_chunk`: float64,
fixed order, a refit's own rows) and `decisions` decides on its grades. The penalised
solves are in `kernel_scalar` and `kernel_grouped`. Plain functions on arrays; all
release the interpreter lock.

Symbols: B refits of a block, n rows of a refit, K linear predictors (1, or the
classes), r weighted residual, z standardised column.
"""

import math

import numpy as np

from panelkit.fits.kernel_algebra import door, dot, fast_door, fast_inner, inner

CODE_STEP = 1.0 / 127.5  # a code c says: deviation >= scale * CODE_STEP * c
CODE_LARGEST = 254.0
SMALLEST_VARIANCE = 1e-290
CODE_SETTLED = 255  # in the working set, excluded or constant: never a candidate


@inner
def gather(base, fill, left, right, features, rows, n, out):
    """Fill out[c, :n] with features[c] on the refit's rows.

    Measured cells get left @ right added, term by term; missing cells are filled.
    """
    for c in range(features.shape[0]):
        j = features[c]
        for i in range(n):
            x = np.float64(base[j, rows[i]])
            if x != x:
                x = fill[j]
            else:
                for q in range(left.shape[1]):
                    x += left[j, q] * right[q, rows[i]]
            out[c, i] = x


@fast_door
def row_squares(values, out):
    """Write the sum of squares of every row, float64; NaN where a value is missing."""
    for j in range(values.shape[0]):
        s = 0.0
        for i in range(values.shape[1]):
            x = np.float64(values[j, i])
            s += x * x
        out[j] = s


@fast_door
def centre_tile(tile, centred, square, scale):
    """Write the rows of a tile centred, their squares, and their deviations.

    Conditions the filter only; no result sees it.
    """
    n = tile.shape[1]
    for j in range(tile.shape[0]):
        s = np.float32(0.0)
        for i in range(n):
            s += tile[j, i]
        m = s / np.float32(n)
        v = np.float32(0.0)
        for i in range(n):
            d = tile[j, i] - m
            centred[j, i] = d
            square[j, i] = d * d
            v += d * d
        scale[j] = max(math.sqrt(v / np.float32(n)), np.float32(1e-15))


@fast_door
def encode_deviations(
    first, second, gradient, scale, blur, margin, slack, length, feature_weight, code,
    largest,
):  # fmt: skip
    """Encode lower bounds of each refit's weighted deviation of each feature.

    first, second: weighted sums of x and x*x, (features of the tile, B), float32.
    slack, blur: rounding of the variance and of the float32 values themselves; margin
    times length: rounding of the gradient.
    Raises largest[b] to a lower bound of the refit's largest |gradient|/deviation.
    """
    step = np.float32(CODE_STEP)
    for j in range(first.shape[0]):
        s0 = scale[j]
        for b in range(first.shape[1]):
            if code[j, b] == CODE_SETTLED:
                continue
            m = first[j, b]
            v = second[j, b] - m * m
            d = slack[b] * s0 * s0
            low = math.sqrt(max(v - d, np.float32(0.0))) * np.float32(0.9999)
            low = max(low - blur[j], np.float32(0.0))
            code[j, b] = np.uint8(min(low / (s0 * step), np.float32(CODE_LARGEST)))
            if low > 0.0 and feature_weight[j] > 0.0:
                high = math.sqrt(max(v, np.float32(0.0)) + d) * np.float32(1.0001)
                t = (abs(gradient[j, b]) - margin[j] * length[b]) / (
                    (high + blur[j]) * feature_weight[j]
                )
                if t > largest[b]:
                    largest[b] = t


@fast_door
def filter_tile(gradient, scale, margin, code, threshold, length, out_b, out_j, first):
    """Return how many (refit, feature) pairs of a tile may matter, and list them.

    A pair passes when |gradient| >= threshold * (lower bound of the deviation)
    minus the rounding margin of the float32 product.
    """
    count = 0
    step = np.float32(CODE_STEP)
    n_features, n_refits = gradient.shape
    for j in range(n_features):
        s = scale[j] * step
        e = margin[j]
        hit = 0
        for b in range(n_refits):  # no early exit, so that it vectorises
            hit += (
                abs(gradient[j, b])
                >= threshold[b] * (s * np.float32(code[j, b])) - e * length[b]
            )
        if hit:
            for b in range(n_refits):
                c = code[j, b]
                if (
                    c != CODE_SETTLED
                    and abs(gradient[j, b])
                    >= threshold[b] * (s * np.float32(c)) - e * length[b]
                ):
                    if count < out_b.shape[0]:
                        out_b[count] = b
                        out_j[count] = first + j
                    count += 1
    return count


@fast_inner
def standardise(z, n, weight, scaled, moments):
    """Centre z[:n], scale it to weighted deviation 1; write (mean, deviation).

    Returns False for a column that is constant on the refit's rows.
    """
    m = 0.0
    for i in range(n):
        m += weight[i] * z[i]
    v = 0.0
    for i in range(n):
        z[i] -= m
        v += weight[i] * z[i] * z[i]
    if not v > max(1e-24 * m * m, SMALLEST_VARIANCE):
        return False
    s = math.sqrt(v) if scaled else 1.0
    inverse = 1.0 / s
    for i in range(n):
        z[i] *= inverse
    moments[0] = m
    moments[1] = s
    return True


@fast_door
def norms_over_classes(product, n_classes, out):
    """Write Euclidean norms over the K predictors, (features, B K) to (features, B)."""
    for j in range(product.shape[0]):
        for b in range(out.shape[1]):
            s = np.float32(0.0)
            for k in range(n_classes):
                g = product[j, b * n_classes + k]
                s += g * g
            out[j, b] = math.sqrt(s)


@door
def gather_chunk(
    base, fill, left, right, rows, n_rows, chunk, borders, candidates, working, Z
):
    """Gather raw candidate columns behind the working sets of a chunk of refits."""
    for t in range(chunk.shape[0]):
        b = chunk[t]
        here = candidates[borders[b] : borders[b + 1]]
        gather(base, fill, left, right, here, rows[b], n_rows[b], Z[b, working[b] :])


@door
def grade_chunk(
    chunk, borders, working, n_rows, weight, scaled, r, Z, moments, gradient
):
    """Standardise the columns behind the working sets of a chunk; grade them.

    borders[b]:borders[b + 1] are refit b's in moments (mean, deviation; deviation 0
    for a constant column) and gradient (its norm over the K predictors).
    """
    for t in range(chunk.shape[0]):
        b = chunk[t]
        n = n_rows[b]
        first = working[b] - borders[b]
        for c in range(borders[b], borders[b + 1]):
            z = Z[b, first + c]
            s = 0.0
            if standardise(z, n, weight[b], scaled, moments[c]):
                for k in range(r.shape[1]):
                    u = dot(z, r[b, k], n)
                    s += u * u
            else:
                moments[c, 1] = 0.0
            gradient[c] = math.sqrt(s)


@door
def publish_chunk(chunk, n_rows, slots, r, residuals):
    """Hand the residuals of solved refits to the product."""
    for t in range(chunk.shape[0]):
        b = chunk[t]
        for c in range(r.shape[1]):
            for i in range(n_rows[b]):
                residuals[b, c, slots[b, i]] = r[b, c, i]
