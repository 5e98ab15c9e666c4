"""Kernels for families with one linear predictor: losses, penalised solve, refits.

Gaussian, binomial and Cox share one prox-Newton coordinate descent and one ridge refit;
only `loss_terms` and `curves` know them apart. Plain functions on arrays, no panelkit
imports, float64, fixed order.

Symbols: n rows, m working features, z standardised column, r weighted residual (minus
the gradient by the linear predictor), h what the curvature H is made of, HZ the product
of H with the active columns, q = r - H d residual of the quadratic model at the change
d, l1 and l2 a feature's penalties.
"""

import math
from typing import Any

import numpy as np
from numba import njit

FAST = {"reassoc", "contract", "arcp", "nsz"}  # NaN must stay visible

GAUSSIAN = 0
BINOMIAL = 1
COX_EFRON = 2
COX_BRESLOW = 3

DEPTH = 6  # sweeps kept for one extrapolation
SMALLEST_CURVATURE = 1e-5

# Doors are called from Python; inner kernels from kernels alone, so that no wrapper
# has to be compiled for them.
DOOR: dict[str, Any] = {"nogil": True, "cache": True, "no_cfunc_wrapper": True}
INNER: dict[str, Any] = {**DOOR, "no_cpython_wrapper": True}
door = njit(**DOOR)
fast_door = njit(fastmath=FAST, **DOOR)
fast_inner = njit(fastmath=FAST, **INNER)


@fast_inner
def dot(a, b, n):
    """Return the sum of a[i] * b[i], i < n, in one fixed order."""
    s = 0.0
    for i in range(n):
        s += a[i] * b[i]
    return s


@fast_inner
def tie_end(time, order, start, stop):
    """Return the end of the group of equal times that begins at `start`."""
    end = start
    while end < stop and time[order[end]] == time[order[start]]:
        end += 1
    return end


@fast_inner
def stratum_end(stratum, order, start, n):
    """Return the end of the stratum that begins at `start`."""
    end = start
    while end < n and stratum[order[end]] == stratum[order[start]]:
        end += 1
    return end


@fast_inner
def cox_terms(efron, time, event, stratum, order, weight, eta, n, r, h):
    """Return minus the log partial likelihood; write r, and weighted risks to h.

    order: rows by stratum, then descending time. Tied events share their mean weight
    (Efron), or all face the whole risk set (Breslow).
    """
    top = -np.inf
    for i in range(n):
        top = max(top, eta[i])
    for i in range(n):
        h[i] = weight[i] * math.exp(eta[i] - top)
        r[i] = weight[i] * event[i]
    hazard = np.zeros(n)
    loss = 0.0
    start = 0
    while start < n:
        stop = stratum_end(stratum, order, start, n)
        risk = 0.0
        a = start
        while a < stop:  # down the times: the risk set grows
            b = tie_end(time, order, a, stop)
            deaths = 0
            death_weight = 0.0
            death_risk = 0.0
            for c in range(a, b):
                i = order[c]
                risk += h[i]
                if event[i] > 0.5:
                    deaths += 1
                    death_weight += weight[i]
                    death_risk += h[i]
                    loss -= weight[i] * (eta[i] - top)
            relief = 0.0
            tied = deaths if efron else 1
            for k in range(tied if deaths > 0 else 0):
                part = k / deaths
                left = risk - part * death_risk
                loss += death_weight / tied * math.log(left)
                hazard[a] += death_weight / tied / left
                relief += death_weight / tied * part / left
            for c in range(a, b):
                i = order[c]
                if event[i] > 0.5:
                    r[i] += h[i] * relief
            a = b
        total = 0.0
        b = stop
        while b > start:  # up the times: hazards of all who were still at risk
            a = b - 1
            while a > start and time[order[a - 1]] == time[order[b - 1]]:
                a -= 1
            total += hazard[a]
            for c in range(a, b):
                r[order[c]] -= h[order[c]] * total
            b = a
        start = stop
    return loss


