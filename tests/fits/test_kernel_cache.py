"""Compiled kernels are kept where the user may write, under a name of their own."""

import subprocess
import sys
from pathlib import Path

import pytest
from numba.core import config

from panelkit.fits import kernel_cache as cache

needs_xdg = pytest.mark.skipif(
    not sys.platform.startswith("linux"), reason="names the cache folder of Linux"
)


@needs_xdg
def test_folder_lies_in_the_users_cache(tmp_path, monkeypatch):
    monkeypatch.setenv("XDG_CACHE_HOME", str(tmp_path))
    folder = cache.kernel_folder()
    assert folder.parent == tmp_path / "panelkit"
    assert folder.is_dir()
    assert list(folder.iterdir()) == []  # the trial file is gone
    assert cache.kernel_folder() == folder


@needs_xdg
def test_relative_cache_home_is_ignored(tmp_path, monkeypatch):
    # the specification of base directories says so
    monkeypatch.setenv("XDG_CACHE_HOME", "not/absolute")
    monkeypatch.setenv("HOME", str(tmp_path))
    assert cache.kernel_folder().is_relative_to(tmp_path / ".cache" / "panelkit")


@needs_xdg
def test_unwritable_cache_home_falls_back_to_a_private_folder(tmp_path, monkeypatch):
    file = tmp_path / "a file"
    file.write_text("in the way")
    monkeypatch.setenv("XDG_CACHE_HOME", str(file))
    monkeypatch.setattr("tempfile.tempdir", str(tmp_path))
    folder = cache.kernel_folder()
    assert folder.parent == tmp_path
    assert folder.is_dir()
    assert folder.stat().st_mode & 0o077 == 0
    assert cache.kernel_folder() != folder  # nobody else can have prepared it


def test_missing_home_falls_back_to_a_private_folder(tmp_path, monkeypatch):
    def nowhere():
        raise RuntimeError("no home folder")

    monkeypatch.setattr(cache, "_cache_home", nowhere)
    monkeypatch.setattr("tempfile.tempdir", str(tmp_path))
    assert cache.kernel_folder().parent == tmp_path


@needs_xdg
def test_name_follows_the_kernel_sources(tmp_path, monkeypatch):
    monkeypatch.setenv("XDG_CACHE_HOME", str(tmp_path / "cache"))
    package = tmp_path / "package"
    package.mkdir()
    for name in ("kernel_paths.py", "kernel_small.py", "engine.py"):
        package.joinpath(name).write_text(f"# {name}\n")
    monkeypatch.setattr(cache, "__file__", str(package / "kernel_cache.py"))
    first = cache.kernel_folder().name
    package.joinpath("engine.py").write_text("# changed, but no kernel\n")
    assert cache.kernel_folder().name == first
    package.joinpath("kernel_small.py").write_text("# changed\n")
    second = cache.kernel_folder().name
    assert second != first
    monkeypatch.setattr("numba.__version__", "0.0")
    assert cache.kernel_folder().name not in (first, second)


def test_setting_of_numba_is_given_back(tmp_path, monkeypatch):
    monkeypatch.setattr(cache, "kernel_folder", lambda: tmp_path)
    before = config.CACHE_DIR
    with cache.kernel_cache():
        assert Path(config.CACHE_DIR) == tmp_path
    assert before == config.CACHE_DIR

    @cache.kernel_cache()
    def fail():
        raise KeyError

    with pytest.raises(KeyError):
        fail()
    assert before == config.CACHE_DIR


FITS = """
import warnings
warnings.simplefilter("error")  # numba warns of a kernel that it cannot cache
import numpy as np
from panelkit.fits import fit_panels, fit_paths
from panelkit.fits import kernel_algebra, kernel_grouped, kernel_paths, kernel_scalar
draws = np.random.default_rng(0)
X, y = draws.normal(size=(40, 30)), np.tile([0, 1, 2, 3], 10)
outcomes = {
    "gaussian": y, "binomial": y % 2, "multinomial": y, "cox": (y + 1.0, np.ones(40))
}
panel, ones = [np.array([0, 2])], np.ones(40)
for family, outcome in outcomes.items():
    fit_paths(X, outcome, family=family, n_penalties=3)
    fit_panels(X.T.copy(), panel, outcome, ones, ones[:1], family=family)
modules = kernel_algebra, kernel_grouped, kernel_paths, kernel_scalar
stats = [k.stats for m in modules for k in vars(m).values() if hasattr(k, "stats")]
print(sum(sum(s.cache_hits.values()) for s in stats))
print(sum(sum(s.cache_misses.values()) for s in stats))
"""


def test_a_second_process_compiles_nothing():
    """Every kernel of every family can be cached, and is found again."""
    command = [sys.executable, "-c", FITS]
    for _ in range(2):
        run = subprocess.run(command, capture_output=True, text=True, check=True)
    hits, misses = map(int, run.stdout.split())
    assert hits > 10
    assert misses == 0
