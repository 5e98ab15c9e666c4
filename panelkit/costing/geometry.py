"""Pools, runs and positions: how a panel lies on a platform.

Formula numbers F4 to F9 are those of the panelkit cost model.
"""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

from panelkit.config import PlatformSection
from panelkit.costing.packing import fewest_pools
from panelkit.errors import NoPanelError, StudyFileError, UsageError
from panelkit.records import NO_CONFLICTS, AssayPrice, Conflicts

__all__ = ["Layout", "Pool", "PoolPlan", "ceil_ratio", "find_layouts", "plan_pools"]


def ceil_ratio(numerator: int, denominator: int) -> int:
    """Return the smallest whole number not below a ratio of whole numbers.

    Parameters
    ----------
    numerator, denominator : int
        The ratio; the denominator is above 0.

    Returns
    -------
    int
        Exact, where a quotient of floats can end one too high.
    """
    return -(-numerator // denominator)


@dataclass(frozen=True, slots=True)
class Pool:
    """Assays read together in one reaction.

    Attributes
    ----------
    assays : tuple of AssayPrice
        In file order, markers before references; without pool-scope references.
    slots : int
        Slots occupied, pool-scope references included.
    """

    assays: tuple[AssayPrice, ...]
    slots: int


@dataclass(frozen=True, slots=True)
class PoolPlan:
    """All pools of one sample.

    Attributes
    ----------
    pools : tuple of Pool
        In the order in which they were opened.
    everywhere : tuple of AssayPrice
        References that are in every pool.
    """

    pools: tuple[Pool, ...]
    everywhere: tuple[AssayPrice, ...]


@dataclass(frozen=True, slots=True)
class Layout:
    """The pools of one sample spread over runs, and the runs this takes.

    Attributes
    ----------
    groups : tuple of tuple of Pool
        The pools in each run of a sample.
    samples_per_run, runs : tuple of int
        For each group: samples that fit in a run, and runs over the programme.
    positions_per_run : int
        Usable positions of one run.
    filled, controls : int
        Positions used over the programme; controls are part of the first.
    """

    groups: tuple[tuple[Pool, ...], ...]
    samples_per_run: tuple[int, ...]
    runs: tuple[int, ...]
    positions_per_run: int
    filled: int
    controls: int

    @property
    def sizes(self) -> tuple[int, ...]:
        """Pools in each group."""
        return tuple(len(group) for group in self.groups)


def plan_pools(
    platform: PlatformSection,
    markers: Sequence[AssayPrice],
    references: Sequence[AssayPrice],
    conflicts: Conflicts = NO_CONFLICTS,
) -> PoolPlan:
    """Return the fewest pools that hold the assays of a panel (F4).

    Assays are taken in file order, markers before references; each goes to the
    open pool of its class, and a full pool is followed by a new one. With one slot
    size within a class no other filling needs fewer pools; mixed sizes, channels and
    conflicts are packed by an integer programme.

    Parameters
    ----------
    platform : PlatformSection
        Gives plex and the scope of references.
    markers, references : sequence of AssayPrice
        In file order.
    conflicts : Conflicts
        Pairs that cannot share a pool.

    Returns
    -------
    PoolPlan
        At least one pool.

    Raises
    ------
    StudyFileError
        If the references leave no room in a pool.
    UsageError
        If an assay exceeds the room, or its channel is taken in every pool.
    NoPanelError
        If the fewest pools are not proved in time.
    """
    everywhere = tuple(references) if platform.refs_scope == "pool" else ()
    taken = sum(assay.slots for assay in everywhere)
    room = platform.plex - taken
    if room < 1:
        raise StudyFileError(
            code="no-room-in-pool",
            where="platform, key 'plex'",
            what=f"references fill {taken} of the slots of every pool "
            f"(got plex {platform.plex})",
            accepted="a plex above the slots of the references in a pool",
            next_step="Raise plex, or take references once for the panel",
        )
    placed = list(markers) + ([] if everywhere else list(references))
    _check_slots(placed, everywhere, room)
    kept_apart = conflicts.among((assay.marker for assay in placed), "pool")
    packed = None if kept_apart else _in_order(placed, room)
    if packed is None:
        packed = _packed(placed, room, conflicts)
    return PoolPlan(
        tuple(
            Pool(tuple(pool), taken + sum(assay.slots for assay in pool))
            for pool in packed
        ),
        everywhere,
    )


def _in_order(assays: Sequence[AssayPrice], room: int) -> list[list[AssayPrice]] | None:
    """Return pools filled in file order, or None where that may not be best.

    With one slot size in a class, no channels and no conflicts it is.
    """
    pools: list[list[AssayPrice]] = []
    open_pools: dict[str, list[AssayPrice]] = {}
    for assay in assays:
        pool = open_pools.get(assay.pool_class)
        if assay.channel or (pool and pool[0].slots != assay.slots):
            return None
        if pool is None or (len(pool) + 1) * assay.slots > room:
            pool = open_pools[assay.pool_class] = []
            pools.append(pool)
        pool.append(assay)
    return pools


def _packed(
    assays: Sequence[AssayPrice], room: int, conflicts: Conflicts
) -> list[list[AssayPrice]]:
    """Return the fewest pools of each class, by the first assay of each pool."""
    place = {assay.marker: i for i, assay in enumerate(assays)}
    classes: dict[str, list[AssayPrice]] = {}
    for assay in assays:
        classes.setdefault(assay.pool_class, []).append(assay)
    pools = [
        pool for own in classes.values() for pool in fewest_pools(own, room, conflicts)
    ]
    return sorted(pools, key=lambda pool: place[pool[0].marker])


def _check_slots(
    assays: Iterable[AssayPrice], everywhere: Iterable[AssayPrice], room: int
) -> None:
    channels = {assay.channel: assay.marker for assay in everywhere if assay.channel}
    for assay in assays:
        if assay.slots > room:
            raise UsageError(
                code="assay-exceeds-pool",
                where=f"assay '{assay.marker}', column 'slots'",
                what=f"the assay does not fit in a pool (got {assay.slots} slots)",
                accepted=f"at most the {room} slots that a pool offers",
                next_step="Raise plex or leave the assay out",
            )
        if assay.channel in channels:
            raise UsageError(
                code="channel-taken",
                where=f"assay '{assay.marker}', column 'channel'",
                what=f"the reference {channels[assay.channel]} is in every pool on "
                f"the same channel (got {assay.channel!r})",
                accepted="another channel than that of references in every pool",
                next_step="Move the assay or the reference to another channel",
            )


def find_layouts(
    platform: PlatformSection, plan: PoolPlan, samples_run: int, deliveries: int
) -> list[Layout]:
    """Return the layouts among which the platform lets the price decide (F5 to F8).

    Parameters
    ----------
    platform : PlatformSection
        Gives positions, controls, replicates, budget and groups.
    plan : PoolPlan
        The pools of one sample.
    samples_run : int
        Samples run, repeats included.
    deliveries : int
        Occasions on which they arrive.

    Returns
    -------
    list of Layout
        By rising number of groups; one entry unless groups is ``"auto"``.

    Raises
    ------
    StudyFileError
        If controls leave no room for a sample, or there are more groups than pools.
    NoPanelError
        If a sample of this panel does not fit.
    """
    n_pools = len(plan.pools)
    needed = platform.replicates * n_pools
    if 0 < platform.max_positions_per_sample < needed:
        raise NoPanelError(
            code="sample-volume-exceeded",
            where="platform, key 'max_positions_per_sample'",
            what=f"the panel needs {needed} positions of each sample "
            f"(got a limit of {platform.max_positions_per_sample})",
            accepted="panels whose pools and replicates stay within the limit",
            next_step="Take fewer markers, replicates or pools",
        )
    width = _positions_per_run(platform, plan.pools)
    if _samples_per_run(platform, width, 1) < 1:
        _refuse_capacity(platform, width)
    layouts = []
    for n_groups in _group_numbers(platform, n_pools):
        sizes = _split(n_pools, n_groups)
        if _samples_per_run(platform, width, sizes[0]) >= 1:
            groups = _spread(plan.pools, sizes)
            layouts.append(_layout(platform, groups, width, samples_run, deliveries))
    if not layouts:
        raise NoPanelError(
            code="sample-exceeds-run",
            where="platform, key 'groups'",
            what=f"a sample of {n_pools} pools does not fit on its runs "
            f"(got groups {platform.groups!r})",
            accepted=f"a spread that fits in {width} positions with its controls",
            next_step='Set groups = "auto" or spread the pools over more runs',
        )
    return layouts


def _refuse_capacity(platform: PlatformSection, width: int) -> None:
    if width < platform.positions:
        raise NoPanelError(
            code="run-budget-exceeded",
            where="platform, key 'run_budget'",
            what=f"the fullest pool leaves {width} usable positions in a run, "
            "fewer than one sample with its controls needs "
            f"(got run_budget {platform.run_budget})",
            accepted="panels whose pools stay within the run budget",
            next_step="Take fewer markers or a lower plex",
        )
    raise StudyFileError(
        code="controls-leave-no-room",
        where="platform, key 'positions'",
        what="controls and replicates of one pool exceed a run "
        f"(got {platform.positions} positions)",
        accepted="room for at least one sample of one pool beside the controls",
        next_step="Raise positions, or lower replicates or controls",
    )


def _group_numbers(platform: PlatformSection, n_pools: int) -> Sequence[int]:
    if platform.groups == "auto":
        return range(1, n_pools + 1)
    if platform.groups == "each":
        return (n_pools,)
    # A small panel cannot be spread over more runs than it has pools.
    return (min(platform.groups, n_pools),)


def _positions_per_run(platform: PlatformSection, pools: Iterable[Pool]) -> int:
    width = platform.positions
    if platform.run_budget > 0:
        fullest = max(pool.slots for pool in pools)
        each, each_parts = platform.slot_budget.as_integer_ratio()
        budget, budget_parts = platform.run_budget.as_integer_ratio()
        width = min(width, budget * each_parts // (budget_parts * each * fullest))
    return width


def _samples_per_run(platform: PlatformSection, width: int, n_pools: int) -> int:
    controls = platform.controls_per_run + platform.controls_per_pool * n_pools
    return (width - controls) // (platform.replicates * n_pools)


def _split(n_things: int, n_parts: int) -> tuple[int, ...]:
    """Return part sizes that differ by at most one, larger first."""
    size, larger = divmod(n_things, n_parts)
    return (size + 1,) * larger + (size,) * (n_parts - larger)


def _spread(
    pools: Sequence[Pool], sizes: Sequence[int]
) -> tuple[tuple[Pool, ...], ...]:
    groups = []
    start = 0
    for size in sizes:
        groups.append(tuple(pools[start : start + size]))
        start += size
    return tuple(groups)


def _layout(
    platform: PlatformSection,
    groups: tuple[tuple[Pool, ...], ...],
    width: int,
    samples_run: int,
    deliveries: int,
) -> Layout:
    size, larger = divmod(samples_run, deliveries)
    capacities = []
    runs = []
    controls = 0
    for group in groups:
        capacity = _samples_per_run(platform, width, len(group))
        # Deliveries differ by at most one sample, so two sizes stand for all (F3).
        n_runs = larger * ceil_ratio(size + 1, capacity)
        n_runs += (deliveries - larger) * ceil_ratio(size, capacity)
        capacities.append(capacity)
        runs.append(n_runs)
        controls += n_runs * (
            platform.controls_per_run + platform.controls_per_pool * len(group)
        )
    n_pools = sum(len(group) for group in groups)
    return Layout(
        groups=groups,
        samples_per_run=tuple(capacities),
        runs=tuple(runs),
        positions_per_run=width,
        filled=platform.replicates * n_pools * samples_run + controls,
        controls=controls,
    )
