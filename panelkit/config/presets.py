"""Common geometry of assay families: no prices, and only what was left out."""

from collections.abc import Mapping
from types import MappingProxyType
from typing import Any, Final, Literal

__all__ = ["FAMILY_PRESETS", "USUAL_REFERENCES", "Family"]

FAMILY_PRESETS: Final[Mapping[str, Mapping[str, Any]]] = MappingProxyType(
    {
        "rt-qpcr": {
            "positions": 384,
            "plex": 1,
            "replicates": 2,
            "controls_per_pool": 2,
            "controls_per_run": 0,
            "groups": "auto",
            "refs_scope": "panel",
            "overage": "0.10",
            "repeat_rate": "0.04",
        },
        "dpcr": {
            "positions": 96,
            "plex": 2,
            "replicates": 1,
            "controls_per_pool": 2,
            "controls_per_run": 0,
            "groups": "auto",
            "refs_scope": "pool",
            "overage": "0.10",
            "repeat_rate": "0.03",
        },
        "amplicon": {
            "positions": 384,
            "plex": 400,
            "replicates": 1,
            "controls_per_pool": 4,
            "controls_per_run": 0,
            "groups": 1,
            "refs_scope": "pool",
            "overage": "0.10",
            "repeat_rate": "0.03",
        },
        "probe-count": {  # the number of positions has no usual value
            "plex": 96,
            "replicates": 1,
            "controls_per_pool": 1,
            "controls_per_run": 0,
            "groups": 1,
            "refs_scope": "pool",
            "overage": 0,
            "repeat_rate": "0.03",
        },
        "multiplex-immuno": {
            "positions": 96,
            "plex": 12,
            "replicates": 2,
            "controls_per_pool": 20,
            "controls_per_run": 0,
            "groups": "each",
            "refs_scope": "pool",
            "overage": "0.05",
            "repeat_rate": "0.03",
        },
        "elisa": {
            "positions": 96,
            "plex": 1,
            "replicates": 2,
            "controls_per_pool": 20,
            "controls_per_run": 0,
            "groups": "each",
            "refs_scope": "panel",
            "overage": "0.10",
            "repeat_rate": "0.05",
        },
        "targeted-ms": {
            "positions": 96,
            "plex": 100,
            "replicates": 1,
            "controls_per_pool": 16,
            "controls_per_run": 0,
            "groups": "each",
            "refs_scope": "panel",
            "overage": "0.05",
            "repeat_rate": "0.03",
        },
        "metabolomics": {
            "positions": 96,
            "plex": 100,
            "replicates": 1,
            "controls_per_pool": 18,
            "controls_per_run": 0,
            "groups": "each",
            "refs_scope": "panel",
            "overage": "0.05",
            "repeat_rate": "0.03",
        },
    }
)
"""Common geometry by family: an editable hint that fills only keys left out."""

USUAL_REFERENCES: Final[Mapping[str, int]] = MappingProxyType(
    {
        "rt-qpcr": 3,
        "dpcr": 1,
        "amplicon": 4,
        "probe-count": 6,
        "multiplex-immuno": 0,
        "elisa": 0,
        "targeted-ms": 0,
        "metabolomics": 0,
    }
)
"""Number of reference assays usually planned, by family."""

Family = Literal[
    "rt-qpcr",
    "dpcr",
    "amplicon",
    "probe-count",
    "multiplex-immuno",
    "elisa",
    "targeted-ms",
    "metabolomics",
]
