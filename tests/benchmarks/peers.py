"""General-purpose L1 solvers, run to the same end point as panelkit.

Same penalties (those that panelkit solved for the draw), same standardised float64
columns, one core, warm starts where the library has them. Each library gets the loosest
tolerance of a ladder at which its largest KKT violation over the path, recomputed by
`accuracy.violations` over all features, is at most 1e-6 of the penalty; the ladder is
climbed before the clock starts. celer and liblinear fit no intercept here (celer has
none, liblinear penalises its own): theirs is the slightly easier problem.
"""

import inspect
import warnings
from importlib import import_module

import numpy as np
from accuracy import Solution, standardised, violations
from measure import seconds
from threadpoolctl import threadpool_limits

GOAL = 1e-6


class Peer:
    """One library; `path` returns intercepts (k,) and coefficients (p, k)."""

    name: str
    package: str
    intercept: bool
    ladder: tuple[float, ...]

    def load(self):
        """Import the library, so that no clock sees it."""
        return import_module(self.package)

    def path(self, Z, y, penalties, tolerance):
        raise NotImplementedError


class Celer(Peer):
    """Working sets with dual extrapolation; the tolerance is a duality gap."""

    package = "celer"
    intercept = False
    ladder = tuple(10.0**-e for e in range(6, 16))

    def __init__(self, newton):
        self.name = "celer, prox-Newton" if newton else "celer"
        self.newton = newton

    def path(self, Z, y, penalties, tolerance):
        _, coefficients, _ = self.load().celer_path(
            Z,
            2.0 * y - 1.0,
            "logreg",
            alphas=penalties * len(y),
            tol=tolerance,
            max_iter=100,
            use_PN=self.newton,
        )
        return np.zeros(len(penalties)), coefficients


class Skglm(Peer):
    """Working sets with prox-Newton; the tolerance is a KKT violation.

    Its coordinate descent with Anderson acceleration did not reach the goal with an
    intercept (the inner loop does not look at the intercept's own condition).
    """

    name = "skglm"
    package = "skglm"
    intercept = True
    ladder = (1e-6, 5e-7, 2e-7, 1e-7, 2e-8)

    def path(self, Z, y, penalties, tolerance):
        self.load()
        logistic = import_module("skglm.datafits").Logistic()
        l1 = import_module("skglm.penalties").L1
        solver = import_module("skglm.solvers").ProxNewton(max_iter=100)
        sign = 2.0 * y - 1.0
        w, eta = np.zeros(Z.shape[1] + 1), np.zeros(len(y))
        found = np.empty((len(w), len(penalties)))
        for k, penalty in enumerate(penalties):
            solver.tol = tolerance * penalty
            w = solver.solve(Z, sign, logistic, l1(penalty), w, eta)[0]
            found[:, k] = w
        return found[-1], found[:-1]


class Liblinear(Peer):
    """Newton coordinate descent on all features, no warm start."""

    name = "liblinear"
    package = "sklearn.linear_model"
    intercept = False
    ladder = tuple(10.0**-e for e in range(4, 11))

    def path(self, Z, y, penalties, tolerance):
        model = self.load().LogisticRegression
        default = inspect.signature(model).parameters["penalty"].default
        named = {"l1_ratio": 1.0} if default == "deprecated" else {"penalty": "l1"}
        found = np.empty((Z.shape[1], len(penalties)))
        for k, penalty in enumerate(penalties):
            fit = model(
                C=1.0 / (len(y) * penalty),
                solver="liblinear",
                fit_intercept=False,
                tol=tolerance,
                max_iter=100_000,
                random_state=0,
                **named,
            ).fit(Z, y)
            found[:, k] = fit.coef_[0]
        return np.zeros(len(penalties)), found


class Draw:
    """One subsample as the peers see it."""

    def __init__(self, base, outcome, rows, penalties):
        self.base, self.outcome, self.rows = base, outcome, rows
        self.penalties = penalties
        columns = np.ascontiguousarray(standardised(base, rows))
        self.Z = columns.T  # Fortran order: what every peer wants
        self.y = outcome[rows]

    def run(self, peer, tolerance):
        with threadpool_limits(1), warnings.catch_warnings():
            warnings.simplefilter("ignore")  # the ladder decides what has converged
            return peer.path(self.Z, self.y, self.penalties, tolerance)

    def solutions(self, answer):
        intercepts, coefficients = answer
        found = []
        for k, intercept in enumerate(intercepts):
            used = np.flatnonzero(coefficients[:, k])
            beta = coefficients[used, k]
            eta = intercept + self.Z[:, used] @ beta
            found.append(Solution(eta[:, None], used, beta[:, None]))
        return self.penalties, found

    def violation(self, peer, answer):
        path = self.solutions(answer)
        return float(
            violations(
                self.base, self.rows, "binomial", self.outcome, path, peer.intercept
            ).max()
        )


LIBRARIES = {
    "celer": (Celer(newton=False), Celer(newton=True)),
    "skglm": (Skglm(),),
    "liblinear": (Liblinear(),),
}


def climb(peer, draw):
    """Return the loosest tolerance that reaches the goal, what it gave, the answer.

    Where no rung reaches it the tightest counts, and the violation says so.
    """
    draw.run(peer, peer.ladder[0])  # compiles, where the library does
    for tolerance in peer.ladder:
        taken, answer = seconds(lambda tolerance=tolerance: draw.run(peer, tolerance))
        violation = draw.violation(peer, answer)
        if violation <= GOAL:
            break
    entry = {
        "peer": peer.name,
        "tolerance": tolerance,
        "violation": violation,
        "reached": violation <= GOAL,
        "first_time_s": taken,
    }
    return peer, entry, answer


def choose(library, draw):
    """Return the library's fastest variant among those that reach the goal."""
    found = [climb(peer, draw) for peer in LIBRARIES[library]]
    best = min(
        found, key=lambda each: (not each[1]["reached"], each[1]["first_time_s"])
    )
    best[1]["others"] = [entry for _, entry, _ in found if entry is not best[1]]
    return best
