"""Kernels for the multinomial family: a feature enters for all classes together.

The penalty of a feature is the Euclidean norm of its coefficients over the classes. The
solve is prox-Newton with the exact curvature diag(p) - p p', block coordinate descent
inside. Plain functions on arrays, float64, fixed order.

Symbols: K classes, n rows, m working features; p chances (K, n); D change of the linear
predictors since the Newton step began (K, n); q residual of the quadratic model (K, n).
"""

import math

import numpy as np

from panelkit.fits.kernel_algebra import (
    DEPTH,
    cholesky_solve,
    combine,
    door,
    fast_door,
    fast_inner,
)

SWEEPS = 1000  # of one Newton step at most
POWER_STEPS = 6
SAFETY = 1.02  # a power iteration stays below the largest eigenvalue


@fast_door
def multinomial_terms(y, weight, eta, n, r, p):
    """Return the weighted mean loss; write weighted residuals r and chances p."""
    n_classes = eta.shape[0]
    loss = 0.0
    for i in range(n):
        top = eta[0, i]
        for k in range(1, n_classes):
            top = max(top, eta[k, i])
        total = 0.0
        for k in range(n_classes):
            e = math.exp(eta[k, i] - top)
            p[k, i] = e
            total += e
        own = int(y[i])
        loss += weight[i] * (math.log(total) + top - eta[own, i])
        for k in range(n_classes):
            p[k, i] /= total
            r[k, i] = -weight[i] * p[k, i]
        r[own, i] += weight[i]
    return loss


@fast_inner
def curvature_bound(z, p, weight, n):
    """Return an upper bound of the largest curvature of one feature's block."""
    n_classes = p.shape[0]
    V = np.empty((n_classes, n_classes))
    for a in range(n_classes):
        for b in range(a + 1):
            s = 0.0
            for i in range(n):
                s += weight[i] * z[i] * z[i] * p[a, i] * p[b, i]
            V[a, b] = -s
            V[b, a] = -s
        s = 0.0
        for i in range(n):
            s += weight[i] * z[i] * z[i] * p[a, i]
        V[a, a] += s
    widest = 0.0
    x = np.empty(n_classes)
    new = np.empty(n_classes)
    for a in range(n_classes):
        if V[a, a] >= widest:
            widest = V[a, a]
            for b in range(n_classes):
                x[b] = V[a, b]  # never orthogonal to the leading direction
    length = 0.0
    for _step in range(POWER_STEPS):
        norm = 0.0
        for a in range(n_classes):
            norm += x[a] * x[a]
        norm = math.sqrt(norm)
        if norm <= 1e-300:
            break
        length = 0.0
        for a in range(n_classes):
            new[a] = 0.0
            for b in range(n_classes):
                new[a] += V[a, b] * x[b] / norm
            length += new[a] * new[a]
        length = math.sqrt(length)
        for a in range(n_classes):
            x[a] = new[a]
    return max(SAFETY * length, widest, 1e-12)


@fast_inner
def move(z, change, p, weight, n, D, q):
    """Add change[k] * z to the predictors; keep q = r - w (p D - p (p'D))."""
    n_classes = p.shape[0]
    for i in range(n):
        s = 0.0
        for k in range(n_classes):
            s += p[k, i] * change[k]
        for k in range(n_classes):
            D[k, i] += change[k] * z[i]
            q[k, i] -= weight[i] * z[i] * p[k, i] * (change[k] - s)


@fast_inner
def model_value(r, p, weight, n, D):
    """Return the quadratic model of the loss at the change D."""
    n_classes = p.shape[0]
    value = 0.0
    for i in range(n):
        s = 0.0
        square = 0.0
        slope = 0.0
        for k in range(n_classes):
            s += p[k, i] * D[k, i]
            square += p[k, i] * D[k, i] * D[k, i]
            slope += r[k, i] * D[k, i]
        value += 0.5 * weight[i] * (square - s * s) - slope
    return value


@fast_inner
def norm_of(beta, j):
    """Return the Euclidean norm of a feature's coefficients."""
    s = 0.0
    for k in range(beta.shape[0]):
        s += beta[k, j] * beta[k, j]
    return math.sqrt(s)


