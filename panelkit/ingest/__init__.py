"""Files in, a checked cohort out."""

from panelkit.ingest.cells import is_missing
from panelkit.ingest.checks import check_cohort
from panelkit.ingest.cohort_reader import read_cohort
from panelkit.ingest.price_list import read_price_list
from panelkit.ingest.reader import OpenedMatrix, Reader, ReadOptions
from panelkit.ingest.readers import format_names, register_reader
from panelkit.ingest.scale import ScaleGuess, guess_scale

__all__ = [
    "OpenedMatrix",
    "ReadOptions",
    "Reader",
    "ScaleGuess",
    "check_cohort",
    "format_names",
    "guess_scale",
    "is_missing",
    "read_cohort",
    "read_price_list",
    "register_reader",
]
