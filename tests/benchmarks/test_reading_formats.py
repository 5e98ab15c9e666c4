"""Time and memory of reading expression files; shown and written, never asserted.

The numbers themselves are compared in `tests/ingest/test_formats.py`.
"""

import json
import subprocess
import sys
from pathlib import Path

import pytest

pytestmark = pytest.mark.bench

HERE = Path(__file__).parent
FORMATS = (
    "parquet",
    "parquet-turned",
    "feather",
    "h5ad",
    "h5ad-rows",
    "h5ad-columns",
    "gct",
    "matrix-market",
)


@pytest.mark.parametrize("kind", FORMATS)
def test_reading_formats(kind, results_folder, capsys):
    path = results_folder / f"reading-{kind}.json"
    script = HERE / "reading_formats.py"
    subprocess.run([sys.executable, str(script), kind, str(path)], check=True)
    found = json.loads(path.read_text())
    shown = {key: found[key] for key in found if key.startswith(("ratio", "peak"))}
    with capsys.disabled():
        sys.stdout.write(f"\n{kind}: {json.dumps(shown)}\n")
    assert found["file_bytes"] > 0
