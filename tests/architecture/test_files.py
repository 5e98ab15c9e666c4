"""Sizes and names of files, and what must not be written in them."""

MOST_LINES = 700
TOO_LONG = {  # each with its reason
    "sample_cohorts/make_quillmere.py": "one script, read from top to bottom",
    "tests/costing/test_programme_cost.py": "expected figures typed in line",
}
VAGUE = {"utils", "util", "helpers", "helper", "common", "base", "misc", "shared"}
TOP_LEVEL = {
    "CHANGELOG.md",
    "DEVELOPERS.md",
    "LICENSE",
    "README.md",
    "configs",
    "constraints.txt",
    "panelkit",
    "pyproject.toml",
    "sample_cohorts",
    "tests",
}
MACHINE_FOLDERS = [f"/{name}/" for name in ("home", "root", "tmp", "work", "Users")]
BINARY = {".gz", ".h5ad", ".png", ".npz"}


def lines(path):
    return len(path.read_text(encoding="utf-8").splitlines())


def test_no_module_is_longer_than_it_may_be(repository, repository_files):
    long = [
        f"{name}: {count} lines"
        for name in repository_files
        if name.suffix == ".py"
        and name.as_posix() not in TOO_LONG
        and (count := lines(repository / name)) >= MOST_LINES
    ]
    assert long == []


def test_names_say_what_is_inside(repository_files):
    vague = [
        name.as_posix()
        for name in repository_files
        if VAGUE & {part.strip("_") for part in (*name.parent.parts, name.stem)}
    ]
    assert vague == []


def test_the_top_level_is_fixed(repository_files):
    found = {name.parts[0] for name in repository_files}
    assert {name for name in found if not name.startswith(".")} <= TOP_LEVEL


def test_no_path_of_a_machine_is_written_down(repository, repository_files):
    wrong = []
    for name in repository_files:
        if name.suffix in BINARY:
            continue
        text = (repository / name).read_text(encoding="utf-8")
        wrong += [f"{name}: {each}" for each in MACHINE_FOLDERS if each in text]
    assert wrong == []


def test_tests_have_no_init_file(repository_files):
    """`--import-mode=importlib` needs none; one of them would shadow the package."""
    tests = [name for name in repository_files if name.parts[0] == "tests"]
    assert tests
    assert [name for name in tests if name.stem == "__init__"] == []
