"""Kernels of the lockstep engine: what is proposed, decided, kept and stored.

The product proposes (`encode_deviations`, `filter_tile`: float32, may only let too
much through); the canonical kernel decides (everything else: float64, fixed order, a
refit's own rows). The penalised solves are in `kernel_scalar` and `kernel_grouped`.
Plain functions on arrays, no panelkit imports; all release the interpreter lock.

Symbols: B refits of a block, n rows of a refit, K linear predictors (1, or the
classes), m working features, r weighted residual, z standardised column.
"""

import math
from typing import Any, NamedTuple

import numpy as np
from numba import njit
from numpy.typing import NDArray

FAST = {"reassoc", "contract", "arcp", "nsz"}  # NaN must stay visible

CODE_STEP = 1.0 / 127.5  # a code c says: deviation >= scale * CODE_STEP * c
CODE_LARGEST = 254.0
SMALLEST_VARIANCE = 1e-290
CODE_SETTLED = 255  # in the working set, excluded or constant: never a candidate

# columns of Refits.state
STEP = 0  # -1 while the largest penalty is unknown
WORKING = 1
ENTRIES = 2
DONE = 3  # 1 finished, 2 tolerance not reached
PENDING = 4  # 1 while the current penalty waits to be solved
FRESH = 5  # 1 while the working set of the first penalty is not chosen yet

# Doors are called from Python; inner kernels from kernels alone, so that no wrapper
# has to be compiled for them.
DOOR: dict[str, Any] = {"nogil": True, "cache": True, "no_cfunc_wrapper": True}
INNER: dict[str, Any] = {**DOOR, "no_cpython_wrapper": True}
door = njit(**DOOR)
fast_door = njit(fastmath=FAST, **DOOR)
inner = njit(**INNER)
fast_inner = njit(fastmath=FAST, **INNER)


class Rules(NamedTuple):
    """What holds for every refit of a block."""

    scaled: bool
    relative: bool
    mixing: float
    tol: float
    max_markers: int


class Refits(NamedTuple):
    """The state of a block of refits; first axis always the refit."""

    rows: NDArray[np.int64]  # (B, n) rows of the matrix
    n_rows: NDArray[np.int64]
    slots: NDArray[np.int64]  # (B, n) columns of `residuals`
    weight: NDArray[np.float64]  # (B, n), sums to one
    eta: NDArray[np.float64]  # (B, K, n) linear predictors
    r: NDArray[np.float64]  # (B, K, n) weighted residuals
    residuals: NDArray[np.float32]  # (B, K, columns of the product) r, 0 elsewhere
    Z: NDArray[np.float64]  # (B, working, n) standardised columns
    work: NDArray[np.int64]  # (B, working) their features
    pull: NDArray[np.float64]  # (B, working) their feature weights
    mean: NDArray[np.float64]
    deviation: NDArray[np.float64]
    beta: NDArray[np.float64]  # (B, K, working)
    grad: NDArray[np.float64]  # |gradient| at the last solution
    grad_before: NDArray[np.float64]  # |gradient| at the previous penalty
    entered: NDArray[np.bool_]
    order: NDArray[np.int64]  # positions in `work` in order of entry
    order_step: NDArray[np.int64]
    penalties: NDArray[np.float64]  # (B, penalties)
    now: NDArray[np.float64]  # (B,) the penalty to be solved
    largest: NDArray[np.float64]  # (B,) the largest penalty
    b0: NDArray[np.float64]  # (B, K) intercepts for standardised columns
    violation: NDArray[np.float64]  # (B,) of the last solve, over the working set
    certificate: NDArray[np.float64]  # (B, penalties) KKT violation over the penalty
    intercept: NDArray[np.float64]  # (B, penalties, K)
    stored_at: NDArray[np.int64]  # (B, penalties + 1) borders of the stored solutions
    stored_work: NDArray[np.int64]
    stored_beta: NDArray[np.float64]  # (B, stored, K)
    state: NDArray[np.int64]  # (B, 6)


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


