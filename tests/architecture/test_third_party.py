"""Who owns which third-party package, with every exception and its reason."""

import sys
from fnmatch import fnmatch

OWNERS = {
    "anndata": {
        "ingest/*": "owner",
        "records/cohort.py": "Cohort.to_anndata, a face of the design",
    },
    "click": {"cli/*": "owner"},
    "h5py": {"ingest/*": "owner"},
    "jinja2": {"report/*": "owner"},
    "llvmlite": {"fits/kernel_cache.py": "names the processor that numba compiles for"},
    "markupsafe": {"report/*": "the text type of jinja2, which brings it"},
    "matplotlib": {"report/*": "owner"},
    "numba": {"fits/kernel*": "owner"},
    "numpy": {"*": "arrays are what records carry"},
    "openpyxl": {
        "ingest/*": "owner",
        "report/price_workbook.py": "spreadsheets with live formulas",
    },
    "pandas": {"ingest/*": "owner", "records/*": "to_frame"},
    "pyarrow": {"ingest/*": "owner"},
    "pydantic": {"config/*": "owner"},
    "pydantic_core": {"config/*": "its errors and schemas are pydantic's own"},
    "rich": {"cli/*": "owner"},
    "scipy": {
        "costing/*": "the exact cover is a mixed-integer programme",
        "fits/*": "special functions and linear algebra",
        "ingest/*": "Matrix Market files and sparse matrices",
        "metrics/*": "distributions of test statistics",
        "preparation/*": "no other package of ours has them",
        "sizing/*": "distributions",
        "stability/*": "clustering of companions, their ranks",
        "workflow/shortlist.py": "Student's quantile of the marker table",
    },
    "sklearn": {
        "preparation/*": "owner",
        "metrics/*": "owner",
        "stability/*": "owner",
        "costing/*": "owner",
    },
    "threadpoolctl": {
        "runtime/*": "blocks hold BLAS to one thread",
        "fits/*": "the engine holds BLAS to one thread",
    },
}
SLOW = ("anndata", "h5py", "openpyxl", "pandas", "pyarrow")


def third_party(source):
    """Return a module's imports that are neither ours nor the standard library's."""
    for each in source.imports:
        top = each.target.split(".")[0]
        if top not in sys.stdlib_module_names and top != "panelkit":
            yield top, each


def test_every_third_party_import_has_its_owner(sources):
    wrong = [
        f"{source.place}:{each.line} imports {top}"
        for source in sources.values()
        for top, each in third_party(source)
        if not any(fnmatch(source.place, owner) for owner in OWNERS.get(top, ()))
    ]
    assert wrong == []


def test_slow_packages_are_imported_inside_functions(sources):
    """A slow import at the top of a record would be paid by every command."""
    wrong = [
        f"{source.place}:{each.line} imports {top}"
        for source in sources.values()
        for top, each in third_party(source)
        if top in SLOW and not (each.inside_function or each.only_for_types)
    ]
    assert wrong == []


def test_the_table_would_notice_a_stranger(sources):
    """At least the known owners are seen: an empty walk would pass everything."""
    seen = {top for source in sources.values() for top, _each in third_party(source)}
    assert {"click", "matplotlib", "numba", "numpy", "pandas", "pydantic"} <= seen
    assert seen <= set(OWNERS)
