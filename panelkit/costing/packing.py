"""Which assays share a pool: fewest pools under slots, channels and conflicts.

First fit in file order is tried first; where it needs more pools than a lower bound,
an integer programme decides (the panelkit cost model, section 3a).
"""

from collections import Counter
from collections.abc import Sequence
from itertools import combinations

import numpy as np
from scipy.optimize import Bounds, LinearConstraint, milp
from scipy.sparse import coo_array

from panelkit.config import PRICING
from panelkit.errors import NoPanelError
from panelkit.records import AssayPrice, Conflicts

__all__ = ["fewest_pools"]


def fewest_pools(
    assays: Sequence[AssayPrice],
    room: int,
    conflicts: Conflicts,
    *,
    time_limit_s: float = PRICING.time_limit_s,
) -> list[list[AssayPrice]]:
    """Return the assays of one class in as few pools as possible.

    Parameters
    ----------
    assays : sequence of AssayPrice
        Of one class, in file order, each with at most `room` slots.
    room : int
        Slots of a pool.
    conflicts : Conflicts
        Pairs that cannot share a pool; assays of one channel cannot either.
    time_limit_s : float
        For the integer programme.

    Returns
    -------
    list of list of AssayPrice
        The pools by their first assay; each in file order.

    Raises
    ------
    NoPanelError
        The fewest pools are not proved within the time limit.
    """
    apart = _apart(assays, conflicts)
    first_fit = _first_fit(assays, room, apart, range(len(assays)))
    least = _lower_bound(assays, room, apart)
    if len(first_fit) > least:
        by_size = sorted(range(len(assays)), key=lambda i: -assays[i].slots)
        by_degree = sorted(
            range(len(assays)), key=lambda i: (-len(apart[i]), -assays[i].slots)
        )
        for order in (by_size, by_degree):
            other = _first_fit(assays, room, apart, order)
            if len(other) < len(first_fit):
                first_fit = other
    if len(first_fit) > least:
        first_fit = _exact(assays, room, apart, (least, len(first_fit)), time_limit_s)
    pools = sorted(sorted(pool) for pool in first_fit)
    return [[assays[i] for i in pool] for pool in pools]


def _apart(assays: Sequence[AssayPrice], conflicts: Conflicts) -> list[set[int]]:
    """Return, for each assay, those that cannot share its pool."""
    place = {assay.marker: i for i, assay in enumerate(assays)}
    apart: list[set[int]] = [set() for _ in assays]
    pairs = {(place[a], place[b]) for a, b in conflicts.among(list(place), "pool")} | {
        (i, j)
        for i, j in combinations(range(len(assays)), 2)
        if assays[i].channel and assays[i].channel == assays[j].channel
    }
    for i, j in pairs:
        apart[i].add(j)
        apart[j].add(i)
    return apart


def _first_fit(
    assays: Sequence[AssayPrice],
    room: int,
    apart: Sequence[set[int]],
    order: Sequence[int],
) -> list[list[int]]:
    pools: list[list[int]] = []
    taken: list[int] = []
    for i in order:
        for k, pool in enumerate(pools):
            if taken[k] + assays[i].slots <= room and not apart[i] & set(pool):
                pool.append(i)
                taken[k] += assays[i].slots
                break
        else:
            pools.append([i])
            taken.append(assays[i].slots)
    return pools


