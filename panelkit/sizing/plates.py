"""Which sample goes into which well: randomised, balanced, and checked."""

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from panelkit.config import SIZING
from panelkit.errors import UsageError
from panelkit.metrics import contingency_table, cramers_v
from panelkit.sizing.demands import check_count

__all__ = ["Allocation", "Balance", "allocate_plates", "well_names"]

LETTERS = "ABCDEFGHIJKLMNOPQRSTUVWXYZ"
SHAPES = {6: 2, 12: 3, 24: 4, 48: 6, 96: 8, 384: 16, 1536: 32}
"""Rows of the usual plates."""


@dataclass(frozen=True, slots=True)
class Balance:
    """How evenly one column is spread over the plates.

    Attributes
    ----------
    column : str
        The column, or two of them together.
    association : float
        Cramer's V of plate and column; 0 is even.
    by_chance : float
        Its mean when units are dealt by chance alone.
    by_chance_high : float
        95th percentile of that.
    share_as_even : float
        Share of chance allocations at least as even as this one.
    largest_gap : float
        Largest difference of a cell from its expected count.
    """

    column: str
    association: float
    by_chance: float
    by_chance_high: float
    share_as_even: float
    largest_gap: float


@dataclass(frozen=True, slots=True, eq=False)
class Allocation:
    """Plate and well of every sample.

    Attributes
    ----------
    plate : ndarray of shape (n_samples,), int64
        From 0.
    well : ndarray of shape (n_samples,), object
        Name of the well.
    position : ndarray of shape (n_samples,), int64
        Order within the plate, from 0, along columns.
    n_plates : int
        Plates used.
    control_wells : tuple of str
        Kept free on every plate.
    balance : tuple of Balance
        The check.
    """

    plate: NDArray[np.int64]
    well: NDArray[np.object_]
    position: NDArray[np.int64]
    n_plates: int
    control_wells: tuple[str, ...]
    balance: tuple[Balance, ...]


