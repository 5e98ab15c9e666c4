"""The cheapest way to cover a set of markers by kits, single assays and pools.

An integer programme, exact (the panelkit cost model, section 3a). Costs are whole
numbers inside; what the solver returns is only read for which options it takes, and
its cost is added up again in whole numbers.
"""

import math
import time
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from decimal import Decimal
from fractions import Fraction
from typing import Final

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import Bounds, LinearConstraint, milp
from scipy.sparse import csr_array, vstack

from panelkit.config import PRICING
from panelkit.costing.greedy_cover import greedy_cover
from panelkit.errors import NoPanelError, UsageError, name_some

__all__ = ["Amount", "Cover", "CoverKit", "cheapest_cover", "exact_amount"]

Amount = int | Decimal | Fraction | str
MOST_DIGITS: Final = 10**15
"""Largest whole number that the solver's floats still tell from its neighbour."""


@dataclass(frozen=True, slots=True)
class CoverKit:
    """A kit that may be bought.

    Attributes
    ----------
    id : str
        Its name.
    markers : frozenset of str
        What it measures.
    cost : Fraction
        Its whole price.
    volume : Fraction
        Sample volume that it takes.
    """

    id: str
    markers: frozenset[str]
    cost: Fraction
    volume: Fraction = Fraction(0)


@dataclass(frozen=True, slots=True)
class Cover:
    """Kits and single assays that measure every required marker.

    Attributes
    ----------
    kits, singles : tuple of str
        What is bought, sorted.
    cost : Decimal
        Exactly what it costs, steps of pools included.
    pools : int
        Pools of the single assays; 0 without steps.
    unwanted : tuple of str
        Analytes of the kits that are not required, sorted, once for each kit.
    proved : bool
        Whether nothing is cheaper.
    status : str
        ``"proved optimal"`` or ``"not proved"``.
    bound : Decimal
        What no cover can cost less than; equals `cost` where that is proved.
    greedy_cost : Decimal or None
        What buying by price per newly covered marker costs: only a comparison. None
        with pools, where it is not defined, or where it finds no cover.
    """

    kits: tuple[str, ...]
    singles: tuple[str, ...]
    cost: Decimal
    pools: int
    unwanted: tuple[str, ...]
    proved: bool
    bound: Decimal
    greedy_cost: Decimal | None

    @property
    def status(self) -> str:
        """Whether the cover is proved to be the cheapest."""
        return "proved optimal" if self.proved else "not proved"


def cheapest_cover(
    required: Iterable[str],
    kits: Iterable[Mapping[str, object] | CoverKit],
    singles: Mapping[str, Amount] | None = None,
    *,
    pool_costs: Sequence[Amount] = (0,),
    pool_slots: int | None = None,
    excluded: Iterable[tuple[str, str]] = (),
    volume: Amount | None = None,
    time_limit_s: float = PRICING.time_limit_s,
) -> Cover:
    """Return the cheapest kits, single assays and pools for a set of markers.

    Of covers that cost the same the one with the fewest kits and assays is taken, then
    with the fewest analytes that are not required, then the first by sorted ids.

    Parameters
    ----------
    required : iterable of str
        Markers to be measured.
    kits : iterable of mapping or CoverKit
        Each with ``id``, ``markers``, ``cost`` and, where it counts, ``volume``.
    singles : mapping of str to int, Decimal, Fraction or str
        Cost of a single assay by marker; markers left out have none.
    pool_costs : sequence of int, Decimal, Fraction or str
        What 0, 1, 2, ... pools of single assays cost in all. One entry: pools are
        free, and single assays are not counted.
    pool_slots : int, optional
        Single assays that one pool holds; needed where `pool_costs` has steps.
    excluded : iterable of (str, str)
        Pairs of kits that cannot be bought together.
    volume : int, Decimal, Fraction or str, optional
        Sample volume for all kits.
    time_limit_s : float
        For the whole call; what is found by then is returned as not proved.

    Returns
    -------
    Cover
        What to buy, its cost, and whether nothing is cheaper.

    Raises
    ------
    UsageError
        An amount is not exact, or steps come without a size of pools.
    NoPanelError
        No cover exists, or none was found in time.
    """
    wanted = tuple(sorted(set(required)))
    problem = _Problem(
        wanted=wanted,
        kits=_kits(kits),
        singles={
            name: exact_amount(cost, f"single assay '{name}'")
            for name, cost in (singles or {}).items()
            if name in wanted
        },
        steps=tuple(exact_amount(cost, "pool_costs") for cost in pool_costs),
        slots=pool_slots,
        excluded=tuple(excluded),
        volume=None if volume is None else exact_amount(volume, "volume"),
    )
    _check(problem)
    return _Solver(problem, time_limit_s).solve()


