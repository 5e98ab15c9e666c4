"""The tree of errors: exit codes, the sentence, and the way across processes."""

import copy
import inspect
import pickle
import subprocess
import sys

import pytest

from panelkit import errors
from panelkit.errors import PanelkitError, name_some

PARTS = {
    "code": "unknown-key",
    "where": "study.toml, [accuracy], key 'fold'",
    "what": "no such key is known (got 'fold')",
    "accepted": "known are folds and repeats",
    "next_step": "Rename or remove the key",
}
EXIT_CODES = {
    "PanelkitError": 1,
    "UsageError": 2,
    "StudyFileError": 2,
    "InputDataError": 3,
    "FitError": 4,
    "NoPanelError": 5,
    "PanelFileError": 6,
    "RunFolderError": 7,
    "Interrupted": 130,
}


def test_exit_codes():
    found = {
        name: thing.exit_code
        for name, thing in vars(errors).items()
        if inspect.isclass(thing) and issubclass(thing, PanelkitError)
    }
    assert found == EXIT_CODES
    assert set(errors.__all__) == {*EXIT_CODES, "name_some"}


def test_the_tree_in_the_docstring_is_the_tree():
    lines = errors.__doc__.splitlines()
    for name in set(EXIT_CODES) - {"PanelkitError", "StudyFileError"}:
        line = next(line for line in lines if f"─ {name} " in line)
        assert str(EXIT_CODES[name]) in line.split()
    assert issubclass(errors.StudyFileError, errors.UsageError)


@pytest.mark.parametrize("name", EXIT_CODES)
def test_the_sentence(name):
    error = getattr(errors, name)(**PARTS)
    assert str(error) == (
        "study.toml, [accuracy], key 'fold': no such key is known (got 'fold'); known "
        "are folds and repeats. Rename or remove the key."
    )
    assert error.as_dict() == PARTS
    for part, value in PARTS.items():
        assert getattr(error, part) == value


@pytest.mark.parametrize("name", EXIT_CODES)
@pytest.mark.parametrize("protocol", range(pickle.HIGHEST_PROTOCOL + 1))
def test_pickling_keeps_the_parts(name, protocol):
    """An exception with keywords alone does not come back by itself."""
    error = getattr(errors, name)(**PARTS)
    back = pickle.loads(pickle.dumps(error, protocol))
    assert type(back) is type(error)
    assert back.as_dict() == PARTS
    assert str(back) == str(error)
    assert back.exit_code == error.exit_code


def test_copying_keeps_the_parts():
    error = errors.FitError(**PARTS)
    for made in (copy.copy(error), copy.deepcopy(error)):
        assert type(made) is errors.FitError
        assert made.as_dict() == PARTS


def test_pickling_keeps_notes():
    """In a process of its own: other packages change how exceptions are pickled."""
    code = (
        "import pickle\nfrom panelkit.errors import FitError\n"
        f"error = FitError(**{PARTS!r})\nerror.add_note('expression.csv, line 7')\n"
        "back = pickle.loads(pickle.dumps(error))\n"
        "assert getattr(back, '__notes__', []) == ['expression.csv, line 7']"
    )
    done = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, check=False
    )
    assert done.returncode == 0


@pytest.mark.parametrize("part", PARTS)
def test_every_part_is_asked_for(part):
    with pytest.raises(TypeError, match=part):
        PanelkitError(**{name: PARTS[name] for name in PARTS if name != part})


def test_parts_have_no_order():
    with pytest.raises(TypeError):
        PanelkitError(*PARTS.values())


@pytest.mark.parametrize(
    ("names", "limit", "phrase"),
    [
        ([], 5, ""),
        (["S1"], 5, "S1"),
        (["S1", "S2", "S3", "S4", "S5"], 5, "S1, S2, S3, S4, S5"),
        (["S1", "S2", "S3", "S4", "S5", "S6"], 5, "S1, S2, S3, S4, S5 and 1 more"),
        (range(42), 5, "0, 1, 2, 3, 4 and 37 more"),
        (["S1", "S2", "S3"], 2, "S1, S2 and 1 more"),
        ((name for name in "ab"), 5, "a, b"),
        ({"x": 1, "y": 2}, 5, "x, y"),
    ],
)
def test_name_some(names, limit, phrase):
    assert name_some(names, limit) == phrase


def test_name_some_shows_five_unless_told():
    assert name_some(range(42)) == "0, 1, 2, 3, 4 and 37 more"