@fast_inner
def dot(a, b, n):
    """Return the sum of a[i] * b[i], i < n, in the kernel's one fixed order."""
    s = 0.0
    for i in range(n):
        s += a[i] * b[i]
    return s


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
def start_refits(refits, scaled, features, columns, weights):
    """Put the unpenalised features into every working set.

    columns: their raw columns, (B, unpenalised, rows); standardised in place.
    """
    moments = np.empty(2)
    for b in range(refits.n_rows.shape[0]):
        m = 0
        for c in range(features.shape[0]):
            z = columns[b, c]
            if standardise(z, refits.n_rows[b], refits.weight[b], scaled, moments):
                refits.work[b, m] = features[c]
                refits.pull[b, m] = weights[features[c]]
                refits.mean[b, m] = moments[0]
                refits.deviation[b, m] = moments[1]
                refits.entered[b, m] = True  # not picked: it was given
                for i in range(refits.n_rows[b]):
                    refits.Z[b, m, i] = z[i]
                m += 1
        refits.state[b, WORKING] = m


@inner
def note_entries(refits, b, step):
    """Append the refit's features that are non-zero for the first time.

    Within a step the larger |gradient| at the previous penalty goes first, then the
    smaller column.
    """
    first = refits.state[b, ENTRIES]
    n_order = first
    order = refits.order[b]
    before = refits.grad_before[b]
    work = refits.work[b]
    for j in range(refits.state[b, WORKING]):
        if not refits.entered[b, j] and is_picked(refits.beta[b], j):
            refits.entered[b, j] = True
            k = n_order
            while k > first:
                other = order[k - 1]
                if before[other] > before[j] or (
                    before[other] == before[j] and work[other] < work[j]
                ):
                    break
                order[k] = other
                k -= 1
            order[k] = j
            refits.order_step[b, n_order] = step
            n_order += 1
    refits.state[b, ENTRIES] = n_order


@inner
def is_picked(beta, j):
    """Return whether any predictor has a coefficient for working feature j."""
    for k in range(beta.shape[0]):  # noqa: SIM110 - numba compiles loops
        if beta[k, j] != 0.0:
            return True
    return False


@inner
def store_solution(refits, b, k):
    """Store intercepts and non-zero coefficients as the solution of step k."""
    at = refits.stored_at[b, k]
    n_classes = refits.b0.shape[1]
    for j in range(refits.state[b, WORKING]):
        if is_picked(refits.beta[b], j):
            refits.stored_work[b, at] = j
            for c in range(n_classes):
                refits.stored_beta[b, at, c] = refits.beta[b, c, j]
            at += 1
    refits.stored_at[b, k + 1] = at
    for c in range(n_classes):
        refits.intercept[b, k, c] = refits.b0[b, c]


@inner
def open_path(refits, b, rules, worst):
    """Set the refit's penalties from its largest gradient; return the first step.

    At or above the largest penalty nothing is picked and no solve is needed.
    """
    penalties = refits.penalties[b]
    largest = worst / rules.mixing
    refits.largest[b] = largest
    if rules.relative:
        for a in range(penalties.shape[0]):
            penalties[a] *= largest
    k = np.int64(0)  # a plain 0 would compile everything below twice
    while k < penalties.shape[0] and penalties[k] >= largest:
        refits.certificate[b, k] = 0.0
        store_solution(refits, b, k)
        k += 1
    return k


@inner
def strong_threshold(now, before, mixing):
    """Return the sequential strong rule's threshold, never below half the penalty."""
    return max(2.0 * now - before, 0.5 * now) * mixing


@inner
def enlarge(refits, b, n, candidates, fresh, g, moments, keep, cap, weights, code):
    """Move the candidates with g >= keep into the refit's working set."""
    m = refits.state[b, WORKING]
    for c in range(candidates.shape[0]):
        if g[c] >= keep and g[c] > 0.0:
            j = candidates[c]
            refits.work[b, m] = j
            refits.pull[b, m] = weights[j]
            refits.mean[b, m] = moments[c, 0]
            refits.deviation[b, m] = moments[c, 1]
            # a violator failed the strong rule: it comes behind, the larger first
            late = cap * g[c] / (g[c] + refits.penalties[b, refits.state[b, STEP]])
            refits.grad_before[b, m] = g[c] if cap == np.inf else late
            for i in range(n):
                refits.Z[b, m, i] = fresh[c, i]
            code[j, b] = CODE_SETTLED
            m += 1
    refits.state[b, WORKING] = m