@fast_inner
def extrapolate(
    path, c, na, active, Z, n, r, p, weight, l1, l2, beta, b0, old, old0, D, q, trial,
    trial_beta,
):  # fmt: skip
    """Take an Anderson step over the stored sweeps where it lowers the model.

    c: the step's weights.
    """
    n_classes = p.shape[0]
    before = model_value(r, p, weight, n, D)
    after = 0.0
    for k in range(n_classes):
        for i in range(n):
            trial[k, i] = 0.0
    for a in range(na + 1):
        for k in range(n_classes):
            x = 0.0
            for b in range(DEPTH - 1):
                x += c[b] * path[b + 1, a * n_classes + k]
            trial_beta[k, a] = x
    for a in range(na):
        j = active[a]
        own = norm_of(beta, j)
        if own == 0.0:
            for k in range(n_classes):
                trial_beta[k, a] = 0.0
        before += l1[j] * own + 0.5 * l2[j] * own * own
        own = norm_of(trial_beta, a)
        after += l1[j] * own + 0.5 * l2[j] * own * own
        for k in range(n_classes):
            d = trial_beta[k, a] - old[k, j]
            if d != 0.0:
                for i in range(n):
                    trial[k, i] += d * Z[j, i]
    for k in range(n_classes):
        d = trial_beta[k, na] - old0[k]
        for i in range(n):
            trial[k, i] += d
    after += model_value(r, p, weight, n, trial)
    if not after < before:
        return
    for k in range(n_classes):
        for a in range(na):
            beta[k, active[a]] = trial_beta[k, a]
        b0[k] = trial_beta[k, na]
    for i in range(n):
        s = 0.0
        for k in range(n_classes):
            s += p[k, i] * trial[k, i]
        for k in range(n_classes):
            D[k, i] = trial[k, i]
            q[k, i] = r[k, i] - weight[i] * p[k, i] * (trial[k, i] - s)


@fast_inner
def descend(
    Z, n, na, active, p, weight, curvature, ones, bound0, l1, l2, beta, b0, D, q, goal,
    path, sweeps, change, v,
):  # fmt: skip
    """Return the largest move of the last of some sweeps of block descent."""
    n_classes = p.shape[0]
    largest = 0.0
    for sweep in range(sweeps):
        for a in range(na):
            for k in range(n_classes):
                path[sweep, a * n_classes + k] = beta[k, active[a]]
        for k in range(n_classes):
            path[sweep, na * n_classes + k] = b0[k]
        largest = 0.0
        for k in range(n_classes):
            s = 0.0
            for i in range(n):
                s += q[k, i]
            change[k] = s / bound0
            b0[k] += change[k]
            largest = max(largest, abs(s))
        move(ones, change, p, weight, n, D, q)
        for a in range(na):
            j = active[a]
            size = 0.0
            for k in range(n_classes):
                s = 0.0
                for i in range(n):
                    s += q[k, i] * Z[j, i]
                v[k] = s + curvature[a] * beta[k, j]
                size += v[k] * v[k]
            size = math.sqrt(size)
            shrink = 0.0
            if size > l1[j]:
                shrink = (1.0 - l1[j] / size) / (curvature[a] + l2[j])
            moved = 0.0
            for k in range(n_classes):
                change[k] = shrink * v[k] - beta[k, j]
                beta[k, j] += change[k]
                moved += change[k] * change[k]
            if moved > 0.0:
                move(Z[j], change, p, weight, n, D, q)
                largest = max(largest, (curvature[a] + l2[j]) * math.sqrt(moved))
        if largest < goal:
            break
    return largest


@fast_inner
def optimality(Z, m, n, r, l1, l2, beta, grad, active):
    """Return (largest KKT violation, active features); write grad and active."""
    n_classes = r.shape[0]
    worst = 0.0
    for k in range(n_classes):
        s = 0.0
        for i in range(n):
            s += r[k, i]
        worst = max(worst, abs(s))
    na = np.int64(0)
    for j in range(m):
        own = norm_of(beta, j)
        size = 0.0
        off = 0.0
        for k in range(n_classes):
            g = 0.0
            for i in range(n):
                g += r[k, i] * Z[j, i]
            size += g * g
            if own > 0.0:
                d = g - l2[j] * beta[k, j] - l1[j] * beta[k, j] / own
                off += d * d
        grad[j] = math.sqrt(size)
        e = math.sqrt(off) if own > 0.0 else grad[j] - l1[j]
        worst = max(worst, e)
        if own > 0.0 or e > 0.0:
            active[na] = j
            na += 1
    return worst, na


