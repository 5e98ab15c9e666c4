"""Files in, a checked cohort out."""

from panelkit.ingest.cells import is_missing
from panelkit.ingest.checks import check_cohort
from panelkit.ingest.cohort_reader import read_cohort
from panelkit.ingest.conflict_list import read_conflicts
from panelkit.ingest.marker_table import MarkerTable, read_markers
from panelkit.ingest.openings import read_openings, record_opening
from panelkit.ingest.price_list import read_price_list
from panelkit.ingest.reader import OpenedMatrix, Reader, ReadOptions
from panelkit.ingest.readers import format_names, register_reader
from panelkit.ingest.replicate_checks import replicate_agreement
from panelkit.ingest.scale import ScaleGuess, guess_scale
from panelkit.ingest.sheet import Sheet, read_sheet
from panelkit.ingest.usable import check_usable

__all__ = [
    "MarkerTable",
    "OpenedMatrix",
    "ReadOptions",
    "Reader",
    "ScaleGuess",
    "Sheet",
    "check_cohort",
    "check_usable",
    "format_names",
    "guess_scale",
    "is_missing",
    "read_cohort",
    "read_conflicts",
    "read_markers",
    "read_openings",
    "read_price_list",
    "read_sheet",
    "record_opening",
    "register_reader",
    "replicate_agreement",
]
