"""One tree of seeds: every random draw has a place of its own in it.

All subsamples and folds are drawn before the first fit, each from its own branch,
so no result depends on the order of work, on blocks or on workers.
"""

import hashlib

import numpy as np

__all__ = ["generator"]


def generator(seed: int, *path: str | int) -> np.random.Generator:
    """Return the random generator at one place of the seed tree.

    Parameters
    ----------
    seed : int
        Seed of the study, 0 or larger.
    *path : str or int
        The place: stage, then block, then whatever is drawn there.

    Returns
    -------
    numpy.random.Generator
        Independent of every other place of the same tree.
    """
    key = [
        int.from_bytes(hashlib.sha256(part.encode()).digest()[:4], "big")
        if isinstance(part, str)
        else int(part)
        for part in path
    ]
    return np.random.default_rng(np.random.SeedSequence(seed, spawn_key=key))
