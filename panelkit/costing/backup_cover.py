"""Panels with a stand-in for every marker: several members of every cluster."""

from collections.abc import Mapping, Sequence
from fractions import Fraction

import numpy as np
from scipy.optimize import Bounds, LinearConstraint, milp

from panelkit.config import PRICING
from panelkit.costing.cover import Amount, exact_amount
from panelkit.errors import NoPanelError

__all__ = ["cheapest_backups"]


def cheapest_backups(
    clusters: Sequence[Sequence[str]],
    costs: Mapping[str, Amount],
    *,
    least: int = 2,
    time_limit_s: float = PRICING.time_limit_s,
) -> tuple[tuple[str, ...], Fraction]:
    """Return the cheapest markers with so many members of every cluster.

    Exact for its own objective, which is linear in the markers' costs; a surrogate for
    a panel that survives the loss of a marker (the panelkit cost model, section 3e).

    Parameters
    ----------
    clusters : sequence of sequence of str
        Markers that can stand in for one another.
    costs : mapping of str to int, Decimal, Fraction or str
        Of every marker.
    least : int
        Members of each cluster.
    time_limit_s : float
        For the integer programme.

    Returns
    -------
    tuple of (tuple of str, Fraction)
        The markers, sorted, and their cost.

    Raises
    ------
    UsageError
        A cost is not exact.
    NoPanelError
        A cluster has too few members, or the optimum is not proved in time.
    """
    names = sorted({name for cluster in clusters for name in cluster})
    exact = [exact_amount(costs[name], f"cost of '{name}'") for name in names]
    short = [cluster for cluster in clusters if len(set(cluster)) < least]
    if short:
        raise NoPanelError(
            code="cluster-too-small",
            where="clusters",
            what=f"{len(short)} clusters have fewer than {least} members "
            f"(got {', '.join(short[0])} as one of them)",
            accepted=f"at least {least} members in each",
            next_step="Accept single points of failure there, or widen the clusters",
        )
    scale = np.lcm.reduce([amount.denominator for amount in exact], dtype=object)
    units = np.array([int(amount * scale) for amount in exact], dtype=float)
    rows = [[float(name in cluster) for name in names] for cluster in clusters]
    answer = milp(
        units,
        integrality=np.ones(len(names), dtype=np.int64),
        bounds=Bounds(0.0, 1.0),
        constraints=LinearConstraint(np.array(rows), float(least), np.inf),
        options={"mip_rel_gap": 0.0, "time_limit": time_limit_s},
    )
    if answer.x is None or answer.status != 0:
        raise NoPanelError(
            code="backups-not-proved",
            where="clusters",
            what=f"the cheapest choice was not proved in {time_limit_s:g} s",
            accepted="fewer or smaller clusters, or more time",
            next_step="Raise the time limit",
        )
    taken = tuple(name for name, x in zip(names, answer.x, strict=True) if x > 0.5)
    chosen = [a for a, x in zip(exact, answer.x, strict=True) if x > 0.5]
    return taken, sum(chosen, Fraction(0))
