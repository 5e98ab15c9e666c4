"""Penalty paths in lockstep, small refits, ridge on everything."""

from panelkit.fits.paths import fit_paths
from panelkit.fits.ridge import kernel_matrix, ridge_predictions
from panelkit.fits.small import PanelFits, fit_panels, standardised
from panelkit.fits.sources import ArraySource
from panelkit.fits.univariate import Univariate, rank_univariate

__all__ = [
    "ArraySource",
    "PanelFits",
    "Univariate",
    "fit_panels",
    "fit_paths",
    "kernel_matrix",
    "rank_univariate",
    "ridge_predictions",
    "standardised",
]
