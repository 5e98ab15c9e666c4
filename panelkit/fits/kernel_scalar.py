"""Kernels for families with one linear predictor: losses, penalised solve, refits.

Gaussian, binomial and Cox share one prox-Newton coordinate descent and one ridge refit;
only `loss_terms` and `curves` know them apart. Plain functions on arrays, float64,
fixed order.

Symbols: n rows, m working features, z standardised column, r weighted residual (minus
the gradient by the linear predictor), h what the curvature H is made of, HZ the product
of H with the active columns, q = r - H d residual of the quadratic model at the change
d, l1 and l2 a feature's penalties.
"""

import math

import numpy as np

from panelkit.fits.kernel_algebra import (
    DEPTH,
    cholesky_solve,
    combine,
    door,
    dot,
    fast_door,
    fast_inner,
)

GAUSSIAN = 0
BINOMIAL = 1
COX_EFRON = 2
COX_BRESLOW = 3

SWEEPS = 1000  # of one Newton step at most
SMALLEST_CURVATURE = 1e-5

# rows of `survival`, by position in `ORDER` but for the events
ORDER = 0  # rows by stratum, then descending time
TIE_START = 1  # where the group of equal times begins
TIE_END = 2  # and where the next one does
STRATUM = 3  # where the stratum begins
EVENT = 4  # by row: 1 an event, 0 censored


@fast_inner
def cox_terms(efron, survival, weight, eta, n, r, h):
    """Return minus the log partial likelihood; write r, and weighted risks to h.

    Tied events share their mean weight (Efron), or all face the whole risk set
    (Breslow).
    """
    order = survival[ORDER]
    event = survival[EVENT]
    top = -np.inf
    for i in range(n):
        top = max(top, eta[i])
    for i in range(n):
        h[i] = weight[i] * math.exp(eta[i] - top)
        r[i] = weight[i] * event[i]
    hazard = np.empty(n)
    loss = 0.0
    risk = 0.0
    a = 0
    while a < n:  # down the times: the risk set grows
        b = survival[TIE_END, a]
        if survival[STRATUM, a] == a:
            risk = 0.0
        hazard[a] = 0.0
        deaths = 0
        death_weight = 0.0
        death_risk = 0.0
        for c in range(a, b):
            i = order[c]
            risk += h[i]
            if event[i] > 0:
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
            if event[i] > 0:
                r[i] += h[i] * relief
        a = b
    total = 0.0
    b = n
    while b > 0:  # up the times: hazards of all who were still at risk
        a = survival[TIE_START, b - 1]
        if b == n or survival[STRATUM, b] == b:
            total = 0.0
        total += hazard[a]
        for c in range(a, b):
            r[order[c]] -= h[order[c]] * total
        b = a
    return loss


@fast_inner
def cox_curve(efron, survival, weight, h, n, z, out):
    """Write the product of the partial likelihood's curvature with z.

    Each event (each of a tie, with Efron's shares) adds diag(p) - p p' over its risk
    set, p the chances to be the one who fails.
    """
    order = survival[ORDER]
    event = survival[EVENT]
    slope = np.empty(n)
    level = np.empty(n)
    risk = 0.0
    mass = 0.0
    a = 0
    while a < n:
        b = survival[TIE_END, a]
        if survival[STRATUM, a] == a:
            risk = 0.0
            mass = 0.0
        slope[a] = 0.0
        level[a] = 0.0
        deaths = 0
        death_weight = 0.0
        death_risk = 0.0
        death_mass = 0.0
        for c in range(a, b):
            i = order[c]
            risk += h[i]
            mass += h[i] * z[i]
            out[i] = 0.0
            if event[i] > 0:
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
            if event[i] > 0:
                out[i] = less_level - less_slope * z[i]
        a = b
    all_slope = 0.0
    all_level = 0.0
    b = n
    while b > 0:
        a = survival[TIE_START, b - 1]
        if b == n or survival[STRATUM, b] == b:
            all_slope = 0.0
            all_level = 0.0
        all_slope += slope[a]
        all_level += level[a]
        for c in range(a, b):
            i = order[c]
            out[i] = h[i] * (all_slope * z[i] - all_level + out[i])
        b = a


@fast_door
def loss_terms(family, survival, y, weight, eta, n, r, h):
    """Return the weighted mean loss; write weighted residual r and curvature h."""
    loss = 0.0
    if survival is not None:
        loss = cox_terms(family == COX_EFRON, survival, weight, eta, n, r, h)
    elif family == BINOMIAL:
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


@fast_door
def curves(family, survival, weight, h, n, Z, active, na, HZ, curvature):
    """Write H z of the active columns and their curvatures z'Hz."""
    for a in range(na):
        z = Z[active[a]]
        if survival is not None:
            cox_curve(family == COX_EFRON, survival, weight, h, n, z, HZ[a])
        else:
            for i in range(n):
                HZ[a, i] = h[i] * z[i]
        curvature[a] = dot(HZ[a], z, n)


