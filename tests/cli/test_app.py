"""The front of the command line: help, version, and what happens to errors."""

import subprocess
import sys
from importlib.metadata import version

import pytest
from click.testing import CliRunner

from panelkit.cli.app import COMMANDS
from panelkit.cli.app import panelkit as group
from panelkit.errors import (
    FitError,
    InputDataError,
    NoPanelError,
    PanelFileError,
    RunFolderError,
    StudyFileError,
)

PARTS = {
    "code": "some-code",
    "where": "here",
    "what": "it is wrong (got 3)",
    "accepted": "2 is accepted",
    "next_step": "Write 2",
}


@pytest.mark.parametrize("option", ["--help", "-h"])
def test_help_lists_every_command(panelkit, option):
    answer = panelkit(option)
    assert answer.code == 0
    assert answer.err == ""
    for name, says in COMMANDS.items():
        assert name in answer.out
        assert says in answer.out
    assert "For research and planning only." in answer.out


@pytest.mark.parametrize("name", COMMANDS)
def test_every_command_has_help(name):
    """The one-line description at the front is the first promise of the command."""
    result = CliRunner().invoke(group, [name, "--help"])
    assert result.exit_code == 0
    assert "Usage:" in result.output


def test_version(panelkit):
    answer = panelkit("--version")
    assert (answer.code, answer.out) == (0, f"panelkit {version('panelkit')}\n")


def test_as_a_module():
    done = subprocess.run(
        [sys.executable, "-m", "panelkit", "--version"],
        capture_output=True,
        check=False,
        text=True,
    )
    assert done.returncode == 0
    assert version("panelkit") in done.stdout
    assert done.stderr == ""


@pytest.mark.parametrize(
    ("kind", "code"),
    [
        (StudyFileError, 2),
        (InputDataError, 3),
        (FitError, 4),
        (NoPanelError, 5),
        (PanelFileError, 6),
        (RunFolderError, 7),
    ],
)
def test_an_error_becomes_its_exit_code(panelkit, monkeypatch, kind, code):
    def refuse(*_arguments, **_named):
        raise kind(**PARTS)

    monkeypatch.setattr("panelkit.cli.check.check_study", refuse)
    answer = panelkit("check", "study.toml")
    assert answer.code == code
    assert answer.err == (
        f"{kind.__name__} (some-code): here: it is wrong (got 3); 2 is accepted. "
        "Write 2.\n"
    )


def test_an_interruption_is_130_and_says_what_is_kept(panelkit, monkeypatch):
    def interrupt(*_arguments, **_named):
        raise KeyboardInterrupt

    monkeypatch.setattr("panelkit.cli.check.check_study", interrupt)
    answer = panelkit("check", "study.toml")
    assert answer.code == 130
    assert "Finished folds are kept" in answer.err
    assert "same command" in answer.err


def test_a_bug_keeps_its_traceback(monkeypatch):
    """Catching it would hide where it happened."""
    from panelkit.cli.app import main

    def fail(*_arguments, **_named):
        raise ZeroDivisionError

    monkeypatch.setattr("panelkit.cli.check.check_study", fail)
    with pytest.raises(ZeroDivisionError):
        main(["check", "study.toml"])