@fast_door
def solve_chunk(
    chunk, penalty, mixing, tol, steps, columns, working, n_rows, y, weight, pull,
    betas, intercepts, etas, residuals, grads, violation, tables, classes, coefs,
    places, active, path, ones,
):  # fmt: skip
    """Solve the refits of a chunk, each at its own penalty: prox-Newton descent.

    pull: feature weights of the working sets. Warm start from betas, intercepts, etas;
    leaves residuals and grads (|gradient| of the loss) at the solution, and the
    largest KKT violation relative to the penalty. Work space: tables (5, K, n), classes
    (3, K), coefs (2, K, m + 1), places (3, m), active (m), path (DEPTH, (m + 1) K);
    ones (n).
    """
    n_classes = etas.shape[1]
    p, q, D, old_eta = tables[0], tables[1], tables[2], tables[3]
    old0, old = classes[0], coefs[0]
    curvature, l1, l2 = places[0], places[1], places[2]
    c = np.empty(DEPTH - 1)
    for t in range(chunk.shape[0]):
        f = chunk[t]
        Z, m, n = columns[f], working[f], n_rows[f]
        beta, b0, eta, r, w = betas[f], intercepts[f], etas[f], residuals[f], weight[f]
        unit = penalty[f] * mixing
        for j in range(m):
            l1[j] = penalty[f] * mixing * pull[f, j]
            l2[j] = penalty[f] * (1.0 - mixing) * pull[f, j]
        for k in range(n_classes):
            old0[k] = b0[k]
            for j in range(m):
                old[k, j] = beta[k, j]
            for i in range(n):
                old_eta[k, i] = eta[k, i]
        best = np.inf
        worst = 0.0
        halved = 0
        for _newton in range(steps):
            value = multinomial_terms(y[f], w, eta, n, r, p)
            for j in range(m):
                own = norm_of(beta, j)
                value += l1[j] * own + 0.5 * l2[j] * own * own
            if not value <= best + 1e-10 * abs(best) and halved < 30:
                for k in range(n_classes):  # the model was too bold: half the step
                    b0[k] = old0[k] + 0.5 * (b0[k] - old0[k])
                    for j in range(m):
                        beta[k, j] = old[k, j] + 0.5 * (beta[k, j] - old[k, j])
                    for i in range(n):
                        eta[k, i] = old_eta[k, i] + 0.5 * (eta[k, i] - old_eta[k, i])
                halved += 1
                continue
            best = value
            halved = 0
            worst, na = optimality(Z, m, n, r, l1, l2, beta, grads[f], active)
            if worst <= tol * unit:
                break
            for a in range(na):
                curvature[a] = curvature_bound(Z[active[a]], p, w, n)
            bound0 = curvature_bound(ones, p, w, n)
            for k in range(n_classes):
                old0[k] = b0[k]
                for j in range(m):
                    old[k, j] = beta[k, j]
                for i in range(n):
                    old_eta[k, i] = eta[k, i]
                    q[k, i] = r[k, i]
                    D[k, i] = 0.0
            goal = max(0.1 * worst, 0.3 * tol * unit)
            for sweep in range(0, SWEEPS, DEPTH):
                if sweep > 0 and combine(path, (na + 1) * n_classes, c):
                    extrapolate(
                        path, c, na, active, Z, n, r, p, w, l1, l2, beta, b0, old,
                        old0, D, q, tables[4], coefs[1],
                    )  # fmt: skip
                largest = descend(
                    Z, n, na, active, p, w, curvature, ones, bound0, l1, l2, beta, b0,
                    D, q, goal, path, min(DEPTH, SWEEPS - sweep), classes[1],
                    classes[2],
                )  # fmt: skip
                if largest < goal:
                    break
            for k in range(n_classes):
                for i in range(n):
                    eta[k, i] += D[k, i]
        violation[f] = worst / unit


