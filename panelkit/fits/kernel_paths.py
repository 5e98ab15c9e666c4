"""Kernels of the lockstep engine: plain functions on arrays, no panelkit imports.

The product proposes (`encode_deviations`, `filter_tile`: float32, may only let too
much through); the canonical kernel decides (everything else: float64, fixed order,
a refit's own rows). All kernels release the interpreter lock.

Symbols: B refits of a block, n rows of a refit, m working features.
r weighted residual, h curvature, z standardised column, q residual of the
quadratic model.
"""

import math
from typing import NamedTuple

import numpy as np
from numba import njit
from numpy.typing import NDArray

# NaN must stay visible, so the flags that assume it away are left out.
FAST = {"reassoc", "contract", "arcp", "nsz"}

GAUSSIAN = 0
BINOMIAL = 1

CODE_STEP = 1.0 / 127.5  # a code c says: deviation >= scale * CODE_STEP * c
CODE_LARGEST = 254.0
CODE_SETTLED = 255  # in the working set, excluded or constant: never a candidate
DEPTH = 6  # sweeps kept for one extrapolation
SMALLEST_CURVATURE = 1e-5
NULL_MODEL_SCALE = 1e-3

# columns of Refits.state
STEP = 0  # -1 while the largest penalty is unknown
WORKING = 1
ENTRIES = 2
DONE = 3  # 1 finished, 2 tolerance not reached
# columns of Refits.value
LARGEST = 0
INTERCEPT = 1


class Rules(NamedTuple):
    """What holds for every refit of a block."""

    family: int
    scaled: bool
    relative: bool
    mixing: float
    tol: float
    steps: int
    max_markers: int


class Refits(NamedTuple):
    """The state of a block of refits; first axis always the refit."""

    rows: NDArray[np.int64]  # (B, n) rows of the matrix
    n_rows: NDArray[np.int64]
    y: NDArray[np.float64]  # (B, n)
    weight: NDArray[np.float64]  # (B, n), sums to one
    eta: NDArray[np.float64]  # (B, n) linear predictor
    r: NDArray[np.float64]  # (B, n) weighted residual
    slots: NDArray[np.int64]  # (B, n) columns of `residuals`
    residuals: NDArray[np.float32]  # (B, columns of the product) r, 0 elsewhere
    Z: NDArray[np.float64]  # (B, working, n) standardised columns
    work: NDArray[np.int64]  # (B, working) their features
    pull: NDArray[np.float64]  # (B, working) their feature weights
    mean: NDArray[np.float64]
    deviation: NDArray[np.float64]
    beta: NDArray[np.float64]
    grad: NDArray[np.float64]  # |gradient| at the last solution
    grad_before: NDArray[np.float64]  # |gradient| at the previous penalty
    entered: NDArray[np.bool_]
    order: NDArray[np.int64]  # positions in `work` in order of entry
    order_step: NDArray[np.int64]
    penalties: NDArray[np.float64]  # (B, K)
    certificate: NDArray[np.float64]  # (B, K) KKT violation over the penalty
    intercept: NDArray[np.float64]  # (B, K) for standardised columns
    stored_at: NDArray[np.int64]  # (B, K + 1) borders of the stored solutions
    stored_work: NDArray[np.int64]
    stored_beta: NDArray[np.float64]
    state: NDArray[np.int64]  # (B, 4)
    value: NDArray[np.float64]  # (B, 2)


@njit(nogil=True, cache=True)
def gather(base, fill, features, rows, n, out):
    """Fill out[c, :n] with features[c] on the refit's rows, missing cells filled."""
    for c in range(features.shape[0]):
        j = features[c]
        for i in range(n):
            x = np.float64(base[j, rows[i]])
            out[c, i] = fill[j] if x != x else x


