"""Where compiled kernels are kept.

Kernels are cached in a folder of the user's own, named by a hash of the kernel
sources, the numba version and the processor, so that an edit, an upgrade or
another machine never meets a stale file. Where that folder cannot be written, a
private temporary folder serves for this process. The package folder itself is
never written to: a read-only installation works.
"""

import hashlib
import os
import sys
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import llvmlite.binding
import numba
from numba.core import config

__all__ = ["kernel_cache", "kernel_folder"]

_CACHE_HOMES = {"win32": "LOCALAPPDATA", "linux": "XDG_CACHE_HOME"}


def _cache_home() -> Path:
    named = os.environ.get(_CACHE_HOMES.get(sys.platform, ""), "")
    if named and Path(named).is_absolute():
        return Path(named)
    if sys.platform == "darwin":
        return Path.home() / "Library" / "Caches"
    return Path.home() / ".cache"


def _fingerprint() -> str:
    digest = hashlib.sha256()
    for source in sorted(Path(__file__).parent.glob("kernel_*.py")):
        digest.update(source.read_bytes())
    digest.update(numba.__version__.encode())
    digest.update(llvmlite.binding.get_host_cpu_name().encode())
    digest.update(llvmlite.binding.get_host_cpu_features().flatten().encode())
    return digest.hexdigest()[:16]


def kernel_folder() -> Path:
    """Return the folder for compiled kernels, made and checked for writing.

    Returns
    -------
    Path
        The user's cache folder, or a private temporary one where that fails.
    """
    try:
        folder = _cache_home() / "panelkit" / f"kernels-{_fingerprint()}"
        folder.mkdir(parents=True, exist_ok=True)
        with tempfile.TemporaryFile(dir=folder):
            return folder
    except (OSError, RuntimeError):  # RuntimeError: no home folder at all
        return Path(tempfile.mkdtemp(prefix="panelkit-kernels-"))


@contextmanager
def kernel_cache() -> Iterator[None]:
    """Point numba's cache at `kernel_folder` while kernels are being decorated."""
    before: str = config.CACHE_DIR
    config.CACHE_DIR = str(kernel_folder())
    try:
        yield
    finally:
        config.CACHE_DIR = before
