"""The sources of the package as syntax trees, and the files of the repository."""

import ast
import subprocess
from dataclasses import dataclass
from pathlib import Path

import pytest

REPOSITORY = Path(__file__).parents[2]
PACKAGE = REPOSITORY / "panelkit"


@dataclass(frozen=True)
class Import:
    """One module that a file imports, wherever in the file the import stands."""

    target: str
    line: int
    only_for_types: bool
    inside_function: bool


@dataclass(frozen=True)
class Source:
    """One module of the package."""

    path: Path
    name: str
    tree: ast.Module
    imports: tuple[Import, ...]

    @property
    def package(self):
        """Package of the table of imports: `panelkit.fits.paths` is of `fits`."""
        parts = self.name.split(".")
        return parts[1] if len(parts) > 1 else "panelkit"

    @property
    def place(self):
        """Path inside the package, for messages."""
        return self.path.relative_to(PACKAGE).as_posix()


def module_name(path):
    parts = path.relative_to(REPOSITORY).with_suffix("").parts
    return ".".join(parts[:-1] if parts[-1] == "__init__" else parts)


def is_type_checking(test):
    return (isinstance(test, ast.Name) and test.id == "TYPE_CHECKING") or (
        isinstance(test, ast.Attribute) and test.attr == "TYPE_CHECKING"
    )


def targets(node, known):
    """Return the modules that one import statement names.

    `from panelkit import fits` names the module `panelkit.fits`; `from panelkit.fits
    import fit_paths` names `panelkit.fits`, since no module is called like that.
    """
    if isinstance(node, ast.Import):
        return [alias.name for alias in node.names]
    if node.level:
        return ["." * node.level + (node.module or "")]
    inner = [f"{node.module}.{alias.name}" for alias in node.names]
    modules = [name for name in inner if name in known]
    rest = len(modules) < len(inner)
    return modules + ([node.module] if rest else [])


def imports_of(tree, known):
    """Return every import of a file, those inside functions included."""
    found = []

    def walk(node, only_for_types, inside_function):
        if isinstance(node, ast.Import | ast.ImportFrom):
            found.extend(
                Import(target, node.lineno, only_for_types, inside_function)
                for target in targets(node, known)
            )
        inside = inside_function or isinstance(
            node, ast.FunctionDef | ast.AsyncFunctionDef | ast.Lambda
        )
        guarded = isinstance(node, ast.If) and is_type_checking(node.test)
        for child in ast.iter_child_nodes(node):
            typed = only_for_types or (guarded and child in node.body)
            walk(child, typed, inside)

    walk(tree, False, False)
    return tuple(found)


@pytest.fixture(scope="session")
def imports_in():
    """Read the imports of a piece of text, to test the reader itself."""

    def read(text, known=()):
        return imports_of(ast.parse(text), set(known))

    return read


@pytest.fixture(scope="session")
def sources():
    """Every module of the package, by name."""
    paths = sorted(PACKAGE.rglob("*.py"))
    trees = {path: ast.parse(path.read_text(encoding="utf-8")) for path in paths}
    known = {module_name(path) for path in paths}
    # `programme_cost` is a module and the function that its package hands out
    for path, tree in trees.items():
        if path.name == "__init__.py":
            known -= {
                f"{module_name(path)}.{alias.name}"
                for node in tree.body
                if isinstance(node, ast.ImportFrom)
                for alias in node.names
            }
    found = {}
    for path, tree in trees.items():
        name = module_name(path)
        found[name] = Source(path, name, tree, imports_of(tree, known))
    return found


@pytest.fixture(scope="session")
def repository():
    return REPOSITORY


@pytest.fixture(scope="session")
def repository_files():
    """Every file that is or will be tracked, relative to the repository."""
    asked = subprocess.run(
        ["git", "ls-files", "-z", "--cached", "--others", "--exclude-standard"],
        cwd=REPOSITORY,
        capture_output=True,
        check=False,
        text=True,
    )
    if asked.returncode:
        pytest.skip("not a checkout: which files are tracked is not known")
    names = sorted(set(asked.stdout.split("\0")) - {""})
    return [Path(name) for name in names if (REPOSITORY / name).is_file()]