@fast_inner
def model_value(Z, h0, n, na, active, l1, l2, r, x, x0, old, old0, q, d):
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
    for i in range(n):
        d[i] = x0 - old0
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
    path, c, na, active, Z, HZ, h0, n, r, l1, l2, beta, b0, old, old0, q, trial, d, now,
    new,
):  # fmt: skip
    """Return the intercept after an Anderson step over the stored sweeps.

    c: the step's weights. It is kept only where it lowers the quadratic model plus
    penalty.
    """
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
    before = model_value(Z, h0, n, na, active, l1, l2, r, now, b0, old, old0, q, d)
    after = model_value(Z, h0, n, na, active, l1, l2, r, new, bx, old, old0, trial, d)
    if not after < before:
        return b0
    for i in range(n):
        q[i] = trial[i]
    for a in range(na):
        beta[active[a]] = new[a]
    return bx


@fast_inner
def descend(
    Z, HZ, h0, n, na, active, curvature, l1, l2, beta, b0, q, goal, path, sweeps
):
    """Return (intercept, largest move) after some sweeps of coordinate descent."""
    sum_h = 0.0
    for i in range(n):
        sum_h += h0[i]
    largest = 0.0
    for sweep in range(sweeps):
        for a in range(na):
            path[sweep, a] = beta[active[a]]
        path[sweep, na] = b0
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
    return b0, largest


@fast_inner
def optimality(Z, m, n, r, l1, l2, beta, grad, active):
    """Return (largest KKT violation, active features); write |gradients|, active."""
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
    return worst, na


@fast_door
def solve_chunk(
    family, survival, chunk, penalty, mixing, tol, steps, columns, working, n_rows, y,
    weight, pull, betas, intercepts, etas, residuals, grads, violation, rows, places,
    active, HZ, path,
):  # fmt: skip
    """Solve the refits of a chunk, each at its own penalty: prox-Newton descent.

    survival: None, or for Cox (B, 5, n). pull: feature weights of the working sets.
    Warm start from betas, intercepts, etas; leaves residuals and grads (|gradient| of
    the loss) at the solution, and the largest KKT violation relative to the penalty.
    Work space: rows (6, n), places (6, m), active (m), HZ (m, n), path (DEPTH, m + 1).
    """
    h, h0, q, trial, old_eta = rows[0], rows[1], rows[2], rows[3], rows[4]
    curvature, old, l1, l2 = places[0], places[1], places[2], places[3]
    c = np.empty(DEPTH - 1)
    for t in range(chunk.shape[0]):
        b = chunk[t]
        own = None if survival is None else survival[b]
        Z, m, n = columns[b], working[b], n_rows[b]
        beta, b0, eta = betas[b, 0], intercepts[b, 0], etas[b, 0]
        r = residuals[b, 0]
        unit = penalty[b] * mixing
        for j in range(m):
            l1[j] = penalty[b] * mixing * pull[b, j]
            l2[j] = penalty[b] * (1.0 - mixing) * pull[b, j]
            old[j] = beta[j]
        for i in range(n):
            h0[i] = 0.0
            old_eta[i] = eta[i]
        old0 = b0
        best = np.inf
        worst = 0.0
        halved = 0
        for _newton in range(steps):
            value = loss_terms(family, own, y[b], weight[b], eta, n, r, h)
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
            worst, na = optimality(Z, m, n, r, l1, l2, beta, grads[b], active)
            if worst <= tol * unit:
                break
            curves(family, own, weight[b], h, n, Z, active, na, HZ, curvature)
            for j in range(m):
                old[j] = beta[j]
            old0 = b0
            for i in range(n):
                q[i] = r[i]
                old_eta[i] = eta[i]
                if survival is None:
                    h0[i] = h[i]
            goal = max(0.1 * worst, 0.3 * tol * unit)  # solve only as far as it is true
            for sweep in range(0, SWEEPS, DEPTH):
                if sweep > 0 and combine(path, na + 1, c):
                    b0 = extrapolate(
                        path, c, na, active, Z, HZ, h0, n, r, l1, l2, beta, b0, old,
                        old0, q, trial, rows[5], places[4], places[5],
                    )  # fmt: skip
                b0, largest = descend(
                    Z, HZ, h0, n, na, active, curvature, l1, l2, beta, b0, q, goal,
                    path, min(DEPTH, SWEEPS - sweep),
                )  # fmt: skip
                if largest < goal:
                    break
            d = b0 - old0
            for i in range(n):
                eta[i] += d
            for k in range(na):
                j = active[k]
                d = beta[j] - old[j]
                if d != 0.0:
                    for i in range(n):
                        eta[i] += d * Z[j, i]
        intercepts[b, 0] = b0
        violation[b] = worst / unit


@fast_inner
def ridge_newton(family, survival, Z, members, m, y, weight, penalty, coef, tol, steps):
    """Minimise mean loss + penalty/2 * sum of squares over a few columns.

    Z: (features, n) standardised; members[:m]: the rows of Z in the model.
    coef: intercept first (0 for Cox), warm start; returns the largest |gradient|.
    """
    n = y.shape[0]
    free = 1 if survival is None else 0
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
        value = loss_terms(family, survival, y, weight, eta, n, r, h)
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
        curves(family, survival, weight, h, n, Z, members, m, HZ, diagonal)
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
    family, survival, Z, members, sizes, y, weight, penalties, start, steps, tol, coefs
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
                family, survival, Z, members[s], m, y, weight, penalties[k], coef, tol,
                steps,
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