def _lower_bound(
    assays: Sequence[AssayPrice], room: int, apart: Sequence[set[int]]
) -> int:
    """Return what no packing can undercut: volume, large items, one channel, a clique.

    Of items larger than half a pool, each needs its own.
    """
    sizes = [assay.slots for assay in assays]
    channels = Counter(assay.channel for assay in assays if assay.channel)
    # items of one size fill a pool with whole items only
    whole = {size: -(-n // (room // size)) for size, n in Counter(sizes).items()}
    clique: set[int] = set()
    for i in sorted(range(len(assays)), key=lambda i: -len(apart[i])):
        if clique <= apart[i]:
            clique.add(i)
    return max(
        -(-sum(sizes) // room),
        sum(2 * size > room for size in sizes),
        max(channels.values(), default=1),
        len(clique),
        max(whole.values()) if len(whole) == 1 else 1,
    )


def _exact(
    assays: Sequence[AssayPrice],
    room: int,
    apart: Sequence[set[int]],
    between: tuple[int, int],
    time_limit_s: float,
) -> list[list[int]]:
    """Return the smallest feasible packing, by trying one more pool at a time."""
    least, known = between
    for n_pools in range(least, known + 1):
        status, pools = _packing(assays, room, apart, n_pools, time_limit_s)
        if status == "found":
            return pools
        if status == "unknown":
            raise NoPanelError(
                code="pools-not-proved",
                where=f"assays of class '{assays[0].pool_class}'",
                what=f"whether {n_pools} pools hold {len(assays)} assays was not "
                f"decided in {time_limit_s:g} s (got {known} as the best known)",
                accepted="conflicts that leave the packing to be solved",
                next_step="Split the assays into classes, or take fewer of them",
            )
    return []  # not reached: `known` pools are feasible


def _packing(
    assays: Sequence[AssayPrice],
    room: int,
    apart: Sequence[set[int]],
    n_pools: int,
    time_limit_s: float,
) -> tuple[str, list[list[int]]]:
    n = len(assays)
    upper = np.ones(n * n_pools)
    for i in range(n):
        upper[i * n_pools + i + 1 : (i + 1) * n_pools] = 0.0  # symmetric packings
    rows: list[tuple[list[int], list[float], float, float]] = [
        ([i * n_pools + p for p in range(n_pools)], [1.0] * n_pools, 1.0, 1.0)
        for i in range(n)
    ]
    for p in range(n_pools):
        rows.append(
            (
                [i * n_pools + p for i in range(n)],
                [float(assay.slots) for assay in assays],
                0.0,
                float(room),
            )
        )
        rows += [
            ([i * n_pools + p, j * n_pools + p], [1.0, 1.0], 0.0, 1.0)
            for i in range(n)
            for j in apart[i]
            if i < j
        ]
    answer = milp(
        np.zeros(n * n_pools),
        integrality=np.ones(n * n_pools, dtype=np.int64),
        bounds=Bounds(0.0, upper),
        constraints=_constraint(rows, n * n_pools),
        options={"time_limit": time_limit_s, "mip_rel_gap": 0.0},
    )
    if answer.x is not None:
        chosen = answer.x.reshape(n, n_pools) > 0.5
        pools = [np.flatnonzero(chosen[:, p]).tolist() for p in range(n_pools)]
        if _holds(assays, room, apart, pools):
            return "found", [pool for pool in pools if pool]
    return ("none" if answer.status == 2 else "unknown"), []


def _holds(
    assays: Sequence[AssayPrice],
    room: int,
    apart: Sequence[set[int]],
    pools: Sequence[Sequence[int]],
) -> bool:
    """Check a packing in whole numbers: the solver's own are floats."""
    once = sorted(i for pool in pools for i in pool) == list(range(len(assays)))
    return once and all(
        sum(assays[i].slots for i in pool) <= room
        and not any(apart[i] & set(pool) for i in pool)
        for pool in pools
    )


def _constraint(
    rows: Sequence[tuple[list[int], list[float], float, float]], width: int
) -> LinearConstraint:
    heights = np.repeat(np.arange(len(rows)), [len(row[0]) for row in rows])
    columns = np.concatenate([np.asarray(row[0]) for row in rows])
    values = np.concatenate([np.asarray(row[1]) for row in rows])
    matrix = coo_array((values, (heights, columns)), shape=(len(rows), width))
    return LinearConstraint(
        matrix.tocsr(), [row[2] for row in rows], [row[3] for row in rows]
    )