@fast_inner
def cox_curve(efron, time, event, stratum, order, weight, h, n, z, out):
    """Write the product of the partial likelihood's curvature with z.

    Each event (each of a tie, with Efron's shares) adds diag(p) - p p' over its risk
    set, p the chances to be the one who fails.
    """
    slope = np.zeros(n)
    level = np.zeros(n)
    start = 0
    while start < n:
        stop = stratum_end(stratum, order, start, n)
        risk = 0.0
        mass = 0.0
        a = start
        while a < stop:
            b = tie_end(time, order, a, stop)
            deaths = 0
            death_weight = 0.0
            death_risk = 0.0
            death_mass = 0.0
            for c in range(a, b):
                i = order[c]
                risk += h[i]
                mass += h[i] * z[i]
                out[i] = 0.0
                if event[i] > 0.5:
                    deaths += 1
                    death_weight += weight[i]
                    death_risk += h[i]
                    death_mass += h[i] * z[i]
            less_slope = 0.0
            less_level = 0.0
            tied = deaths if efron else 1
            for k in range(tied if deaths > 0 else 0):
                part = k / deaths
                left = risk - part * death_risk
                hazard = death_weight / tied / left
                mean = (mass - part * death_mass) / left
                slope[a] += hazard
                level[a] += hazard * mean
                less_slope += part * hazard
                less_level += part * hazard * mean
            for c in range(a, b):
                i = order[c]
                if event[i] > 0.5:
                    out[i] = less_level - less_slope * z[i]
            a = b
        all_slope = 0.0
        all_level = 0.0
        b = stop
        while b > start:
            a = b - 1
            while a > start and time[order[a - 1]] == time[order[b - 1]]:
                a -= 1
            all_slope += slope[a]
            all_level += level[a]
            for c in range(a, b):
                i = order[c]
                out[i] = h[i] * (all_slope * z[i] - all_level + out[i])
            b = a
        start = stop


@fast_door
def loss_terms(family, y, event, stratum, order, weight, eta, n, r, h):
    """Return the weighted mean loss; write weighted residual r and curvature h."""
    loss = 0.0
    if family == BINOMIAL:
        for i in range(n):
            e = math.exp(-abs(eta[i]))
            p = 1.0 / (1.0 + e) if eta[i] >= 0.0 else e / (1.0 + e)
            loss += weight[i] * (max(eta[i], 0.0) - y[i] * eta[i] + math.log1p(e))
            r[i] = weight[i] * (y[i] - p)
            h[i] = weight[i] * max(p * (1.0 - p), SMALLEST_CURVATURE)
    elif family == GAUSSIAN:
        for i in range(n):
            d = y[i] - eta[i]
            loss += 0.5 * weight[i] * d * d
            r[i] = weight[i] * d
            h[i] = weight[i]
    else:
        loss = cox_terms(
            family == COX_EFRON, y, event, stratum, order, weight, eta, n, r, h
        )
    return loss


@fast_door
def curves(
    family, y, event, stratum, order, weight, h, n, Z, active, na, HZ, curvature
):
    """Write H z of the active columns and their curvatures z'Hz."""
    for a in range(na):
        z = Z[active[a]]
        if family <= BINOMIAL:
            for i in range(n):
                HZ[a, i] = h[i] * z[i]
        else:
            cox_curve(
                family == COX_EFRON, y, event, stratum, order, weight, h, n, z, HZ[a]
            )
        curvature[a] = dot(HZ[a], z, n)


