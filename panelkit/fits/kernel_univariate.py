"""Kernel of the univariate ranking: one feature at a time.

Plain function on arrays, float64, fixed order, lock released.
"""

import math

import numpy as np

from panelkit.fits.kernel_algebra import door


@door
def welch(
    base, fill, left, right, included, rows, y, weight, unit, unit_weight, n_units,
    means, variances, t,
):  # fmt: skip
    """Write class means, variances of subject means, and Welch's t of every feature.

    rows: samples; y: their class; unit: a number for each subject and class,
    unit_weight its share of the class; n_units: subjects a class. means, variances:
    (features, 2). t is 0 where undefined.
    """
    n = rows.shape[0]
    share = np.zeros(2)
    for i in range(n):
        share[int(y[i])] += weight[i]
    kind = np.zeros(unit_weight.shape[0], np.int64)
    for i in range(n):
        kind[unit[i]] = int(y[i])
    total = np.empty(unit_weight.shape[0])
    m = np.empty(2)
    v = np.empty(2)
    for j in range(base.shape[0]):
        t[j] = 0.0
        if not included[j]:
            continue
        total[:] = 0.0
        for i in range(n):
            x = np.float64(base[j, rows[i]])
            if x != x:
                x = fill[j]
            else:
                for q in range(left.shape[1]):
                    x += left[j, q] * right[q, rows[i]]
            total[unit[i]] += weight[i] * x / share[int(y[i])]
        m[:] = 0.0
        v[:] = 0.0
        for u in range(total.shape[0]):
            m[kind[u]] += total[u]
        for u in range(total.shape[0]):
            d = total[u] - unit_weight[u] * m[kind[u]]
            v[kind[u]] += d * d
        for c in range(2):
            means[j, c] = m[c]
            variances[j, c] = v[c] * n_units[c] * n_units[c] / (n_units[c] - 1.0)
        e = variances[j, 0] / n_units[0] + variances[j, 1] / n_units[1]
        if e > max(1e-24 * m[0] * m[0], 1e-290):
            t[j] = (m[1] - m[0]) / math.sqrt(e)
