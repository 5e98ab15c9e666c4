"""What is loaded before any work begins."""

import json
import subprocess
import sys

import pytest

ASKED = """
import sys
before = set(sys.modules)
{code}
tops = {{name.partition(".")[0] for name in set(sys.modules) - before}}
import json
print(json.dumps(sorted(tops - set(sys.stdlib_module_names))), file=sys.stderr)
"""
HELP = """
from panelkit.cli.app import main
try:
    main(["--help"])
except SystemExit as left:
    assert left.code == 0, left.code
"""


def loaded_by(code):
    done = subprocess.run(
        [sys.executable, "-c", ASKED.format(code=code)],
        capture_output=True,
        check=True,
        text=True,
    )
    return set(json.loads(done.stderr.splitlines()[-1])), done.stdout


def test_help_loads_nothing_but_click():
    """Pinned: one import at the top of a command would bring the lot."""
    tops, shown = loaded_by(HELP)
    assert "Usage: panelkit" in shown
    assert all(name in shown for name in ("draft", "check", "price", "run"))
    assert tops == {"click", "panelkit"}


@pytest.mark.parametrize(
    "code",
    ["import panelkit; dir(panelkit)", "import panelkit; panelkit.PanelkitError"],
)
def test_the_front_door_loads_nothing(code):
    assert loaded_by(code)[0] == {"panelkit"}


def test_records_load_numpy_alone():
    """Records cross every border: what they load, everybody pays for."""
    assert loaded_by("import panelkit.records")[0] == {"numpy", "panelkit"}