@fast_inner
def combine(path, length, c):
    """Write the Anderson weights of the stored sweeps to c; True if they exist."""
    depth = DEPTH - 1
    gram = np.empty((depth, depth))
    trace = 0.0
    for a in range(depth):
        c[a] = 1.0
        for b in range(a + 1):
            s = 0.0
            for k in range(length):
                s += (path[a + 1, k] - path[a, k]) * (path[b + 1, k] - path[b, k])
            gram[a, b] = s
            gram[b, a] = s
        trace += gram[a, a]
    for a in range(depth):
        gram[a, a] += 1e-10 * trace
    for a in range(depth):  # Gauss without pivots: gram is positive definite
        if gram[a, a] <= 0.0:
            return False
        for b in range(a + 1, depth):
            f = gram[b, a] / gram[a, a]
            for k in range(a, depth):
                gram[b, k] -= f * gram[a, k]
            c[b] -= f * c[a]
    total = 0.0
    for a in range(depth - 1, -1, -1):
        for k in range(a + 1, depth):
            c[a] -= gram[a, k] * c[k]
        c[a] /= gram[a, a]
        total += c[a]
    if not abs(total) > 1e-300:
        return False
    for a in range(depth):
        c[a] /= total
    return True


@fast_inner
def model_value(Z, h0, n, na, active, l1, l2, r, x, x0, old, old0, q):
    """Return quadratic model plus penalty at coefficients x, x0, whose q is given.

    The change d of the predictors follows from q where the curvature is diagonal.
    """
    value = 0.0
    for a in range(na):
        j = active[a]
        value += l1[j] * abs(x[a]) + 0.5 * l2[j] * x[a] * x[a]
    if h0[0] > 0.0:
        for i in range(n):
            value -= 0.5 * (r[i] - q[i]) * (r[i] + q[i]) / h0[i]
        return value
    d = np.full(n, x0 - old0)
    for a in range(na):
        j = active[a]
        step = x[a] - old[j]
        if step != 0.0:
            for i in range(n):
                d[i] += step * Z[j, i]
    for i in range(n):
        value -= 0.5 * d[i] * (r[i] + q[i])
    return value


@fast_inner
def extrapolate(
    path, na, active, Z, HZ, h0, n, r, l1, l2, beta, b0, old, old0, q, trial
):
    """Return the intercept after an Anderson step over the stored sweeps.

    The step is kept only where it lowers the quadratic model plus penalty.
    """
    c = np.empty(DEPTH - 1)
    if not combine(path, na + 1, c):
        return b0
    now = np.empty(na)
    new = np.empty(na)
    bx = 0.0
    for k in range(DEPTH - 1):
        bx += c[k] * path[k + 1, na]
    for i in range(n):
        trial[i] = q[i] - (bx - b0) * h0[i]
    for a in range(na):
        now[a] = beta[active[a]]
        x = 0.0
        for k in range(DEPTH - 1):
            x += c[k] * path[k + 1, a]
        new[a] = 0.0 if x * now[a] <= 0.0 else x
        step = new[a] - now[a]
        if step != 0.0:
            for i in range(n):
                trial[i] -= step * HZ[a, i]
    before = model_value(Z, h0, n, na, active, l1, l2, r, now, b0, old, old0, q)
    after = model_value(Z, h0, n, na, active, l1, l2, r, new, bx, old, old0, trial)
    if not after < before:
        return b0
    for i in range(n):
        q[i] = trial[i]
    for a in range(na):
        beta[active[a]] = new[a]
    return bx


@fast_inner
def descend(
    Z, HZ, h0, n, na, active, curvature, r, l1, l2, beta, b0, old, q, goal, path, trial
):
    """Return the intercept after coordinate descent on the quadratic model."""
    old0 = b0
    sum_h = 0.0
    for i in range(n):
        sum_h += h0[i]
    kept = 0
    for _sweep in range(1000):
        if kept == DEPTH:
            b0 = extrapolate(
                path, na, active, Z, HZ, h0, n, r, l1, l2, beta, b0, old, old0, q, trial
            )
            kept = 0
        for a in range(na):
            path[kept, a] = beta[active[a]]
        path[kept, na] = b0
        kept += 1
        largest = 0.0
        if sum_h > 0.0:  # Cox has no intercept
            s = 0.0
            for i in range(n):
                s += q[i]
            step = s / sum_h
            b0 += step
            for i in range(n):
                q[i] -= step * h0[i]
            largest = abs(s)
        for a in range(na):
            j = active[a]
            u = dot(q, Z[j], n) + curvature[a] * beta[j]
            new = 0.0
            if u > l1[j]:
                new = (u - l1[j]) / (curvature[a] + l2[j])
            elif u < -l1[j]:
                new = (u + l1[j]) / (curvature[a] + l2[j])
            step = new - beta[j]
            if step != 0.0:
                beta[j] = new
                for i in range(n):
                    q[i] -= step * HZ[a, i]
                largest = max(largest, (curvature[a] + l2[j]) * abs(step))
        if largest < goal:
            break
    return b0


