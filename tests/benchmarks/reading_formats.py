"""Reading expression files: time beside another reader, peak beside the matrix.

``python tests/benchmarks/reading_formats.py FORMAT out.json`` writes a file of 300 x
30,000 and reads it, each reader in a process of its own.
"""

import json
import subprocess
import sys
import tempfile
from pathlib import Path

import measure
import numpy as np
import pandas as pd

ROWS, COLUMNS, ROUNDS = 300, 30_000, 3
SHARE = 0.1  # of entries that are not zero, where zeros are left out

PANELKIT = """
from pathlib import Path
from panelkit.ingest import ReadOptions
from panelkit.ingest.joined_matrices import open_expressions
from panelkit.ingest.matrix_table import values_of_samples
from panelkit.ingest.sheet import read_sheet
sheet = read_sheet(Path({sheet!r}), "sample_id")
source = open_expressions(Path({path!r}), ReadOptions(), "refuse")
matrix = source.turned(sheet, False, "auto", 0).matrix
done = values_of_samples(matrix.values, numpy.arange(300))
"""
OTHERS = {
    "parquet": "import pandas\ndone = pandas.read_parquet({path!r}).to_numpy()",
    "parquet-turned": "import pandas\ndone = pandas.read_parquet({path!r}).to_numpy()",
    "feather": "import pandas\ndone = pandas.read_feather({path!r}).to_numpy()",
    "h5ad": "import anndata\ndone = anndata.read_h5ad({path!r}).X",
    "h5ad-rows": "import anndata\ndone = anndata.read_h5ad({path!r}).X.toarray()",
    "h5ad-columns": "import anndata\ndone = anndata.read_h5ad({path!r}).X.toarray()",
    "gct": "import pandas\n"
    "done = pandas.read_csv({path!r}, sep='\\t', skiprows=2).iloc[:, 2:].to_numpy()",
    "matrix-market": "import scipy.io\ndone = scipy.io.mmread({path!r}).toarray()",
}
MEASURED = """
import json, sys, time
sys.path.insert(0, {here!r})
import measure
{imports}
measure.forget_peak()
before = measure.peak_bytes()
start = time.perf_counter()
{code}
taken = time.perf_counter() - start
print(json.dumps([taken, measure.peak_bytes() - before, str(done.shape)]))
"""
IMPORTS = (
    "import numpy, pandas, anndata, anndata.io, h5py, pyarrow.parquet, "
    "pyarrow.feather, scipy.io, scipy.sparse, panelkit.ingest"
)


def write(kind, folder):
    """Write the matrix by another program; return it and its path."""
    import anndata
    import scipy.io
    from scipy import sparse

    draws = np.random.default_rng(0)
    values = draws.normal(7, 2, (ROWS, COLUMNS))
    if kind in ("h5ad-rows", "h5ad-columns", "matrix-market"):
        values[draws.random(values.shape) > SHARE] = 0.0
    rows = [f"S{n:03d}" for n in range(ROWS)]
    columns = [f"F{n:05d}" for n in range(COLUMNS)]
    frame = pd.DataFrame(values, rows, columns)
    path = folder / f"matrix.{kind.partition('-')[0]}"
    if kind.startswith("h5ad"):
        change = {"h5ad-rows": sparse.csr_matrix, "h5ad-columns": sparse.csc_matrix}
        obs, var = pd.DataFrame(index=rows), pd.DataFrame(index=columns)
        stored = change.get(kind, np.asarray)(values)
        anndata.AnnData(X=stored, obs=obs, var=var).write_h5ad(path)
    elif kind == "gct":
        frame = frame.T
        frame.insert(0, "Description", "na")
        with path.open("w") as text:
            text.write(f"#1.2\n{COLUMNS}\t{ROWS}\n")
            frame.to_csv(text, sep="\t", index_label="NAME")
    elif kind == "matrix-market":
        path = folder / "matrix.mtx"
        scipy.io.mmwrite(path, sparse.coo_matrix(values.T))
        (folder / "features.tsv").write_text("\n".join(columns))
        (folder / "samples.tsv").write_text("\n".join(rows))
    else:
        frame = frame.T if kind.endswith("-turned") else frame
        (frame.to_feather if kind == "feather" else frame.to_parquet)(path)
    sheet = folder / "samples.csv"
    pd.DataFrame({"sample_id": rows, "n": range(ROWS)}).to_csv(sheet, index=False)
    return path, sheet


def measured(code, path, sheet):
    """Return seconds and bytes above the start, in a process of its own."""
    here = str(Path(__file__).parent)
    filled = code.format(path=str(path), sheet=str(sheet))
    text = MEASURED.format(here=here, imports=IMPORTS, code=filled)
    done = subprocess.run(
        [sys.executable, "-c", text], capture_output=True, check=True, text=True
    )
    return json.loads(done.stdout.splitlines()[-1])


def reading(kind):
    with tempfile.TemporaryDirectory() as folder:
        path, sheet = write(kind, Path(folder))
        ours, others = [], []
        for _ in range(ROUNDS):
            ours.append(measured(PANELKIT, path, sheet))
            others.append(measured(OTHERS[kind], path, sheet))
        size = path.stat().st_size
    whole = ROWS * COLUMNS * 8
    return {
        "file_bytes": size,
        "seconds": {"panelkit": [o[0] for o in ours], "other": [o[0] for o in others]},
        "ratio_time": measure.paired_ratio(
            [o[0] for o in ours], [o[0] for o in others]
        ),
        "peak_over_matrix": max(o[1] for o in ours) / whole,
        "peak_over_matrix_other": max(o[1] for o in others) / whole,
    }


if __name__ == "__main__":
    measure.write_json(
        Path(sys.argv[2]), f"reading {sys.argv[1]}", reading(sys.argv[1])
    )
