"""What added error does to a panel: simulation, to hold the closed forms against."""

import math
from dataclasses import dataclass

import numpy as np

from panelkit.config import SIZING
from panelkit.metrics import auc
from panelkit.sizing.transfer import AssayError, PanelModel

__all__ = ["SimulatedArea", "simulate_area"]


@dataclass(frozen=True, slots=True)
class SimulatedArea:
    """An area over invented studies.

    Attributes
    ----------
    mean, se : float
        Over draws, and the mean's standard error.
    low, high : float
        5th and 95th percentile of the draws: what one study may see.
    """

    mean: float
    se: float
    low: float
    high: float


def simulate_area(
    model: PanelModel,
    error: AssayError,
    generator: np.random.Generator,
    n_draws: int = SIZING.error_draws,
    n_people: int = SIZING.people_per_draw,
) -> SimulatedArea:
    """Return the area of invented studies that were read with an error.

    Parameters
    ----------
    model : PanelModel
        The panel; its weights stay.
    error : AssayError
        Independent, and shared by a plate.
    generator : numpy.random.Generator
        For people and errors.
    n_draws, n_people : int
        Studies; people of each, half of them cases, dealt to plates in turn.

    Returns
    -------
    SimulatedArea
        Mean and spread over studies.
    """
    half = max(error.n_plates, n_people // 2 // error.n_plates * error.n_plates)
    outcome = np.repeat([0.0, 1.0], half)
    plate = np.tile(np.arange(half) % error.n_plates, 2)
    root = np.linalg.cholesky(model.covariance)
    n_markers = len(model.markers)
    areas = np.empty(n_draws)
    for draw in range(n_draws):
        values = generator.normal(size=(2 * half, n_markers)) @ root.T
        values[half:] += model.differences
        values += generator.normal(size=values.shape) * np.asarray(error.within)
        shifts = generator.normal(size=(error.n_plates, n_markers))
        values += (shifts * np.asarray(error.between))[plate]
        areas[draw] = auc(values @ model.weights, outcome)
    low, high = np.quantile(areas, [0.05, 0.95])
    return SimulatedArea(
        float(areas.mean()),
        float(areas.std(ddof=1) / math.sqrt(n_draws)),
        float(low),
        float(high),
    )