@dataclass(frozen=True, slots=True)
class _Problem:
    wanted: tuple[str, ...]
    kits: tuple[CoverKit, ...]
    singles: dict[str, Fraction]
    steps: tuple[Fraction, ...]
    slots: int | None
    excluded: tuple[tuple[str, str], ...]
    volume: Fraction | None


def _kits(kits: Iterable[Mapping[str, object] | CoverKit]) -> tuple[CoverKit, ...]:
    made = []
    for number, kit in enumerate(kits, start=1):
        if isinstance(kit, CoverKit):
            made.append(kit)
            continue
        where = f"kit {number}"
        lacking = [key for key in ("id", "markers", "cost") if key not in kit]
        markers = kit.get("markers")
        if lacking or not isinstance(markers, list | tuple | set | frozenset):
            raise UsageError(
                code="kit-incomplete",
                where=where,
                what=f"the kit lacks {name_some(lacking) or 'a list of markers'}",
                accepted="id, markers (a list) and cost",
                next_step="Add what is missing",
            )
        made.append(
            CoverKit(
                id=str(kit["id"]),
                markers=frozenset(str(name) for name in markers),
                cost=exact_amount(kit["cost"], where),
                volume=exact_amount(kit.get("volume", 0), where),
            )
        )
    names = [kit.id for kit in made]
    if twice := sorted({name for name in names if names.count(name) > 1}):
        raise UsageError(
            code="kit-twice",
            where="kits",
            what=f"kits have one id (got {name_some(twice)} twice)",
            accepted="each kit once",
            next_step="Rename or remove one of them",
        )
    return tuple(made)


def exact_amount(value: object, where: str) -> Fraction:
    """Return an amount exactly as it was given.

    Raises
    ------
    UsageError
        It is a binary float, negative, or no number.
    """
    amount = Fraction(-1)
    if isinstance(value, int | Decimal | Fraction | str) and value is not True:
        try:
            amount = Fraction(value)
        except (ValueError, OverflowError, ZeroDivisionError):
            amount = Fraction(-1)
    if amount >= 0:
        return amount
    raise UsageError(
        code="amount-not-exact",
        where=where,
        what=f"the value is no exact amount of at least 0 (got {value!r})",
        accepted="a whole number, a Decimal, a Fraction, or text such as '12.50'; "
        "binary floats are refused since they are not exact",
        next_step="Pass the amount as text or as a Decimal",
    )


def _check(problem: _Problem) -> None:
    if len(problem.steps) > 1 and (problem.slots is None or problem.slots < 1):
        raise UsageError(
            code="pool-slots-missing",
            where="pool_slots",
            what=f"pools have costs but no size (got {problem.slots!r})",
            accepted="the number of single assays that a pool holds, at least 1",
            next_step="Give pool_slots",
        )
    able = set(problem.singles).union(*(kit.markers for kit in problem.kits))
    if left := [name for name in problem.wanted if name not in able]:
        raise NoPanelError(
            code="marker-not-sold",
            where="required markers",
            what=f"no kit and no single assay measures {name_some(left)}",
            accepted="markers that at least one option measures",
            next_step="Leave them out, or find somebody who sells them",
        )


@dataclass(frozen=True, slots=True)
class _Option:
    """A kit or a single assay, in whole numbers."""

    id: str
    is_kit: bool
    covers: frozenset[str]
    cost: int
    unwanted: int


@dataclass(slots=True)
class _Answer:
    taken: NDArray[np.bool_] | None
    bound: float
    finished: bool


@dataclass(slots=True)
class _Pins:
    """Linear rows that hold the keys of an earlier step: coefficients, upper end."""

    rows: list[NDArray[np.float64]] = field(default_factory=list)
    ends: list[float] = field(default_factory=list)