@fast_inner
def solve(
    family, Z, m, n, y, event, stratum, order, weight, pull, penalty, mixing, beta, b0,
    eta, r, grad, tol, steps,
):  # fmt: skip
    """Solve one refit at one penalty over its working set: prox-Newton descent.

    pull: feature weights of the working set. Warm start from beta, b0, eta; leaves
    r and grad (|gradient| of the loss) at the solution.
    Returns (intercept, largest KKT violation relative to the penalty).
    """
    h = np.empty(n)
    h0 = np.zeros(n)
    HZ = np.empty((m, n))
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
    halved = 0
    for _newton in range(steps):
        value = loss_terms(family, y, event, stratum, order, weight, eta, n, r, h)
        for j in range(m):
            value += l1[j] * abs(beta[j]) + 0.5 * l2[j] * beta[j] * beta[j]
        if not value <= best + 1e-10 * abs(best) and halved < 30:
            b0 = old0 + 0.5 * (b0 - old0)  # the model was too bold: half the step
            for j in range(m):
                beta[j] = old[j] + 0.5 * (beta[j] - old[j])
            for i in range(n):
                eta[i] = old_eta[i] + 0.5 * (eta[i] - old_eta[i])
            halved += 1
            continue
        best = value
        halved = 0
        s = 0.0
        for i in range(n):
            s += r[i]
        worst = abs(s)
        na = np.int64(0)
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
        curves(
            family, y, event, stratum, order, weight, h, n, Z, active, na, HZ, curvature
        )
        for j in range(m):
            old[j] = beta[j]
        old0 = b0
        for i in range(n):
            q[i] = r[i]
            old_eta[i] = eta[i]
            if family <= BINOMIAL:
                h0[i] = h[i]
        goal = max(0.1 * worst, 0.3 * tol * unit)  # solve only as far as it is true
        b0 = descend(
            Z, HZ, h0, n, na, active, curvature, r, l1, l2, beta, b0, old, q, goal,
            path, trial,
        )  # fmt: skip
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


@door
def solve_chunk(
    family, chunk, penalty, mixing, tol, steps, Z, working, n_rows, y, event, stratum,
    order, weight, pull, beta, b0, eta, r, grad, violation,
):  # fmt: skip
    """Solve the refits of a chunk, each at its own penalty."""
    for t in range(chunk.shape[0]):
        b = chunk[t]
        b0[b, 0], violation[b] = solve(
            family,
            Z[b],
            working[b],
            n_rows[b],
            y[b],
            event[b],
            stratum[b],
            order[b],
            weight[b],
            pull[b],
            penalty[b],
            mixing,
            beta[b, 0],
            b0[b, 0],
            eta[b, 0],
            r[b, 0],
            grad[b],
            tol,
            steps,
        )


@fast_inner
def cholesky_solve(A, b, m):
    """Solve A x = b in place (A symmetric positive definite, m x m); True if so."""
    for j in range(m):
        d = A[j, j]
        for k in range(j):
            d -= A[j, k] * A[j, k]
        if not d > 0.0:
            return False
        d = math.sqrt(d)
        A[j, j] = d
        for i in range(j + 1, m):
            s = A[i, j]
            for k in range(j):
                s -= A[i, k] * A[j, k]
            A[i, j] = s / d
    for i in range(m):
        s = b[i]
        for k in range(i):
            s -= A[i, k] * b[k]
        b[i] = s / A[i, i]
    for i in range(m - 1, -1, -1):
        s = b[i]
        for k in range(i + 1, m):
            s -= A[k, i] * b[k]
        b[i] = s / A[i, i]
    return True


