"""Which markers are picked again and again."""

from panelkit.stability.bounds import markers_for, worst_case_bound
from panelkit.stability.companions import group_companions
from panelkit.stability.selection import ShortlistRules, select_markers
from panelkit.stability.subsamples import draw_pairs
from panelkit.stability.units import unit_strata

__all__ = [
    "ShortlistRules",
    "draw_pairs",
    "group_companions",
    "markers_for",
    "select_markers",
    "unit_strata",
    "worst_case_bound",
]
