"""Small invented matrices, and every step with what it needs."""

from dataclasses import dataclass

import numpy as np
import pytest

from panelkit.preparation.values import starting_values
from panelkit.records import RecipeContext

NOTHING = RecipeContext()


@dataclass(frozen=True)
class Chain:
    """A list of steps, and the kind of values that it takes."""

    steps: tuple
    counts: bool = False
    shares: bool = False


def context_for(p, n):
    """Return batches, replicates, analytes, roles and names."""
    role = np.full(p, "marker", object)
    role[: min(p, 4)] = "reference"
    analyte = np.array([f"A{j // 2}" if j % 5 else "" for j in range(p)], object)
    return RecipeContext(
        features=np.array([f"F{j}" for j in range(p)], object),
        samples=np.array([f"S{i}" for i in range(n)], object),
        role=role,
        analyte=analyte,
        batch=np.array([f"plate {i % 3}" for i in range(n)], object),
        replicate=np.arange(n, dtype=np.int64) // 2,
    )


@pytest.fixture
def values_of():
    """Features by samples as values at the start of a recipe."""
    return lambda rows: starting_values(np.array(rows, np.float64))


@pytest.fixture
def context():
    return context_for


@pytest.fixture
def nothing():
    return NOTHING
