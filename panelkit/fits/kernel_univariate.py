"""Kernel of the univariate ranking: one feature at a time.

Plain function on arrays, no panelkit imports; float64, fixed order, lock released.
"""

import math

import numpy as np
from numba import njit


@njit(nogil=True, cache=True)
def welch(
    base, fill, left, right, included, rows, y, weight, n_units, means, variances, t
):
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
            if v != v:
                v = fill[j]
            else:
                for q in range(left.shape[1]):
                    v += left[j, q] * right[q, rows[i]]
            x[i] = v
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
