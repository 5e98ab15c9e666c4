"""What a pass decides: from graded candidates to the next penalty of every refit.

A refit without penalties takes them from its largest gradient; one with violators takes
them in and stays at its penalty; any other stores its solution and goes on to the next
penalty, with the working set that the strong rule lets in.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from panelkit.fits.refits import (
    DONE,
    ENTRIES,
    FRESH,
    PENDING,
    STEP,
    WORKING,
    Refits,
)

__all__ = ["Candidates", "DecisionRules", "decide", "take_in"]

NEAR = 0.999  # share of the penalty from which on a violating refit takes features in

Numbers = NDArray[np.int64]
Values = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class DecisionRules:
    """What holds for every refit of a block: see `engine.BlockSpecification`."""

    relative: bool
    mixing: float
    tol: float
    max_markers: int


@dataclass(frozen=True, slots=True, eq=False)
class Candidates:
    """The candidates of a pass, by refit; their columns stand behind the working sets.

    Attributes
    ----------
    refit, feature : ndarray of shape (n,), int64
        Pairs, ascending.
    borders : ndarray of shape (B + 1,), int64
        Where each refit's pairs begin.
    moments : ndarray of shape (n, 2)
        Mean and deviation on the refit's rows; deviation 0 for a constant column.
    gradient : ndarray of shape (n,)
        Norm of the gradient over the linear predictors, over the feature weight.
    """

    refit: Numbers
    feature: Numbers
    borders: Numbers
    moments: Values
    gradient: Values


def strong_threshold(now: Values, before: Values) -> Values:
    """Return the sequential strong rule's threshold, never below half the penalty."""
    return np.maximum(2.0 * now - before, 0.5 * now)


def decide(
    refits: Refits,
    live: Numbers,
    rules: DecisionRules,
    found: Candidates,
    weights: Values,
) -> NDArray[np.bool_]:
    """Decide for every living refit which penalty is to be solved next.

    Parameters
    ----------
    refits : Refits
        Changed in place.
    live : ndarray of int64
        Refits that are not done, ascending.
    rules : DecisionRules
        Of the block.
    found : Candidates
        What the pass found for them.
    weights : ndarray of shape (n_features,)
        Feature weights.

    Returns
    -------
    ndarray of shape (n,), bool
        Which candidates were taken into their refit's working set.
    """
    n_refits, n_penalties = refits.penalties.shape
    state = refits.state
    worst = np.zeros(n_refits)
    np.fmax.at(worst, found.refit, found.gradient)
    step, fresh = state[live, STEP], state[live, FRESH] == 1
    unknown, again, on_path = live[step < 0], live[fresh], live[(step >= 0) & ~fresh]
    unit = refits.penalties[on_path, state[on_path, STEP]] * rules.mixing
    off = worst[on_path] > unit * (1.0 + rules.tol)
    violated, solved = on_path[off], on_path[~off]

    state[live, PENDING] = 0
    state[again, FRESH] = 0
    goes = np.zeros(n_refits, np.bool_)
    goes[live] = True
    goes[_open_paths(refits, unknown, worst, rules)] = False
    before = refits.largest.copy()  # the penalty that the strong rule starts from
    # violators: these refits stay at their penalty while the others go on
    held = state[violated, STEP]
    last = refits.penalties[violated, np.maximum(held - 1, 0)]
    before[violated] = np.where(
        held > 0, np.minimum(before[violated], last), before[violated]
    )
    before[solved] = _go_on(refits, solved, worst[solved] / unit[~off] - 1.0)

    ends = (state[:, STEP] == n_penalties) | (state[:, ENTRIES] >= rules.max_markers)
    state[goes & ends, DONE] = 1
    going = np.flatnonzero(goes & ~ends)
    refits.now[going] = refits.penalties[going, state[going, STEP]]
    state[going, PENDING] = 1
    strong = np.full(n_refits, np.inf)
    strong[going] = rules.mixing * strong_threshold(refits.now[going], before[going])
    return _enlarge(refits, strong, violated, rules.mixing, found, weights)


def _enlarge(
    refits: Refits,
    strong: Values,
    violated: Numbers,
    mixing: float,
    found: Candidates,
    weights: Values,
) -> NDArray[np.bool_]:
    """Take the features in that the strong rule lets through, and all violators.

    strong: threshold of each refit, infinite where nothing is to be solved. Returns
    which candidates were taken.
    """
    keep = strong.copy()
    keep[violated] = refits.now[violated] * mixing * NEAR
    gradient = found.gradient
    accepted = (gradient >= keep[found.refit]) & (gradient > 0.0)
    refit, at = take_in(refits, found, accepted, weights)
    # a violator failed the strong rule: it comes behind, the larger first
    late = np.isin(refit, violated)
    gradient = gradient[accepted]
    rank = strong[refit] * gradient / (gradient + refits.now[refit])
    refits.grad_before[refit, at] = np.where(late, rank, gradient)
    return accepted


