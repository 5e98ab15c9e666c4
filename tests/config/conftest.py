"""Study files that tests write, spoil and read."""

import json
import tomllib
from pathlib import Path

import pytest

from panelkit.config import read_study
from panelkit.errors import StudyFileError

REPOSITORY = Path(__file__).parents[2]
COHORT = '[cohort]\nexpression = "e.csv"\n'
PLATFORM = "[platform.{name}]\npositions = 96\n"


@pytest.fixture(scope="session")
def repository():
    return REPOSITORY


@pytest.fixture
def study(tmp_path):
    """Read a study of the given text, behind the least that it needs."""

    def read(text="", head=COHORT):
        path = tmp_path / "study.toml"
        path.write_text(head + text, encoding="utf-8")
        return read_study(path)

    return read


@pytest.fixture
def refused(study):
    """Read a wrong study; return the error after checking that it is a sentence."""

    def read(text="", head=COHORT):
        with pytest.raises(StudyFileError) as caught:
            study(text, head)
        check_sentence(caught.value)
        return caught.value

    return read


def check_sentence(error):
    assert error.exit_code == 2
    assert "\n" not in str(error)
    assert all(error.as_dict().values())
    assert str(error) == (
        f"{error.where}: {error.what}; {error.accepted}. {error.next_step}."
    )


@pytest.fixture(scope="session")
def sentence():
    return check_sentence


@pytest.fixture(scope="session")
def as_json():
    """Return a TOML file as JSON would carry it: decimals as numbers."""

    def read(path):
        return json.loads(json.dumps(tomllib.loads(Path(path).read_text())))

    return read