@njit(nogil=True, cache=True, fastmath=FAST)
def encode_deviations(
    first, second, gradient, scale, slack, feature_weight, code, largest
):
    """Encode lower bounds of each refit's weighted deviation of each feature.

    first, second: weighted sums of x and x*x, (features of the tile, B), float32.
    Raises largest[b] to a lower bound of the refit's largest |gradient|/deviation.
    """
    step = np.float32(CODE_STEP)
    for j in range(first.shape[0]):
        s0 = scale[j]
        for b in range(first.shape[1]):
            if code[j, b] == CODE_SETTLED:
                continue
            m = first[j, b]
            v = second[j, b] - m * m - slack[b] * s0 * s0
            s = math.sqrt(max(v, np.float32(0.0))) * np.float32(0.9999)
            c = np.uint8(min(s / (s0 * step), np.float32(CODE_LARGEST)))
            code[j, b] = c
            if c >= 1 and c < 254 and feature_weight[j] > 0.0:
                # c + 1.1 is above the true deviation's code, so t is a lower bound
                t = abs(gradient[j, b]) / (
                    s0 * step * (np.float32(c) + np.float32(1.1)) * feature_weight[j]
                )
                if t > largest[b]:
                    largest[b] = t


@njit(nogil=True, cache=True, fastmath=FAST)
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


@njit(nogil=True, cache=True, fastmath=FAST)
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
    if not v > 1e-24 * (1.0 + m * m):
        return False
    s = math.sqrt(v) if scaled else 1.0
    inverse = 1.0 / s
    for i in range(n):
        z[i] *= inverse
    moments[0] = m
    moments[1] = s
    return True


@njit(nogil=True, cache=True, fastmath=FAST)
def dot(a, b, n):
    """Return the sum of a[i] * b[i], i < n, in the kernel's one fixed order."""
    s = 0.0
    for i in range(n):
        s += a[i] * b[i]
    return s


@njit(nogil=True, cache=True, fastmath=FAST)
def loss_terms(family, y, weight, eta, n, r, h):
    """Return the mean loss; write weighted residual r = -gradient and curvature h."""
    loss = 0.0
    if family == BINOMIAL:
        for i in range(n):
            e = math.exp(-abs(eta[i]))
            p = 1.0 / (1.0 + e) if eta[i] >= 0.0 else e / (1.0 + e)
            loss += weight[i] * (max(eta[i], 0.0) - y[i] * eta[i] + math.log1p(e))
            r[i] = weight[i] * (y[i] - p)
            h[i] = weight[i] * max(p * (1.0 - p), SMALLEST_CURVATURE)
    else:
        for i in range(n):
            d = y[i] - eta[i]
            loss += 0.5 * weight[i] * d * d
            r[i] = weight[i] * d
            h[i] = weight[i]
    return loss


@njit(nogil=True, cache=True, fastmath=FAST)
def extrapolate(path, na, active, Z, n, h, l1, l2, beta, b0, q, trial):
    """Return the intercept after an Anderson step over the stored sweeps.

    The step is kept only where it lowers the quadratic model plus penalty.
    """
    depth = DEPTH - 1
    gram = np.empty((depth, depth))
    c = np.ones(depth)
    trace = 0.0
    for a in range(depth):
        for b in range(a + 1):
            s = 0.0
            for k in range(na + 1):
                s += (path[a + 1, k] - path[a, k]) * (path[b + 1, k] - path[b, k])
            gram[a, b] = s
            gram[b, a] = s
        trace += gram[a, a]
    for a in range(depth):
        gram[a, a] += 1e-10 * trace
    for a in range(depth):  # Gauss without pivots: gram is positive definite
        if gram[a, a] <= 0.0:
            return b0
        for b in range(a + 1, depth):
            f = gram[b, a] / gram[a, a]
            for k in range(a, depth):
                gram[b, k] -= f * gram[a, k]
            c[b] -= f * c[a]
    for a in range(depth - 1, -1, -1):
        for k in range(a + 1, depth):
            c[a] -= gram[a, k] * c[k]
        c[a] /= gram[a, a]
    total = 0.0
    for a in range(depth):
        total += c[a]
    if not abs(total) > 1e-300:
        return b0
    bx = 0.0
    for a in range(depth):
        bx += c[a] / total * path[a + 1, na]
    for i in range(n):
        trial[i] = q[i] - (bx - b0) * h[i]
    before = 0.0
    after = 0.0
    for k in range(na):
        x = 0.0
        for a in range(depth):
            x += c[a] / total * path[a + 1, k]
        j = active[k]
        if x * beta[j] <= 0.0:
            x = 0.0
        path[0, k] = x
        before += l1[j] * abs(beta[j]) + 0.5 * l2[j] * beta[j] * beta[j]
        after += l1[j] * abs(x) + 0.5 * l2[j] * x * x
        d = x - beta[j]
        if d != 0.0:
            for i in range(n):
                trial[i] -= d * h[i] * Z[j, i]
    for i in range(n):
        before += 0.5 * q[i] * q[i] / h[i]
        after += 0.5 * trial[i] * trial[i] / h[i]
    if after < before:
        for i in range(n):
            q[i] = trial[i]
        for k in range(na):
            beta[active[k]] = path[0, k]
        return bx
    return b0


