"""What the kernel files share: decorators, sums in fixed order, small solves.

The one file that kernel files may import. Plain functions on arrays, no panelkit
imports, float64, fixed order.
"""

import math
from typing import Any

import numpy as np
from numba import njit

FAST = {"reassoc", "contract", "arcp", "nsz"}  # NaN must stay visible

# Doors are called from Python; inner kernels from kernels alone, so that no wrapper
# has to be compiled for them.
_DOOR: dict[str, Any] = {"nogil": True, "cache": True, "no_cfunc_wrapper": True}
_INNER: dict[str, Any] = {**_DOOR, "no_cpython_wrapper": True}
door = njit(**_DOOR)
fast_door = njit(fastmath=FAST, **_DOOR)
inner = njit(**_INNER)
fast_inner = njit(fastmath=FAST, **_INNER)

DEPTH = 6  # sweeps kept for one extrapolation


@fast_inner
def dot(a, b, n):
    """Return the sum of a[i] * b[i], i < n, in one fixed order."""
    s = 0.0
    for i in range(n):
        s += a[i] * b[i]
    return s


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