class _Solver:
    """One cover problem; all costs multiplied so that they are whole numbers."""

    def __init__(self, problem: _Problem, time_limit_s: float) -> None:
        self.problem = problem
        self.deadline = time.monotonic() + time_limit_s
        amounts = [kit.cost for kit in problem.kits]
        amounts += [*problem.singles.values(), *problem.steps]
        self.scale = math.lcm(*(amount.denominator for amount in amounts), 1)
        if sum(amounts) * self.scale > MOST_DIGITS:
            raise UsageError(
                code="amounts-too-fine",
                where="costs",
                what="costs of this size and fineness cannot be told apart exactly "
                f"(their sum has more than {len(str(MOST_DIGITS)) - 1} digits)",
                accepted="costs rounded to the minor unit of a currency",
                next_step="Round the costs",
            )
        self.options = self._options()
        self.costs = np.array([option.cost for option in self.options], dtype=float)
        self.fixed_rows, self.fixed_low, self.fixed_high = self._rows()

    def _options(self) -> list[_Option]:
        wanted = frozenset(self.problem.wanted)
        free = not self.problem.excluded and self.problem.volume is None
        kits = [
            _Option(
                kit.id,
                True,
                wanted & kit.markers,
                int(kit.cost * self.scale),
                len(kit.markers - wanted),
            )
            for kit in self.problem.kits
            if wanted & kit.markers
        ]
        if free:  # a kit that a cheaper one outdoes is never part of the best cover
            kits = [
                kit
                for kit in kits
                if not any(
                    kit.covers <= other.covers and other.cost < kit.cost
                    for other in kits
                )
            ]
        singles = [
            _Option(name, False, frozenset((name,)), int(cost * self.scale), 0)
            for name, cost in self.problem.singles.items()
        ]
        return sorted([*kits, *singles], key=lambda option: (option.id, option.is_kit))

    def _rows(self) -> tuple[csr_array, NDArray[np.float64], NDArray[np.float64]]:
        rows = [
            [float(name in option.covers) for option in self.options]
            for name in self.problem.wanted
        ]
        low = [1.0] * len(rows)
        high = [math.inf] * len(rows)
        place = {o.id: i for i, o in enumerate(self.options) if o.is_kit}
        for first, second in self.problem.excluded:
            if first in place and second in place:
                row = [0.0] * len(self.options)
                row[place[first]] = row[place[second]] = 1.0
                rows, low, high = [*rows, row], [*low, 0.0], [*high, 1.0]
        if self.problem.volume is not None:
            volumes = {kit.id: float(kit.volume) for kit in self.problem.kits}
            rows.append([volumes[o.id] if o.is_kit else 0.0 for o in self.options])
            low, high = [*low, 0.0], [*high, float(self.problem.volume)]
        matrix = np.array(rows, dtype=float).reshape(len(rows), len(self.options))
        return csr_array(matrix), np.array(low), np.array(high)

    def solve(self) -> Cover:
        """Solve for every number of pools, then settle ties."""
        best: tuple[tuple[int, int, int, tuple[str, ...]], int, list[int]] | None = None
        bound = math.inf
        proved = True
        for pools, step in self._steps():
            if best is not None and step > best[0][0]:
                continue  # its pools alone cost more
            found = self._with_pools(pools)
            bound = min(bound, found.bound + step)
            proved &= found.finished
            if found.taken is None:
                continue
            taken, sure = self._settle(found, pools)
            proved &= sure
            key = self._key(taken, step)
            if best is None or key < best[0]:
                best = (key, pools, taken)
        if best is None:
            raise NoPanelError(
                code="no-cover",
                where="required markers",
                what="no choice of kits and assays measures them together "
                f"(got {len(self.options)} options)",
                accepted="exclusions, volume and pools that leave a choice, and time "
                "to find it",
                next_step="Relax them, or raise the time limit",
            )
        return self._cover(*best, proved=proved, bound=bound)

    def _steps(self) -> list[tuple[int, int]]:
        steps = [int(step * self.scale) for step in self.problem.steps]
        if len(steps) == 1:
            return [(-1, steps[0])]  # pools are free: any number of single assays
        return list(enumerate(steps))

    def _with_pools(self, pools: int) -> _Answer:
        return self._milp(self.costs, pools, _Pins())

    def _milp(
        self,
        objective: NDArray[np.float64],
        pools: int,
        pins: _Pins,
        low: NDArray[np.float64] | None = None,
        high: NDArray[np.float64] | None = None,
    ) -> _Answer:
        n = len(self.options)
        left = self.deadline - time.monotonic()
        if left <= 0:
            return _Answer(None, -math.inf, False)
        rows = list(pins.rows)
        ends = list(pins.ends)
        if pools >= 0:
            rows.append(np.array([float(not o.is_kit) for o in self.options]))
            ends.append(float(pools * (self.problem.slots or 0)))
        constraints = [
            LinearConstraint(self.fixed_rows, self.fixed_low, self.fixed_high)
        ]
        if rows:
            constraints.append(
                LinearConstraint(
                    vstack([csr_array(r[None]) for r in rows]), -math.inf, ends
                )
            )
        answer = milp(
            objective,
            integrality=np.ones(n, dtype=np.int64),
            bounds=Bounds(
                np.zeros(n) if low is None else low,
                np.ones(n) if high is None else high,
            ),
            constraints=constraints,
            # The default gap calls a cover optimal that is some units too dear.
            options={"mip_rel_gap": 0.0, "time_limit": left},
        )
        bound = answer.mip_dual_bound
        bound = -math.inf if bound is None else float(bound)
        if answer.x is None:
            return _Answer(
                None, math.inf if answer.status == 2 else bound, answer.status == 2
            )
        taken = np.asarray(answer.x > 0.5)
        return _Answer(taken, bound, answer.status == 0)

    def _settle(self, found: _Answer, pools: int) -> tuple[list[int], bool]:
        """Take, of equal covers, the first by units, unwanted analytes and ids.

        Each key is held by a row of whole numbers while the next is solved.
        """
        assert found.taken is not None
        taken = found.taken
        cost = self._sum(self.costs, taken)
        sure = found.finished and found.bound > cost - 1 + 1e-6 * max(1.0, cost * 1e-6)
        pins = _Pins([self.costs], [cost + 0.5])
        if self._is_alone(taken, pools, pins):
            return self._where(taken), sure
        for key in (
            np.ones(len(self.options)),
            np.array([float(option.unwanted) for option in self.options]),
        ):
            answer = self._milp(key, pools, pins)
            if answer.taken is None or not answer.finished:
                return self._where(taken), False
            taken = answer.taken
            pins.rows.append(key)
            pins.ends.append(self._sum(key, taken) + 0.5)
            if self._sum(self.costs, taken) > cost:
                return self._where(found.taken), False
        return self._first_by_id(taken, pools, pins, sure)

    def _is_alone(self, taken: NDArray[np.bool_], pools: int, pins: _Pins) -> bool:
        """Whether no other cover costs as little."""
        other = np.where(taken, 1.0, -1.0)  # at most all but one place in common
        only = _Pins([*pins.rows, other], [*pins.ends, float(taken.sum()) - 1.0])
        answer = self._milp(np.zeros(len(self.options)), pools, only)
        return answer.taken is None and answer.finished

    def _first_by_id(
        self, taken: NDArray[np.bool_], pools: int, pins: _Pins, sure: bool
    ) -> tuple[list[int], bool]:
        low, high = np.zeros(len(self.options)), np.ones(len(self.options))
        for i in range(len(self.options)):
            if not taken[i]:
                tried = low.copy()
                tried[i] = 1.0
                nothing = np.zeros(len(self.options))
                answer = self._milp(nothing, pools, pins, tried, high)
                if answer.taken is not None:
                    taken = answer.taken
                elif not answer.finished:
                    return self._where(taken), False
            low[i] = high[i] = float(taken[i])
        return self._where(taken), sure

    @staticmethod
    def _sum(key: NDArray[np.float64], taken: NDArray[np.bool_]) -> int:
        return sum(int(each) for each in key[taken])

    @staticmethod
    def _where(taken: NDArray[np.bool_]) -> list[int]:
        return [int(i) for i in np.flatnonzero(taken)]

    def _key(
        self, taken: list[int], step: int
    ) -> tuple[int, int, int, tuple[str, ...]]:
        options = [self.options[i] for i in taken]
        covered = frozenset[str]().union(*(option.covers for option in options))
        assert covered >= set(self.problem.wanted), "the solver left a marker out"
        return (
            sum(option.cost for option in options) + step,
            len(options),
            sum(option.unwanted for option in options),
            tuple(sorted(option.id for option in options)),
        )

    def _cover(
        self,
        key: tuple[int, int, int, tuple[str, ...]],
        pools: int,
        taken: list[int],
        *,
        proved: bool,
        bound: float,
    ) -> Cover:
        options = [self.options[i] for i in taken]
        wanted = set(self.problem.wanted)
        markers = {kit.id: kit.markers for kit in self.problem.kits}
        kits = tuple(option.id for option in options if option.is_kit)
        singles = tuple(option.id for option in options if not option.is_kit)
        if pools > 0:  # fewer may hold what is left for single assays
            pools = -(-len(singles) // (self.problem.slots or 1))
        least = key[0] if proved else max(0, math.ceil(bound - 1e-6))
        return Cover(
            kits=kits,
            singles=singles,
            cost=self._amount(key[0]),
            pools=max(pools, 0),
            unwanted=tuple(
                name for kit in kits for name in sorted(markers[kit] - wanted)
            ),
            proved=proved,
            bound=self._amount(least),
            greedy_cost=self._greedy(),
        )

    def _greedy(self) -> Decimal | None:
        if len(self.problem.steps) > 1 or self.problem.excluded:
            return None
        cost = greedy_cover(
            self.problem.wanted,
            [(option.id, option.covers, option.cost) for option in self.options],
        )
        step = int(self.problem.steps[0] * self.scale)
        return None if cost is None else self._amount(cost + step)

    def _amount(self, units: int) -> Decimal:
        amount = Fraction(units, self.scale)
        digits = 0
        while (amount * 10**digits).denominator != 1 and digits < 30:
            digits += 1
        whole = int(amount * 10**digits)
        return Decimal((0, tuple(int(d) for d in str(whole)), -digits))
