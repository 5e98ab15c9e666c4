"""The benchmark of text reading; each job runs in a process of its own.

``reading.py JOB FILE`` writes the results as JSON; ``reading.py peak READER TEXT``
prints the memory that one reader needs for one file, in bytes.
"""

import gzip
import subprocess
import sys
import tempfile
from pathlib import Path

import measure
import numpy as np
import pandas as pd
import pyarrow.compute  # noqa: F401 - loaded before the clock starts, as pandas is

from panelkit.ingest.cohort_reader import read_cohort
from panelkit.ingest.delimited import read_delimited_matrix

ROUNDS = 5
SIZES = {"wide": (300, 30_000), "tall": (30_000, 300)}
READERS = {
    "panelkit": lambda path: read_delimited_matrix(path, 0),
    "pandas": lambda path: pd.read_csv(path, index_col=0),
    "pandas, exact": lambda path: pd.read_csv(
        path, index_col=0, float_precision="round_trip"
    ),
    "numpy": lambda path: np.loadtxt(
        path, delimiter=",", skiprows=1, usecols=range(1, _width(path))
    ),
    "read_cohort with its checks": lambda path: read_cohort(path),
}
MISSING = ("pandas", "panelkit")  # numpy's reader knows no blank cells


def _width(path):
    with path.open() as text:
        return text.readline().count(",") + 1


def _written(path, shape, form="%.4f", missing=0.0):
    draws = np.random.default_rng(0)
    rows, columns = shape
    with path.open("w") as text:
        text.write("id," + ",".join(f"G{place}" for place in range(columns)) + "\n")
        for row in range(rows):
            cells = [form % value for value in draws.normal(7.0, 2.0, columns)]
            if missing:
                hit = draws.random(columns) < missing
                cells = ["" if gone else c for c, gone in zip(cells, hit, strict=True)]
            text.write(f"S{row:05d}," + ",".join(cells) + "\n")


def _peak_of(reader, path):
    asked = subprocess.run(
        [sys.executable, __file__, "peak", reader, str(path)],
        capture_output=True,
        check=True,
        text=True,
    )
    return int(asked.stdout)


def _compared(shape, readers, form="%.4f", missing=0.0, pack=None):
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "matrix.csv"
        _written(path, shape, form, missing)
        size = path.stat().st_size
        if pack is not None:
            packed = path.with_suffix(".csv.gz")
            packed.write_bytes(pack(path.read_bytes(), mtime=0))
            path = packed
        tasks = {name: lambda turn, read=READERS[name]: read(path) for name in readers}
        times, processor = measure.alternate(tasks, ROUNDS)
        ours = READERS["panelkit"](path).values
        theirs = READERS["pandas, exact"](path).to_numpy()
        peaks = {name: _peak_of(name, path) for name in readers}
    return {
        "sizes": {"rows": shape[0], "columns": shape[1], "bytes": size},
        "times_s": times,
        "median_s": measure.medians(times),
        "median_processor_s": measure.medians(processor),
        "ratio": {
            name: measure.paired_ratio(times[name], times["panelkit"])
            for name in readers
            if name != "panelkit"
        },
        "peak_over_matrix": {
            name: peak / (8 * shape[0] * shape[1]) for name, peak in peaks.items()
        },
        "equal": bool(np.array_equal(ours, theirs, equal_nan=True)),
    }


def wide():
    """Return 300 x 30,000 with four decimals, 65 MB."""
    return _compared(SIZES["wide"], READERS)


def tall():
    """Return 30,000 x 300 with four decimals."""
    return _compared(SIZES["tall"], READERS)


def wide_all_digits():
    """Return the wide matrix with 17 digits a cell, as pandas writes it."""
    return _compared(SIZES["wide"], ("panelkit", "pandas", "numpy"), "%.17g")


def wide_missing():
    """Return the wide matrix with 59 % blank cells."""
    return _compared(SIZES["wide"], MISSING, missing=0.59)


def wide_gzip():
    """Return the wide matrix compressed."""
    return _compared(SIZES["wide"], ("panelkit", "pandas"), pack=gzip.compress)


JOBS = {
    job.__name__: job for job in (wide, tall, wide_all_digits, wide_missing, wide_gzip)
}


def _peak(reader, path):
    """Return by how much the resident size grows at most while a file is read."""
    _written(path.with_name("small.csv"), (3, 3))
    READERS[reader](path.with_name("small.csv"))  # what libraries load once
    before = measure.peak_bytes()
    READERS[reader](path)
    return measure.peak_bytes() - before


if __name__ == "__main__":
    if sys.argv[1] == "peak":
        sys.stdout.write(str(_peak(sys.argv[2], Path(sys.argv[3]))))
    else:
        job, target = sys.argv[1:]
        measure.write_json(Path(target), job, JOBS[job]())
