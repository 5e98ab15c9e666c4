"""Where benchmark results go."""

from pathlib import Path

import pytest


def pytest_addoption(parser):
    parser.addoption(
        "--bench-out", default=None, help="folder for the benchmarks' JSON files"
    )


@pytest.fixture
def results_folder(request, tmp_path):
    asked = request.config.getoption("--bench-out", None)
    folder = Path(asked).absolute() if asked else tmp_path
    folder.mkdir(parents=True, exist_ok=True)
    return folder
