"""Synthetic cohorts of the benchmarks, and their subsamples."""

import numpy as np

GROUP = 20  # features that share one factor: correlation one half
SIGNALS = 12
CHUNK = 8192


def cohort(n, p, family="binomial", dtype=np.float32, seed=0):
    """Return a feature-major matrix (p, n), its outcome and the labels to stratify by.

    The matrix is made in chunks: nothing of its size is held beside it.
    """
    generator = np.random.default_rng([seed, n, p])
    base = np.empty((p, n), dtype)
    for start in range(0, p, CHUNK):
        rows = min(CHUNK, p - start)
        factor = generator.standard_normal((-(-rows // GROUP), n), dtype=np.float32)
        own = generator.standard_normal((rows, n), dtype=np.float32)
        own += np.repeat(factor, GROUP, axis=0)[:rows]
        own *= np.float32(0.7)
        base[start : start + rows] = own
    outcome, labels = _outcome(base, family, generator)
    return base, outcome, labels


def _outcome(base, family, generator):
    p, n = base.shape
    signals = base[generator.choice(p, SIGNALS, replace=False)].astype(float).T
    score = signals @ generator.choice([-1.0, 1.0], SIGNALS)
    if family == "gaussian":
        return score + generator.normal(size=n), np.zeros(n)
    if family == "binomial":
        y = (generator.uniform(size=n) < 1.0 / (1.0 + np.exp(-score))).astype(float)
        return y, y
    if family == "cox":
        time = generator.exponential(size=n) * np.exp(-score)  # no ties
        event = (generator.uniform(size=n) < 0.7).astype(float)
        return (time, event), event
    scores = signals @ generator.normal(size=(SIGNALS, 4))
    labels = np.argmax(scores + generator.gumbel(size=(n, 4)), axis=1)
    return labels, labels


def halves(labels, count, seed=0, among=None):
    """Return the rows of `count` halves: complementary pairs, stratified."""
    generator = np.random.default_rng([seed, count])
    rows = np.arange(len(labels)) if among is None else among
    classes = [rows[labels[rows] == value] for value in np.unique(labels[rows])]
    found = []
    while len(found) < count:
        first, second = [], []
        for members in classes:
            shuffled = generator.permutation(members)
            half = len(members) // 2
            first.append(shuffled[:half])
            second.append(shuffled[half : 2 * half])
        found += [np.sort(np.concatenate(first)), np.sort(np.concatenate(second))]
    return found[:count]
