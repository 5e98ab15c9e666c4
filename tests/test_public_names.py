"""What `import panelkit` hands out, and how it is called."""

import importlib
import runpy
import subprocess
import sys
from pathlib import Path

import pytest

import panelkit

REPOSITORY = Path(__file__).parents[1]
NAMES = {
    "LockedPanel": "panelkit.workflow",
    "PanelkitError": "panelkit.errors",
    "StabilitySelector": "panelkit.stability",
    "cheapest_cover": "panelkit.costing",
    "check_cohort": "panelkit.ingest",
    "check_study": "panelkit.workflow",
    "draft_study": "panelkit.workflow",
    "fit_paths": "panelkit.fits",
    "lock_panel": "panelkit.workflow",
    "open_set_aside": "panelkit.workflow",
    "programme_cost": "panelkit.costing",
    "read_cohort": "panelkit.ingest",
    "read_openings": "panelkit.ingest",
    "run_shortlist": "panelkit.workflow",
    "recalibrate_panel": "panelkit.workflow",
    "run_study": "panelkit.workflow",
    "score_table": "panelkit.workflow",
    "validate_panel": "panelkit.workflow",
}
IMPORT = "import sys, panelkit\nassert {home!r} not in sys.modules\npanelkit.{name}\n"


def test_the_names_are_these():
    assert panelkit.__all__ == sorted(NAMES)
    assert dir(panelkit) == sorted(NAMES)


@pytest.mark.parametrize(("name", "home"), NAMES.items())
def test_a_name_is_what_its_home_has(name, home):
    module = importlib.import_module(home)
    assert getattr(panelkit, name) is getattr(module, name)
    assert name in module.__all__


@pytest.mark.parametrize("name", ["PanelkitError", "read_cohort", "run_study"])
def test_a_name_is_loaded_when_it_is_used(name):
    """In a process of its own: here everything has been loaded by other tests."""
    code = IMPORT.format(home=NAMES[name], name=name)
    done = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, check=False, text=True
    )
    assert done.returncode == 0, done.stderr


def test_an_unknown_name_is_an_attribute_error():
    """Anything else would break `hasattr` and `from panelkit import ...`."""
    assert not hasattr(panelkit, "no_such_name")
    with pytest.raises(AttributeError, match="'no_such_name'"):
        panelkit.no_such_name  # noqa: B018 - asking is the test
    with pytest.raises(ImportError):
        from panelkit import no_such_name  # noqa: F401


def test_star_import():
    names = {}
    exec("from panelkit import *", names)
    assert set(NAMES) <= set(names)


def test_signatures():
    made = runpy.run_path(str(REPOSITORY / "tests" / "records" / "write_committed.py"))
    committed = REPOSITORY / "tests" / "public_signatures.txt"
    assert committed.read_text(encoding="utf-8") == made["signatures"](), (
        "a public function is called in another way than tests/public_signatures.txt "
        "says. Say it in CHANGELOG.md where users must change their calls, then run "
        f"{made['COMMAND']}"
    )
