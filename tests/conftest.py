"""What the whole suite shares: the folder of open cohorts that cannot be committed."""

from pathlib import Path

import pytest


def pytest_addoption(parser):
    parser.addoption(
        "--cohorts",
        metavar="DIR",
        default=None,
        help="folder of open cohorts (one folder each, with expression.csv.gz and "
        "samples.csv) for the tests marked `cohorts`; without it they are skipped",
    )


@pytest.fixture(scope="session")
def cohorts(request):
    """The folder given as --cohorts; without it the test is skipped and counted."""
    folder = request.config.getoption("--cohorts")
    if folder is None:
        pytest.skip("needs --cohorts DIR")
    return Path(folder)
