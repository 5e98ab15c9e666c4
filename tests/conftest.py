"""Open cohorts that may be used, but not committed: `pytest --cohorts=DIR`.

DIR holds a folder a cohort, with `expression.csv.gz` and `samples.csv`. Without the
option, or without the folder, tests marked `cohorts` are skipped and counted.
"""

from pathlib import Path

import pytest


def pytest_addoption(parser):
    parser.addoption(
        "--cohorts", type=Path, default=None, help="folder with open cohorts to read"
    )


def pytest_collection_modifyitems(config, items):
    if config.getoption("--cohorts") is not None:
        return
    skip = pytest.mark.skip(reason="needs --cohorts=DIR")
    for item in items:
        if item.get_closest_marker("cohorts"):
            item.add_marker(skip)


@pytest.fixture
def open_cohort(request):
    """Return the two files of an open cohort by its name."""

    def files(name):
        folder = request.config.getoption("--cohorts") / name
        if not folder.is_dir():
            pytest.skip(f"the folder of --cohorts has no {name}")
        return folder / "expression.csv.gz", folder / "samples.csv"

    return files