@njit(nogil=True, cache=True, fastmath=FAST)
def penalty_value(m, l1, l2, beta):
    """Return the penalty of the working coefficients."""
    s = 0.0
    for j in range(m):
        s += l1[j] * abs(beta[j]) + 0.5 * l2[j] * beta[j] * beta[j]
    return s


@njit(nogil=True, cache=True, fastmath=FAST)
def descend(Z, n, na, active, h, curvature, l1, l2, beta, b0, q, goal, path, trial):
    """Return the intercept after coordinate descent on the quadratic model."""
    sum_h = 0.0
    for i in range(n):
        sum_h += h[i]
    kept = 0
    for _sweep in range(1000):
        if kept == DEPTH:
            b0 = extrapolate(path, na, active, Z, n, h, l1, l2, beta, b0, q, trial)
            kept = 0
        for k in range(na):
            path[kept, k] = beta[active[k]]
        path[kept, na] = b0
        kept += 1
        s = 0.0
        for i in range(n):
            s += q[i]
        d = s / sum_h
        b0 += d
        for i in range(n):
            q[i] -= d * h[i]
        largest = abs(s)
        for k in range(na):
            j = active[k]
            u = dot(q, Z[j], n) + curvature[k] * beta[j]
            new = 0.0
            if u > l1[j]:
                new = (u - l1[j]) / (curvature[k] + l2[j])
            elif u < -l1[j]:
                new = (u + l1[j]) / (curvature[k] + l2[j])
            d = new - beta[j]
            if d != 0.0:
                beta[j] = new
                for i in range(n):
                    q[i] -= d * h[i] * Z[j, i]
                largest = max(largest, (curvature[k] + l2[j]) * abs(d))
        if largest < goal:
            break
    return b0


