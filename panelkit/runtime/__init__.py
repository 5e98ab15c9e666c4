"""How work runs, never what: seeds, blocks, threads, progress, the run folder."""

from panelkit.runtime.blocks import (
    BlockResult,
    BlockStore,
    FolderStore,
    MemoryStore,
    StageKey,
    map_blocks,
)
from panelkit.runtime.files import hash_of_file, write_whole
from panelkit.runtime.progress import Listener, Progress, silent
from panelkit.runtime.run_folder import RunFolder, json_bytes
from panelkit.runtime.seeds import generator
from panelkit.runtime.threads import thread_count

__all__ = [
    "BlockResult",
    "BlockStore",
    "FolderStore",
    "Listener",
    "MemoryStore",
    "Progress",
    "RunFolder",
    "StageKey",
    "generator",
    "hash_of_file",
    "json_bytes",
    "map_blocks",
    "silent",
    "thread_count",
    "write_whole",
]
