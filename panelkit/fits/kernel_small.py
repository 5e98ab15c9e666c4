"""Kernels for what is fitted many times on few features, and for one at a time.

Plain functions on arrays, no panelkit imports; float64, fixed order, lock released.
"""

import math

import numpy as np
from numba import njit

FAST = {"reassoc", "contract", "arcp", "nsz"}  # NaN must stay visible


@njit(nogil=True, cache=True, fastmath=FAST)
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


@njit(nogil=True, cache=True, fastmath=FAST)
def logistic_terms(y, weight, eta, n, r, h):
    """Return the weighted mean logistic loss; write r = -gradient and curvature h."""
    loss = 0.0
    for i in range(n):
        e = math.exp(-abs(eta[i]))
        p = 1.0 / (1.0 + e) if eta[i] >= 0.0 else e / (1.0 + e)
        loss += weight[i] * (max(eta[i], 0.0) - y[i] * eta[i] + math.log1p(e))
        r[i] = weight[i] * (y[i] - p)
        h[i] = weight[i] * max(p * (1.0 - p), 1e-10)
    return loss


@njit(nogil=True, cache=True, fastmath=FAST)
def ridge_newton(Z, members, m, y, weight, penalty, coef, eta, tol, steps):
    """Minimise mean logistic loss + penalty/2 * sum of squares, intercept free.

    Z: (features, n) standardised; members[:m]: the rows of Z in the model.
    coef: intercept first, warm start. Returns the largest |gradient| reached.
    """
    n = y.shape[0]
    r = np.empty(n)
    h = np.empty(n)
    hz = np.empty(n)
    A = np.empty((m + 1, m + 1))
    g = np.empty(m + 1)
    old = np.empty(m + 1)
    best = np.inf
    worst = np.inf
    for _step in range(steps):
        halvings = 0
        while True:
            for i in range(n):
                eta[i] = coef[0]
            for a in range(m):
                c = coef[a + 1]
                for i in range(n):
                    eta[i] += c * Z[members[a], i]
            value = logistic_terms(y, weight, eta, n, r, h)
            for a in range(m):
                value += 0.5 * penalty * coef[a + 1] * coef[a + 1]
            if value <= best + 1e-12 * abs(best) or halvings == 30:
                break
            for a in range(m + 1):
                coef[a] = old[a] + 0.5 * (coef[a] - old[a])
            halvings += 1
        best = value
        s = 0.0
        for i in range(n):
            s += r[i]
        g[0] = s
        worst = abs(s)
        for a in range(m):
            s = 0.0
            for i in range(n):
                s += r[i] * Z[members[a], i]
            g[a + 1] = s - penalty * coef[a + 1]
            worst = max(worst, abs(g[a + 1]))
        if worst <= tol:
            break
        s = 0.0
        for i in range(n):
            s += h[i]
        A[0, 0] = s
        for a in range(m):
            s = 0.0
            for i in range(n):
                hz[i] = h[i] * Z[members[a], i]
                s += hz[i]
            A[a + 1, 0] = s
            for b in range(a + 1):
                s = 0.0
                for i in range(n):
                    s += hz[i] * Z[members[b], i]
                A[a + 1, b + 1] = s
            A[a + 1, a + 1] += penalty
        if not cholesky_solve(A, g, m + 1):
            break
        for a in range(m + 1):
            old[a] = coef[a]
            coef[a] += g[a]
    return worst


@njit(nogil=True, cache=True)
def ridge_panels(Z, members, sizes, y, weight, penalties, steps, tol, coefs):
    """Fit every panel at every penalty, warm along the penalties.

    members: (panels, largest size) rows of Z, sizes: (panels,) how many count.
    coefs: (panels, penalties, 1 + largest size), written. Returns the worst gradient.
    """
    n = y.shape[0]
    eta = np.empty(n)
    total = 0.0
    positive = 0.0
    for i in range(n):
        total += weight[i]
        positive += weight[i] * y[i]
    start = math.log(positive / (total - positive))
    worst = 0.0
    for s in range(sizes.shape[0]):
        m = sizes[s]
        coef = np.zeros(m + 1)
        coef[0] = start
        for k in range(penalties.shape[0]):
            left = ridge_newton(
                Z, members[s], m, y, weight, penalties[k], coef, eta, tol, steps
            )
            worst = max(worst, left)
            for a in range(m + 1):
                coefs[s, k, a] = coef[a]
    return worst


@njit(nogil=True, cache=True)
def predict_panels(Z, members, sizes, coefs, eta):
    """Write the linear predictors (panels, penalties, n), summed in marker order."""
    for s in range(sizes.shape[0]):
        for k in range(coefs.shape[1]):
            for i in range(Z.shape[1]):
                total = coefs[s, k, 0]
                for a in range(sizes[s]):
                    total += coefs[s, k, a + 1] * Z[members[s, a], i]
                eta[s, k, i] = total


@njit(nogil=True, cache=True)
def welch(base, fill, included, rows, y, weight, n_units, means, variances, t):
    """Write weighted class means, variances and Welch's t of every included feature.

    rows: samples; y: their class; n_units: independent units (subjects) a class.
    means, variances: (features, 2), class 0 then class 1. t is 0 where undefined.
    """
    n = rows.shape[0]
    share = np.zeros(2)
    for i in range(n):
        share[int(y[i])] += weight[i]
    x = np.empty(n)
    for j in range(base.shape[0]):
        t[j] = 0.0
        if not included[j]:
            continue
        m0 = 0.0
        m1 = 0.0
        for i in range(n):
            v = np.float64(base[j, rows[i]])
            x[i] = fill[j] if v != v else v
            if y[i] > 0.5:
                m1 += weight[i] * x[i]
            else:
                m0 += weight[i] * x[i]
        m0 /= share[0]
        m1 /= share[1]
        v0 = 0.0
        v1 = 0.0
        for i in range(n):
            if y[i] > 0.5:
                v1 += weight[i] * (x[i] - m1) ** 2
            else:
                v0 += weight[i] * (x[i] - m0) ** 2
        v0 *= n_units[0] / (n_units[0] - 1.0) / share[0]
        v1 *= n_units[1] / (n_units[1] - 1.0) / share[1]
        means[j, 0] = m0
        means[j, 1] = m1
        variances[j, 0] = v0
        variances[j, 1] = v1
        e = v0 / n_units[0] + v1 / n_units[1]
        if e > max(1e-24 * m0 * m0, 1e-290):
            t[j] = (m1 - m0) / math.sqrt(e)
