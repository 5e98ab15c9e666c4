"""`map_blocks`: independent blocks of work, remembered by what went into them."""

import hashlib
import json
import threading
from collections.abc import Callable, Mapping
from concurrent.futures import FIRST_EXCEPTION, Future, ThreadPoolExecutor, wait
from dataclasses import dataclass
from pathlib import Path
from typing import IO, Any, Protocol, TypeVar
from zipfile import BadZipFile

import numpy as np
from numpy.typing import NDArray
from threadpoolctl import threadpool_limits

from panelkit.runtime.files import write_whole
from panelkit.runtime.progress import Listener, Progress, silent

__all__ = [
    "BlockResult",
    "BlockStore",
    "FolderStore",
    "MemoryStore",
    "StageKey",
    "map_blocks",
]

BlockResult = Mapping[str, NDArray[Any]]
"""What a block hands back: named arrays, nothing else, so that any store, worker
or language can carry it. Text travels as arrays of fixed-width characters."""

T = TypeVar("T")
MARK = "array "  # keeps a block's names apart from the archive's own


@dataclass(frozen=True, slots=True)
class StageKey:
    """What a stage's results depend on.

    Attributes
    ----------
    stage : str
        Name of the stage; part of file names.
    inputs : str
        Hash of everything that determines the results.
    """

    stage: str
    inputs: str

    def block(self, name: str) -> str:
        """Return the key of one block, fit for a file name."""
        text = json.dumps([self.stage, name, self.inputs])
        return f"{self.stage}-{hashlib.sha256(text.encode()).hexdigest()[:24]}"


class BlockStore(Protocol):
    """Where finished blocks are kept."""

    def load(self, key: str) -> BlockResult | None:
        """Return a finished block, or None."""
        ...

    def save(self, key: str, result: BlockResult) -> None:
        """Keep a finished block."""
        ...


class MemoryStore:
    """Finished blocks of this process."""

    def __init__(self) -> None:
        self._blocks: dict[str, BlockResult] = {}

    def load(self, key: str) -> BlockResult | None:
        """Return a finished block, or None."""
        return self._blocks.get(key)

    def save(self, key: str, result: BlockResult) -> None:
        """Keep a finished block."""
        self._blocks[key] = result


class FolderStore:
    """Finished blocks as files, whole or not there.

    A damaged file counts as not there and is computed again.

    Parameters
    ----------
    folder : Path
        Made when the first block is kept.
    """

    def __init__(self, folder: Path) -> None:
        self._folder = folder

    def load(self, key: str) -> BlockResult | None:
        """Return a finished block, or None."""
        try:
            with (self._folder / f"{key}.npz").open("rb") as file:
                return _read_arrays(file)
        except (OSError, ValueError, EOFError, KeyError, RuntimeError, BadZipFile):
            return None

    def save(self, key: str, result: BlockResult) -> None:
        """Keep a finished block.

        Raises
        ------
        RunFolderError
            The file cannot be written.
        """
        arrays = {f"{MARK}{name}": value for name, value in result.items()}
        with write_whole(self._folder / f"{key}.npz") as file:
            np.savez(file, allow_pickle=False, names=np.array([*result]), **arrays)


def _read_arrays(file: IO[bytes]) -> BlockResult | None:
    """Return a block's arrays, or None where one that belongs to it is missing."""
    with np.load(file, allow_pickle=False) as archive:
        names = [str(name) for name in archive["names"]]
        if {"names", *(f"{MARK}{name}" for name in names)} != set(archive.files):
            return None
        return {name: archive[f"{MARK}{name}"] for name in names}


def map_blocks(
    task: Callable[[T], BlockResult],
    blocks: Mapping[str, T],
    key: StageKey,
    store: BlockStore,
    *,
    threads: int = 1,
    listener: Listener = silent,
) -> dict[str, BlockResult]:
    """Run a task on every block, skipping those that the store remembers.

    Parameters
    ----------
    task : callable
        Takes a block, returns named arrays; must depend on nothing else that varies.
    blocks : mapping of str to object
        Name of each block to what the task is given.
    key : StageKey
        What the results depend on.
    store : BlockStore
        Where finished blocks are kept.
    threads : int
        Blocks at work at the same time; BLAS is held to one thread in each.
    listener : callable
        Told of each finished block.

    Returns
    -------
    dict of str to mapping of str to ndarray
        In the order of `blocks`.

    Raises
    ------
    RunFolderError
        A finished block cannot be kept.
    """
    results: dict[str, BlockResult] = {}
    lock = threading.Lock()

    def finish(name: str, result: BlockResult, remembered: bool) -> None:
        with lock:
            results[name] = result
            listener(Progress(key.stage, len(results), len(blocks), remembered))

    def work(name: str) -> None:
        result = task(blocks[name])
        store.save(key.block(name), result)
        finish(name, result, False)

    missing = []
    for name in blocks:
        kept = store.load(key.block(name))
        if kept is None:
            missing.append(name)
        else:
            finish(name, kept, True)
    with threadpool_limits(1, "blas"):
        if threads == 1 or len(missing) < 2:
            for name in missing:
                work(name)
        else:
            _in_threads(work, missing, threads)
    return {name: results[name] for name in blocks}


def _in_threads(work: Callable[[str], None], names: list[str], threads: int) -> None:
    """Run the work; at the first failure, start nothing more and pass it on."""
    failed = threading.Event()

    def guarded(name: str) -> None:
        if failed.is_set():
            return
        finished = False
        try:
            work(name)
            finished = True
        finally:
            if not finished:
                failed.set()

    with ThreadPoolExecutor(threads) as pool:
        running: list[Future[None]] = [pool.submit(guarded, name) for name in names]
        try:
            wait(running, return_when=FIRST_EXCEPTION)
        finally:
            pool.shutdown(wait=True, cancel_futures=True)
    for future in running:
        if future.done() and not future.cancelled():
            future.result()
