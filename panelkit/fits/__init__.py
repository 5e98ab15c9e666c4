"""Penalty paths in lockstep, small refits, ridge on everything."""

from panelkit.fits.budget import BudgetFit, fit_budget
from panelkit.fits.families import Family
from panelkit.fits.gap import duality_gap
from panelkit.fits.paths import fit_paths
from panelkit.fits.ridge import kernel_matrix, ridge_predictions
from panelkit.fits.scratch import open_feature_major, write_feature_major
from panelkit.fits.small import PanelFits, fit_panels, standardised
from panelkit.fits.sources import ArraySource
from panelkit.fits.univariate import Univariate, rank_univariate

__all__ = [
    "ArraySource",
    "BudgetFit",
    "Family",
    "PanelFits",
    "Univariate",
    "duality_gap",
    "fit_budget",
    "fit_panels",
    "fit_paths",
    "kernel_matrix",
    "open_feature_major",
    "rank_univariate",
    "ridge_predictions",
    "standardised",
    "write_feature_major",
]