def _open_paths(
    refits: Refits, unknown: Numbers, worst: Values, rules: DecisionRules
) -> Numbers:
    """Set penalties from the largest gradients; return the refits that must ask again.

    At or above the largest penalty nothing is picked and no solve is needed.
    """
    # nothing usable came the first time: ask for everything
    empty = (worst[unknown] <= 0.0) & (refits.largest[unknown] == 0.0)
    refits.largest[unknown[empty]] = -1.0
    opened = unknown[~empty]
    largest = worst[opened] / rules.mixing
    refits.largest[opened] = largest
    if rules.relative:
        refits.penalties[opened] *= largest[:, None]
    above = (refits.penalties[opened] >= largest[:, None]).sum(axis=1)
    for step in range(above.max(initial=0)):
        here = opened[above > step]
        steps = np.full(len(here), step)
        refits.certificate[here, step] = 0.0
        _store(refits, here, steps)
    refits.state[opened, STEP] = above
    asks = opened[:0]
    if not rules.relative:  # the candidates were asked for the largest gradient alone
        asks = opened[above < refits.penalties.shape[1]]
    refits.state[asks, FRESH] = 1
    waiting: Numbers = np.concatenate([unknown[empty], asks])
    return waiting


def _go_on(refits: Refits, solved: Numbers, over: Values) -> Values:
    """Store the solutions of refits without violators and return their penalties.

    over: KKT violation over all features, relative to the penalty.
    """
    step = refits.state[solved, STEP]
    known = refits.certificate[solved, step]
    refits.certificate[solved, step] = np.maximum(known, over)
    picked = _store(refits, solved, step)
    _note_entries(refits, solved, step, picked)
    pull = refits.pull[solved]
    gradient = np.zeros_like(pull)
    np.divide(refits.grad[solved], pull, out=gradient, where=pull > 0.0)
    refits.grad_before[solved] = gradient
    refits.state[solved, STEP] = step + 1
    penalty: Values = refits.penalties[solved, step]
    return penalty


def _store(refits: Refits, who: Numbers, step: Numbers) -> NDArray[np.bool_]:
    """Store intercepts and non-zero coefficients as the solution of a step.

    Returns which features of each working set are non-zero.
    """
    beta = refits.beta[who]
    picked: NDArray[np.bool_] = (beta != 0.0).any(axis=1)
    row, place = np.nonzero(picked)
    first = refits.stored_at[who, step]
    at = first[row] + _rank_in_group(row, len(who))
    refits.stored_work[who[row], at] = place
    refits.stored_beta[who[row], at] = beta[row, :, place]
    refits.stored_at[who, step + 1] = first + picked.sum(axis=1)
    refits.intercept[who, step] = refits.b0[who]
    return picked


def _note_entries(
    refits: Refits, who: Numbers, step: Numbers, picked: NDArray[np.bool_]
) -> None:
    """Append each refit's features that are non-zero for the first time.

    Within a step the larger |gradient| at the previous penalty goes first, then the
    smaller column.
    """
    row, place = np.nonzero(picked & ~refits.entered[who])
    refit = who[row]
    refits.entered[refit, place] = True
    gradient = refits.grad_before[refit, place]
    order = np.lexsort((refits.work[refit, place], -gradient, row))
    row, place, refit = row[order], place[order], refit[order]
    at = refits.state[refit, ENTRIES] + _rank_in_group(row, len(who))
    refits.order[refit, at] = place
    refits.order_step[refit, at] = step[row]
    refits.state[who, ENTRIES] += np.bincount(row, minlength=len(who))


def _rank_in_group(group: Numbers, n_groups: int) -> Numbers:
    """Return 0, 1, ... within each group; groups ascend."""
    count = np.bincount(group, minlength=n_groups)
    return np.arange(len(group)) - (np.cumsum(count) - count)[group]


def take_in(
    refits: Refits, found: Candidates, accepted: NDArray[np.bool_], weights: Values
) -> tuple[Numbers, Numbers]:
    """Move the accepted candidates into the working sets of their refits.

    Parameters
    ----------
    refits : Refits
        Changed in place.
    found : Candidates
        Their columns stand behind the working sets.
    accepted : ndarray of shape (n,), bool
        Which of them are taken.
    weights : ndarray of shape (n_features,)
        Feature weights.

    Returns
    -------
    refit, place : ndarray of int64
        Where each accepted candidate stands now.
    """
    chosen = np.flatnonzero(accepted)
    refit, feature = found.refit[chosen], found.feature[chosen]
    n_refits = len(refits.state)
    first = refits.state[refit, WORKING]
    at = first + _rank_in_group(refit, n_refits)
    stood = first + chosen - found.borders[refit]
    moved = at < stood
    columns = refits.Z[refit[moved], stood[moved]]
    refits.Z[refit[moved], at[moved]] = columns
    refits.work[refit, at] = feature
    refits.pull[refit, at] = weights[feature]
    refits.mean[refit, at] = found.moments[chosen, 0]
    refits.deviation[refit, at] = found.moments[chosen, 1]
    refits.state[:, WORKING] += np.bincount(refit, minlength=n_refits)
    return refit, at
