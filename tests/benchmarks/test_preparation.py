"""Cost of a fold's preparation beside its fits; figures only, nothing is asserted."""

import json
import subprocess
import sys
from pathlib import Path

import pytest

pytestmark = pytest.mark.bench


def test_preparation(results_folder, capsys):
    """A process of its own, so that peak memory is its own."""
    path = results_folder / "preparation.json"
    script = Path(__file__).with_name("preparation_jobs.py")
    subprocess.run([sys.executable, str(script), str(path)], check=True)
    found = json.loads(path.read_text())
    if "skipped" in found:
        pytest.skip(found["skipped"])
    with capsys.disabled():
        for name, figures in found["recipes"].items():
            sys.stdout.write(f"\n{name}: {json.dumps(figures)}")