@fast_inner
def ridge_newton(
    family, Z, members, m, y, event, stratum, order, weight, penalty, coef, tol, steps
):
    """Minimise mean loss + penalty/2 * sum of squares over a few columns.

    Z: (features, n) standardised; members[:m]: the rows of Z in the model.
    coef: intercept first (0 for Cox), warm start; returns the largest |gradient|.
    """
    n = y.shape[0]
    free = 1 if family <= BINOMIAL else 0
    eta = np.empty(n)
    r = np.empty(n)
    h = np.empty(n)
    HZ = np.empty((m, n))
    diagonal = np.empty(m)
    A = np.empty((m + free, m + free))
    g = np.empty(m + free)
    old = coef.copy()
    best = np.inf
    worst = np.inf
    halved = 0
    for _step in range(steps):
        for i in range(n):
            eta[i] = coef[0]
        for a in range(m):
            c = coef[a + 1]
            for i in range(n):
                eta[i] += c * Z[members[a], i]
        value = loss_terms(family, y, event, stratum, order, weight, eta, n, r, h)
        for a in range(m):
            value += 0.5 * penalty * coef[a + 1] * coef[a + 1]
        if not value <= best + 1e-12 * abs(best) and halved < 30:
            for a in range(m + 1):
                coef[a] = old[a] + 0.5 * (coef[a] - old[a])
            halved += 1
            continue
        best = value
        halved = 0
        worst = 0.0
        if free == 1:
            s = 0.0
            for i in range(n):
                s += r[i]
            g[0] = s
            worst = abs(s)
        for a in range(m):
            s = dot(r, Z[members[a]], n) - penalty * coef[a + 1]
            g[a + free] = s
            worst = max(worst, abs(s))
        if worst <= tol:
            break
        curves(
            family, y, event, stratum, order, weight, h, n, Z, members, m, HZ, diagonal
        )
        if free == 1:
            s = 0.0
            for i in range(n):
                s += h[i]
            A[0, 0] = s
        for a in range(m):
            if free == 1:
                s = 0.0
                for i in range(n):
                    s += HZ[a, i]
                A[a + 1, 0] = s
            for b in range(a):
                A[a + free, b + free] = dot(HZ[a], Z[members[b]], n)
            A[a + free, a + free] = diagonal[a] + penalty
        if not cholesky_solve(A, g, m + free):
            break
        for a in range(m + 1):
            old[a] = coef[a]
        for a in range(m + free):
            coef[a + 1 - free] += g[a]
    return worst


@door
def ridge_panels(
    family, Z, members, sizes, y, event, stratum, order, weight, penalties, start,
    steps, tol, coefs,
):  # fmt: skip
    """Fit every panel at every penalty, warm along the penalties.

    members: (panels, largest size) rows of Z, sizes: (panels,) how many count; start:
    the null model's intercept. coefs: (panels, penalties, 1 + largest size), written.
    Returns the worst gradient.
    """
    worst = 0.0
    for s in range(sizes.shape[0]):
        m = sizes[s]
        coef = np.zeros(m + 1)
        coef[0] = start
        for k in range(penalties.shape[0]):
            left = ridge_newton(
                family, Z, members[s], m, y, event, stratum, order, weight,
                penalties[k], coef, tol, steps,
            )  # fmt: skip
            worst = max(worst, left)
            for a in range(m + 1):
                coefs[s, k, a] = coef[a]
    return worst


@door
def predict_panels(Z, members, sizes, coefs, eta):
    """Write the linear predictors (panels, penalties, n), summed in marker order."""
    for s in range(sizes.shape[0]):
        for k in range(coefs.shape[1]):
            for i in range(Z.shape[1]):
                total = coefs[s, k, 0]
                for a in range(sizes[s]):
                    total += coefs[s, k, a + 1] * Z[members[s, a], i]
                eta[s, k, i] = total