@njit(nogil=True, cache=True, fastmath=FAST)
def solve(
    family,
    Z,
    m,
    n,
    y,
    weight,
    pull,
    penalty,
    mixing,
    beta,
    b0,
    eta,
    r,
    grad,
    tol,
    steps,
):
    """Solve one refit at one penalty over its working set: prox-Newton descent.

    pull: feature weights of the working set. Warm start from beta, b0, eta; leaves
    r and grad (|gradient| of the loss) at the solution.
    Returns (intercept, largest KKT violation relative to the penalty).
    """
    h = np.empty(n)
    q = np.empty(n)
    trial = np.empty(n)
    old_eta = np.empty(n)
    curvature = np.empty(m)
    old = np.empty(m)
    l1 = np.empty(m)
    l2 = np.empty(m)
    active = np.empty(m, np.int64)
    path = np.empty((DEPTH, m + 1))
    for j in range(m):
        l1[j] = penalty * mixing * pull[j]
        l2[j] = penalty * (1.0 - mixing) * pull[j]
        old[j] = beta[j]
    for i in range(n):
        old_eta[i] = eta[i]
    old0 = b0
    unit = penalty * mixing
    best = np.inf
    worst = 0.0
    for _newton in range(steps):
        value = loss_terms(family, y, weight, eta, n, r, h)
        value += penalty_value(m, l1, l2, beta)
        halvings = 0
        while not value <= best + 1e-10 * abs(best) and halvings < 30:
            b0 = old0 + 0.5 * (b0 - old0)
            for j in range(m):
                beta[j] = old[j] + 0.5 * (beta[j] - old[j])
            for i in range(n):
                eta[i] = old_eta[i] + 0.5 * (eta[i] - old_eta[i])
            value = loss_terms(family, y, weight, eta, n, r, h)
            value += penalty_value(m, l1, l2, beta)
            halvings += 1
        best = value
        s = 0.0
        for i in range(n):
            s += r[i]
        worst = abs(s)
        na = 0
        for j in range(m):
            g = dot(r, Z[j], n)
            grad[j] = abs(g)
            if beta[j] > 0.0:
                e = abs(g - l2[j] * beta[j] - l1[j])
            elif beta[j] < 0.0:
                e = abs(g - l2[j] * beta[j] + l1[j])
            else:
                e = abs(g) - l1[j]
            if e > worst:
                worst = e
            if beta[j] != 0.0 or e > 0.0:
                active[na] = j
                na += 1
        if worst <= tol * unit:
            break
        for k in range(na):
            j = active[k]
            s = 0.0
            for i in range(n):
                s += h[i] * Z[j, i] * Z[j, i]
            curvature[k] = s
        for j in range(m):
            old[j] = beta[j]
        old0 = b0
        for i in range(n):
            q[i] = r[i]
            old_eta[i] = eta[i]
        goal = max(0.1 * worst, 0.3 * tol * unit)  # solve only as far as it is true
        b0 = descend(
            Z, n, na, active, h, curvature, l1, l2, beta, b0, q, goal, path, trial
        )
        d = b0 - old0
        for i in range(n):
            eta[i] += d
        for k in range(na):
            j = active[k]
            d = beta[j] - old[j]
            if d != 0.0:
                for i in range(n):
                    eta[i] += d * Z[j, i]
    return b0, worst / unit


@njit(nogil=True, cache=True)
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
        if refits.beta[b, j] != 0.0 and not refits.entered[b, j]:
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


@njit(nogil=True, cache=True)
def close_step(refits, b, k, violation):
    """Store the solution of step k, which has just been found to be optimal."""
    refits.certificate[b, k] = max(refits.certificate[b, k], violation)
    at = refits.stored_at[b, k]
    for j in range(refits.state[b, WORKING]):
        if refits.beta[b, j] != 0.0:
            refits.stored_work[b, at] = j
            refits.stored_beta[b, at] = refits.beta[b, j]
            at += 1
    refits.stored_at[b, k + 1] = at
    refits.intercept[b, k] = refits.value[b, INTERCEPT]
    note_entries(refits, b, k)
    for j in range(refits.state[b, WORKING]):
        pull = refits.pull[b, j]
        refits.grad_before[b, j] = refits.grad[b, j] / pull if pull > 0.0 else 0.0


@njit(nogil=True, cache=True)
def open_path(refits, b, rules, worst):
    """Set the refit's penalties from its largest gradient; return the first step.

    At or above the largest penalty nothing is picked and no solve is needed.
    """
    penalties = refits.penalties[b]
    largest = worst / rules.mixing
    refits.value[b, LARGEST] = largest
    k = 0
    for a in range(penalties.shape[0]):
        if rules.relative:
            penalties[a] *= largest
    while k < penalties.shape[0] and penalties[k] >= largest:
        refits.certificate[b, k] = 0.0
        refits.intercept[b, k] = refits.value[b, INTERCEPT]
        refits.stored_at[b, k + 1] = refits.stored_at[b, k]
        k += 1
    return k


@njit(nogil=True, cache=True)
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
            refits.grad_before[b, m] = min(g[c], cap)
            for i in range(n):
                refits.Z[b, m, i] = fresh[c, i]
            code[j, b] = CODE_SETTLED
            m += 1
    refits.state[b, WORKING] = m


@njit(nogil=True, cache=True)
def solve_refit(refits, b, rules, penalty):
    """Solve one refit at one penalty; return its KKT violation over the working set."""
    refits.value[b, INTERCEPT], violation = solve(
        rules.family,
        refits.Z[b],
        refits.state[b, WORKING],
        refits.n_rows[b],
        refits.y[b],
        refits.weight[b],
        refits.pull[b],
        penalty,
        rules.mixing,
        refits.beta[b],
        refits.value[b, INTERCEPT],
        refits.eta[b],
        refits.r[b],
        refits.grad[b],
        rules.tol,
        rules.steps,
    )
    for i in range(refits.n_rows[b]):
        refits.residuals[b, refits.slots[b, i]] = refits.r[b, i]
    return violation