@fast_inner
def ridge_newton(Z, members, m, y, weight, penalty, coef, tol, steps):
    """Minimise mean multinomial loss + penalty/2 * sum of squares over a few columns.

    coef: (K, 1 + m), intercepts first, warm start; intercepts sum to 0.
    Returns the largest |gradient| reached.
    """
    n_classes = coef.shape[0]
    n = y.shape[0]
    width = m + 1
    size = n_classes * width
    eta = np.empty((n_classes, n))
    r = np.empty((n_classes, n))
    p = np.empty((n_classes, n))
    x = np.ones((width, n))
    for a in range(m):
        for i in range(n):
            x[a + 1, i] = Z[members[a], i]
    A = np.empty((size, size))
    g = np.empty(size)
    old = coef.copy()
    best = np.inf
    worst = np.inf
    halved = 0
    for _step in range(steps):
        value = 0.0
        level = 0.0
        for k in range(n_classes):
            level += coef[k, 0]
            for i in range(n):
                eta[k, i] = 0.0
            for a in range(width):
                c = coef[k, a]
                if a > 0:
                    value += 0.5 * penalty * c * c
                for i in range(n):
                    eta[k, i] += c * x[a, i]
        value += 0.5 * level * level  # no model changes with the level: hold it at 0
        value += multinomial_terms(y, weight, eta, n, r, p)
        if not value <= best + 1e-12 * abs(best) and halved < 30:
            for k in range(n_classes):
                for a in range(width):
                    coef[k, a] = old[k, a] + 0.5 * (coef[k, a] - old[k, a])
            halved += 1
            continue
        best = value
        halved = 0
        worst = 0.0
        for k in range(n_classes):
            for a in range(width):
                s = -level if a == 0 else -penalty * coef[k, a]
                for i in range(n):
                    s += r[k, i] * x[a, i]
                g[k * width + a] = s
                worst = max(worst, abs(s))
        if worst <= tol:
            break
        for k in range(n_classes):
            for c in range(k + 1):
                for a in range(width):
                    for b in range(width):
                        s = 0.0
                        for i in range(n):
                            s += weight[i] * p[k, i] * p[c, i] * x[a, i] * x[b, i]
                        s = -s
                        if k == c:
                            for i in range(n):
                                s += weight[i] * p[k, i] * x[a, i] * x[b, i]
                            if a == b and a > 0:
                                s += penalty
                        if a == 0 and b == 0:
                            s += 1.0
                        A[k * width + a, c * width + b] = s
        if not cholesky_solve(A, g, size):
            break
        for k in range(n_classes):
            for a in range(width):
                old[k, a] = coef[k, a]
                coef[k, a] += g[k * width + a]
    return worst


@door
def ridge_panels(Z, members, sizes, y, weight, penalties, steps, tol, coefs):
    """Fit every panel at every penalty, warm along the penalties.

    coefs: (panels, penalties, K, 1 + largest size), written; returns the worst
    gradient.
    """
    n_classes = coefs.shape[2]
    worst = 0.0
    for s in range(sizes.shape[0]):
        m = sizes[s]
        coef = np.zeros((n_classes, m + 1))
        for k in range(penalties.shape[0]):
            left = ridge_newton(
                Z, members[s], m, y, weight, penalties[k], coef, tol, steps
            )
            worst = max(worst, left)
            for c in range(n_classes):
                for a in range(m + 1):
                    coefs[s, k, c, a] = coef[c, a]
    return worst


@door
def predict_panels(Z, members, sizes, coefs, eta):
    """Write linear predictors (panels, penalties, K, n), summed in marker order."""
    for s in range(sizes.shape[0]):
        for k in range(coefs.shape[1]):
            for c in range(coefs.shape[2]):
                for i in range(Z.shape[1]):
                    total = coefs[s, k, c, 0]
                    for a in range(sizes[s]):
                        total += coefs[s, k, c, a + 1] * Z[members[s, a], i]
                    eta[s, k, c, i] = total