def well_names(wells: int) -> list[str]:
    """Return the wells of a plate in the order of its columns.

    Parameters
    ----------
    wells : int
        Of a usual plate; another number gives positions ``1``, ``2``, ...

    Returns
    -------
    list of str
        ``A1``, ``B1``, ... for 96 wells.
    """
    if wells not in SHAPES:
        return [str(k + 1) for k in range(wells)]
    rows = SHAPES[wells]
    letters = [
        LETTERS[k] if k < len(LETTERS) else "A" + LETTERS[k - len(LETTERS)]
        for k in range(rows)
    ]
    return [
        f"{letter}{column + 1}" for column in range(wells // rows) for letter in letters
    ]


def allocate_plates(
    columns: Mapping[str, Sequence[str]],
    subjects: Sequence[str],
    generator: np.random.Generator,
    wells: int = SIZING.wells,
    controls: int = SIZING.controls,
    n_attempts: int = SIZING.attempts,
    n_chance: int = SIZING.chance_draws,
) -> Allocation:
    """Return plate and well of every sample, balanced over the columns.

    Parameters
    ----------
    columns : mapping of str to sequence of str
        What to balance: outcome, site, ...; one entry a sample.
    subjects : sequence of str
        Subject of each sample: all samples of one go onto one plate.
    generator : numpy.random.Generator
        For every draw.
    wells, controls : int
        Of a plate; kept for controls and references.
    n_attempts : int
        Allocations that are drawn; the most even one is taken.
    n_chance : int
        Allocations by chance that it is held against.

    Returns
    -------
    Allocation
        As few plates as hold the samples, filled evenly. Units come in random order
        and each goes where the columns and their pairs then are most even, ties
        broken by chance; positions within a plate are drawn by chance.

    Raises
    ------
    UsageError
        No room for samples, or a subject with more samples than a plate takes.

    References
    ----------
    Taves 1974, Clin Pharmacol Ther 15:443; Pocock & Simon 1975, Biometrics 31:103:
    minimisation.
    """
    units, sizes = _units(subjects)
    room = _room(wells, controls, sizes)
    n_samples = int(sizes.sum())
    n_plates = math.ceil(n_samples / room)
    factors = _factors(columns)
    counts = np.hstack(
        [_unit_counts(units, each, len(sizes)) for each in factors.values()]
    )
    while True:
        held = _even_room(n_samples, n_plates, room, int(sizes.max()))
        found = [
            one
            for _ in range(n_attempts)
            if (one := _deal(counts, sizes, held, generator)) is not None
        ]
        if found:
            break
        n_plates += 1  # subjects with many samples may not fit
    best = min(found, key=lambda plate: _unevenness(counts, plate, n_plates))
    plate = best[units]
    balance = _check(factors, units, sizes, best, held, generator, n_chance)
    well, position, kept = _wells(plate, n_plates, wells, controls, generator)
    return Allocation(plate, well, position, n_plates, kept, balance)


def _units(
    subjects: Sequence[str],
) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    _, units = np.unique(np.asarray(subjects, object).astype(str), return_inverse=True)
    units = np.asarray(units, np.int64)
    return units, np.bincount(units)


def _room(wells: int, controls: int, sizes: NDArray[np.int64]) -> int:
    check_count("number of wells", wells)
    check_count("number of controls", controls, 0)
    room = wells - controls
    largest = int(sizes.max()) if len(sizes) else 0
    if room < 1 or largest > room or not largest:
        raise UsageError(
            code="plate-without-room",
            where="plates",
            what=f"{wells} wells less {controls} for controls leave {max(room, 0)}; "
            f"the subject with most samples has {largest}",
            accepted="room for all samples of any subject on one plate",
            next_step="Take larger plates, fewer controls, or leave the subject out",
        )
    return room


def _factors(columns: Mapping[str, Sequence[str]]) -> dict[str, NDArray[np.object_]]:
    """Return the columns and, as factors of their own, their pairs."""
    own = {name: np.asarray(list(each), object) for name, each in columns.items()}
    names = list(own)
    pairs = {
        f"{a} by {b}": np.array(
            [f"{x} / {y}" for x, y in zip(own[a], own[b], strict=True)], object
        )
        for i, a in enumerate(names)
        for b in names[i + 1 :]
    }
    return {**own, **pairs}


def _unit_counts(
    units: NDArray[np.int64], column: NDArray[np.object_], n_units: int
) -> NDArray[np.float64]:
    """Return samples of each unit at each level, scaled so that factors weigh alike."""
    levels, code = np.unique(column.astype(str), return_inverse=True)
    counts = np.zeros((n_units, len(levels)))
    np.add.at(counts, (units, code), 1.0)
    scale: NDArray[np.float64] = np.sqrt(
        np.maximum(counts.sum(axis=0), 1.0) * len(levels)
    )
    return np.asarray(counts / scale)


def _even_room(
    n_samples: int, n_plates: int, room: int, largest: int
) -> NDArray[np.int64]:
    """Return how many samples each plate takes: even, with play for subjects."""
    play = 0 if largest == 1 else largest - 1
    even = np.full(n_plates, n_samples // n_plates)
    even[: n_samples % n_plates] += 1
    held: NDArray[np.int64] = np.minimum(room, even + play)
    return held


def _deal(
    counts: NDArray[np.float64],
    sizes: NDArray[np.int64],
    held: NDArray[np.int64],
    generator: np.random.Generator,
) -> NDArray[np.int64] | None:
    """Deal units in random order, those with most samples first; None if stuck."""
    order = generator.permutation(len(sizes))
    order = order[np.argsort(-sizes[order], kind="stable")]
    n_plates = len(held)
    share = held / held.sum()
    filled = np.zeros((n_plates, counts.shape[1]))
    seen = np.zeros(counts.shape[1])
    left = held.astype(np.int64).copy()
    plate = np.empty(len(sizes), np.int64)
    for unit in order:
        seen += counts[unit]
        gap = filled - np.outer(share, seen)
        # what the sum of squared gaps gains if the unit goes to each plate
        gain = 2.0 * gap @ counts[unit]
        gain = gain + generator.uniform(0.0, 1e-9, n_plates)
        gain[left < sizes[unit]] = np.inf
        best = int(np.argmin(gain))
        if not np.isfinite(gain[best]):
            return None
        plate[unit] = best
        filled[best] += counts[unit]
        left[best] -= sizes[unit]
    return plate


def _unevenness(
    counts: NDArray[np.float64], plate: NDArray[np.int64], n_plates: int
) -> float:
    filled = np.zeros((n_plates, counts.shape[1]))
    np.add.at(filled, plate, counts)
    return float(((filled - filled.mean(axis=0)) ** 2).sum())


def _by_chance(
    sizes: NDArray[np.int64],
    held: NDArray[np.int64],
    generator: np.random.Generator,
) -> NDArray[np.int64]:
    """Deal units by chance alone into the same room; what overflows goes on."""
    order = generator.permutation(len(sizes))
    order = order[np.argsort(-sizes[order], kind="stable")]
    left = held.astype(np.int64).copy()
    plate = np.empty(len(sizes), np.int64)
    for unit in order:
        able = np.flatnonzero(left >= sizes[unit])
        if not len(able):
            able = np.array([int(np.argmax(left))])
        chance = np.maximum(left[able], 1).astype(float)
        best = int(generator.choice(able, p=chance / chance.sum()))
        plate[unit] = best
        left[best] -= sizes[unit]
    return plate


def _check(
    factors: Mapping[str, NDArray[np.object_]],
    units: NDArray[np.int64],
    sizes: NDArray[np.int64],
    best: NDArray[np.int64],
    held: NDArray[np.int64],
    generator: np.random.Generator,
    n_chance: int,
) -> tuple[Balance, ...]:
    chance = [_by_chance(sizes, held, generator)[units] for _ in range(n_chance)]
    found = []
    for name, column in factors.items():
        own, gap = _association(best[units], column)
        others = np.array([_association(plate, column)[0] for plate in chance])
        found.append(
            Balance(
                name,
                own,
                float(others.mean()),
                float(np.quantile(others, 0.95)),
                float((others <= own + 1e-12).mean()),
                gap,
            )
        )
    return tuple(found)


def _association(
    plate: NDArray[np.int64], column: NDArray[np.object_]
) -> tuple[float, float]:
    table, _, _ = contingency_table([str(k) for k in plate], [str(v) for v in column])
    expected = np.outer(table.sum(axis=1), table.sum(axis=0)) / table.sum()
    gap = float(np.abs(table - expected).max())
    value = cramers_v(table)
    return (0.0 if math.isnan(value) else float(value)), gap


def _wells(
    plate: NDArray[np.int64],
    n_plates: int,
    wells: int,
    controls: int,
    generator: np.random.Generator,
) -> tuple[NDArray[np.object_], NDArray[np.int64], tuple[str, ...]]:
    """Draw positions by chance; control wells are spread over the plate."""
    names = well_names(wells)
    kept = np.unique(np.linspace(0, wells - 1, controls).round().astype(int))
    free = np.array([k for k in range(wells) if k not in set(kept.tolist())])
    well = np.empty(len(plate), object)
    position = np.empty(len(plate), np.int64)
    for number in range(n_plates):
        own = np.flatnonzero(plate == number)
        position[own] = np.sort(free)[: len(own)][generator.permutation(len(own))]
        well[own] = [names[k] for k in position[own]]
    return well, position, tuple(names[k] for k in kept)