@njit(nogil=True, cache=True)
def settle(refits, b, rules, candidates, fresh, weights, code):
    """Decide for one refit from its candidates, then solve its next penalty.

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
            g[c] = abs(dot(fresh[c], refits.r[b], n)) / weights[j]
        else:
            code[j, b] = CODE_SETTLED  # constant in this refit: out for good
        worst = max(worst, g[c])
    k = refits.state[b, STEP]
    penalties = refits.penalties[b]
    cap = np.inf
    if k < 0:
        k = open_path(refits, b, rules, worst)
        before = refits.value[b, LARGEST]
    elif worst > penalties[k] * rules.mixing * (1.0 + rules.tol):
        # violators: this refit stays at its penalty while the others go on
        before = min(penalties[k - 1], refits.value[b, LARGEST]) if k > 0 else np.inf
        cap = max(2.0 * penalties[k] - before, 0.5 * penalties[k]) * rules.mixing
    else:
        close_step(refits, b, k, worst / (penalties[k] * rules.mixing) - 1.0)
        before = penalties[k]
        k += 1
    refits.state[b, STEP] = k
    if (
        k == penalties.shape[0]
        or refits.state[b, ENTRIES] >= rules.max_markers
        or not refits.value[b, LARGEST] > 0.0
    ):
        refits.state[b, DONE] = 1
        return
    if cap < np.inf:
        keep = penalties[k] * rules.mixing * 0.999
    else:
        keep = max(2.0 * penalties[k] - before, 0.5 * penalties[k]) * rules.mixing
    enlarge(refits, b, n, candidates, fresh, g, moments, keep, cap, weights, code)
    refits.certificate[b, k] = solve_refit(refits, b, rules, penalties[k])
    if not refits.certificate[b, k] <= rules.tol:
        refits.state[b, DONE] = 2


@njit(nogil=True, cache=True)
def settle_chunk(refits, chunk, rules, cut, candidates, fresh, weights, code):
    """Settle the refits of a chunk; cut[t]:cut[t + 1] are the t-th one's candidates."""
    for t in range(chunk.shape[0]):
        low, high = cut[t], cut[t + 1]
        settle(
            refits,
            chunk[t],
            rules,
            candidates[low:high],
            fresh[low:high],
            weights,
            code,
        )


@njit(nogil=True, cache=True)
def start_refits(refits, rules, features, columns, weights):
    """Fit the null model of each refit: intercept and unpenalised features.

    columns: the unpenalised features' raw columns, (B, unpenalised, rows).
    """
    moments = np.empty(2)
    for b in range(refits.n_rows.shape[0]):
        m = 0
        for c in range(features.shape[0]):
            z = columns[b, c]
            if standardise(
                z, refits.n_rows[b], refits.weight[b], rules.scaled, moments
            ):
                refits.work[b, m] = features[c]
                refits.pull[b, m] = weights[features[c]]
                refits.mean[b, m] = moments[0]
                refits.deviation[b, m] = moments[1]
                refits.entered[b, m] = True  # not picked: it was given
                for i in range(refits.n_rows[b]):
                    refits.Z[b, m, i] = z[i]
                m += 1
        refits.state[b, WORKING] = m
        # the scale of the tolerance: there is no penalty yet
        if not solve_refit(refits, b, rules, NULL_MODEL_SCALE) <= rules.tol:
            refits.state[b, DONE] = 2


@njit(nogil=True, cache=True)
def gather_chunk(base, fill, refits_rows, n_rows, chunk, cut, candidates, fresh):
    """Gather the raw candidate columns of a chunk of refits."""
    for t in range(chunk.shape[0]):
        b = chunk[t]
        low, high = cut[t], cut[t + 1]
        gather(
            base,
            fill,
            candidates[low:high],
            refits_rows[b],
            n_rows[b],
            fresh[low:high],
        )