@inner
def decide(refits, b, rules, candidates, fresh, weights, code):
    """Decide for one refit from its candidates: which penalty is to be solved next.

    fresh: the candidates' raw columns on the refit's rows; standardised in place.
    """
    n = refits.n_rows[b]
    count = candidates.shape[0]
    g = np.zeros(count)
    moments = np.empty((count, 2))
    worst = 0.0
    for c in range(count):
        j = candidates[c]
        if standardise(fresh[c], n, refits.weight[b], rules.scaled, moments[c]):
            s = 0.0
            for k in range(refits.b0.shape[1]):
                u = dot(fresh[c], refits.r[b, k], n)
                s += u * u
            g[c] = math.sqrt(s) / weights[j]
        else:
            code[j, b] = CODE_SETTLED  # constant in this refit: out for good
        worst = max(worst, g[c])
    k = refits.state[b, STEP]
    penalties = refits.penalties[b]
    refits.state[b, PENDING] = 0
    cap = np.inf
    if k < 0:
        if worst <= 0.0 and refits.largest[b] == 0.0:
            refits.largest[b] = -1.0  # nothing usable came: ask for everything
            return
        k = open_path(refits, b, rules, worst)
        before = refits.largest[b]
        if k < penalties.shape[0] and not rules.relative:
            # the candidates were asked for the largest gradient alone: ask again
            refits.state[b, STEP] = k
            refits.state[b, FRESH] = 1
            return
    elif refits.state[b, FRESH] == 1:
        refits.state[b, FRESH] = 0
        before = refits.largest[b]
    elif worst > penalties[k] * rules.mixing * (1.0 + rules.tol):
        # violators: this refit stays at its penalty while the others go on
        before = refits.largest[b]
        if k > 0:
            before = min(before, penalties[k - 1])
        cap = strong_threshold(penalties[k], before, rules.mixing)
    else:
        over = worst / (penalties[k] * rules.mixing) - 1.0
        refits.certificate[b, k] = max(refits.certificate[b, k], over)
        store_solution(refits, b, k)
        note_entries(refits, b, k)
        for j in range(refits.state[b, WORKING]):
            pull = refits.pull[b, j]
            refits.grad_before[b, j] = refits.grad[b, j] / pull if pull > 0.0 else 0.0
        before = penalties[k]
        k += 1
    refits.state[b, STEP] = k
    if k == penalties.shape[0] or refits.state[b, ENTRIES] >= rules.max_markers:
        refits.state[b, DONE] = 1
        return
    if cap < np.inf:
        keep = penalties[k] * rules.mixing * 0.999
    else:
        keep = strong_threshold(penalties[k], before, rules.mixing)
    enlarge(refits, b, n, candidates, fresh, g, moments, keep, cap, weights, code)
    refits.now[b] = penalties[k]
    refits.state[b, PENDING] = 1


@door
def decide_chunk(refits, chunk, rules, cut, candidates, fresh, weights, code):
    """Decide for a chunk; cut[t]:cut[t + 1] are the t-th refit's candidates."""
    for t in range(chunk.shape[0]):
        low, high = cut[t], cut[t + 1]
        decide(
            refits,
            chunk[t],
            rules,
            candidates[low:high],
            fresh[low:high],
            weights,
            code,
        )


@door
def publish_chunk(
    chunk, tol, n_rows, slots, r, violation, state, certificate, residuals
):
    """Hand the solved refits' residuals to the product and keep their certificates."""
    for t in range(chunk.shape[0]):
        b = chunk[t]
        k = state[b, STEP]
        if k >= 0:
            certificate[b, k] = violation[b]
        if not violation[b] <= tol:
            state[b, DONE] = 2
        for c in range(r.shape[1]):
            for i in range(n_rows[b]):
                residuals[b, c, slots[b, i]] = r[b, c, i]


@door
def gather_chunk(base, fill, left, right, rows, n_rows, chunk, cut, candidates, fresh):
    """Gather the raw candidate columns of a chunk of refits."""
    for t in range(chunk.shape[0]):
        b = chunk[t]
        low, high = cut[t], cut[t + 1]
        gather(
            base,
            fill,
            left,
            right,
            candidates[low:high],
            rows[b],
            n_rows[b],
            fresh[low:high],
        )
