"""Text reading beside pandas and numpy: speed, memory; only equality is asserted."""

import json
import subprocess
import sys
from pathlib import Path

import pytest

pytestmark = pytest.mark.bench

JOBS = ("wide", "tall", "wide_all_digits", "wide_missing", "wide_gzip")


@pytest.mark.parametrize("job", JOBS)
def test_job(job, results_folder, capsys):
    path = results_folder / f"reading_{job}.json"
    script = Path(__file__).with_name("reading.py")
    subprocess.run([sys.executable, str(script), job, str(path)], check=True)
    found = json.loads(path.read_text())
    shown = {key: found[key] for key in ("median_s", "ratio", "peak_over_matrix")}
    with capsys.disabled():
        sys.stdout.write(f"\n{job}: {json.dumps(shown, indent=1)}\n")
    assert found["equal"]
