"""Who may import whom: the table of the design, imports inside functions included."""

from graphlib import CycleError, TopologicalSorter

import pytest

ERRORS = frozenset({"errors"})
BELOW_WORKFLOW = {
    "records": ERRORS,
    "config": ERRORS,
    "metrics": ERRORS,
    "runtime": ERRORS | {"records"},
    "ingest": ERRORS | {"records", "config", "metrics", "runtime"},
    "preparation": ERRORS | {"records", "config"},
    "fits": ERRORS | {"records", "config", "runtime"},
    "stability": ERRORS | {"records", "config", "runtime", "metrics", "fits"},
    "sizing": ERRORS | {"records", "config", "metrics"},
    "costing": ERRORS
    | {
        "records",
        "config",
        "runtime",
        "metrics",
        "preparation",
        "fits",
        "stability",
    },
    "lock": ERRORS | {"records", "config", "metrics", "preparation", "fits"},
    "report": ERRORS | {"records"},
}
MAY_IMPORT = {
    "errors": frozenset(),
    **BELOW_WORKFLOW,
    "workflow": ERRORS | frozenset(BELOW_WORKFLOW),
    "cli": ERRORS | {"records", "config", "runtime", "workflow"},
    "__main__": frozenset({"cli"}),
}
DOORS = {
    ("panelkit.__main__", "panelkit.cli.app"): "the command line has one door, and "
    "`panelkit.cli` itself stays empty so that `panelkit --help` starts at once",
}
SHARED_KERNELS = "panelkit.fits.kernel_algebra"
RINGS = {("panelkit.fits.families", "panelkit.fits.engine")}
LOADS_BY_NAME = {
    "panelkit": "public names are loaded when they are first used",
    "panelkit.cli.app": "a command is loaded when it is called",
    "panelkit.cli.size": "a question is loaded when it is asked",
}


def of_panelkit(source):
    return [each for each in source.imports if each.target.split(".")[0] == "panelkit"]


def test_reader_sees_every_kind_of_import(imports_in):
    """A walk that misses one of these kinds would let it through everywhere."""
    text = (
        "import panelkit.fits\n"
        "from panelkit import costing\n"
        "from panelkit.ingest import read_cohort\n"
        "from typing import TYPE_CHECKING\n"
        "if TYPE_CHECKING:\n    import pandas\n"
        "def late():\n    from panelkit.report import render\n"
        "class Kind:\n    import numba\n"
    )
    found = imports_in(text, {"panelkit.costing", "panelkit.ingest"})
    assert [each.target for each in found] == [
        "panelkit.fits",
        "panelkit.costing",
        "panelkit.ingest",
        "typing",
        "pandas",
        "panelkit.report",
        "numba",
    ]
    assert [each.target for each in found if each.only_for_types] == ["pandas"]
    assert [each.target for each in found if each.inside_function] == [
        "panelkit.report"
    ]


def test_every_package_has_a_row_in_the_table(sources):
    packages = {source.package for source in sources.values()} - {"panelkit"}
    assert packages <= set(MAY_IMPORT)


def test_packages_import_only_what_the_table_allows(sources):
    wrong = [
        f"{source.place}:{each.line} imports {each.target}"
        for source in sources.values()
        if source.name != "panelkit"
        for each in of_panelkit(source)
        if (package := each.target.partition(".")[2].partition(".")[0])
        != source.package
        and package not in MAY_IMPORT[source.package]
    ]
    assert wrong == []


def test_the_front_door_imports_for_types_only(sources):
    """`import panelkit` must cost nothing: a plain import here would load the lot."""
    wrong = [
        each.target
        for each in of_panelkit(sources["panelkit"])
        if not each.only_for_types
    ]
    assert wrong == []


def test_across_packages_only_the_package_is_imported(sources):
    wrong = [
        f"{source.place}:{each.line} imports {each.target}"
        for source in sources.values()
        for each in of_panelkit(source)
        if each.target.count(".") > 1
        and each.target.split(".")[1] != source.package
        and (source.name, each.target) not in DOORS
    ]
    assert wrong == []


def test_inside_a_package_the_sibling_file_is_imported(sources):
    """Importing one's own package is a ring that works until the order changes."""
    wrong = [
        f"{source.place}:{each.line} imports its own package"
        for source in sources.values()
        for each in of_panelkit(source)
        if source.name.count(".") > 1 and each.target == f"panelkit.{source.package}"
    ]
    assert wrong == []


def test_no_relative_import(sources):
    wrong = [
        f"{source.place}:{each.line}"
        for source in sources.values()
        for each in source.imports
        if each.target.startswith(".")
    ]
    assert wrong == []


def test_kernels_import_the_shared_kernels_at_most(sources):
    """The kernel cache sees an edit in a kernel file, not in any other."""
    kernels = [
        source
        for source in sources.values()
        if source.name.startswith("panelkit.fits.kernel_")
        and source.name != "panelkit.fits.kernel_cache"
    ]
    assert SHARED_KERNELS in {source.name for source in kernels}
    wrong = [
        f"{source.place}:{each.line} imports {each.target}"
        for source in kernels
        for each in of_panelkit(source)
        if source.name == SHARED_KERNELS or each.target != SHARED_KERNELS
    ]
    assert wrong == []


def check_no_ring(sources, left_out):
    graph = {
        source.name: {
            each.target
            for each in of_panelkit(source)
            if each.target != "panelkit" and (source.name, each.target) not in left_out
        }
        for source in sources.values()
    }
    try:
        order = tuple(TopologicalSorter(graph).static_order())
    except CycleError as error:
        ring = " -> ".join(error.args[1])
        raise AssertionError(f"modules import one another in a ring: {ring}") from None
    assert order.index("panelkit.errors") < order.index("panelkit.workflow")


def test_the_module_graph_has_no_ring(sources):
    """Imports inside functions count: they are where rings hide."""
    check_no_ring(sources, RINGS)


@pytest.mark.parametrize("ring", RINGS)
def test_rings_that_are_known(sources, ring):
    check_no_ring(sources, RINGS - {ring})


def test_nothing_else_is_loaded_by_name(sources):
    """`import_module` would go round every test of this file."""
    found = {
        source.name
        for source in sources.values()
        if "import_module" in source.path.read_text(encoding="utf-8")
        or "__import__" in source.path.read_text(encoding="utf-8")
    }
    assert found == set(LOADS_BY_NAME)
