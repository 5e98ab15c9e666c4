"""`panelkit size`: how large the next cohort has to be."""

from collections.abc import Sequence
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from panelkit.config import SEED, SHORTLIST, SIZING
from panelkit.errors import UsageError
from panelkit.fits import ArraySource
from panelkit.ingest import read_sheet
from panelkit.records import SizingAnswer
from panelkit.runtime import Listener, Progress, generator, silent
from panelkit.sizing import (
    Selector,
    allocate_plates,
    answer_accuracy,
    answer_area,
    answer_compare_areas,
    answer_compare_shares,
    answer_detection,
    answer_develop,
    answer_develop_survival,
    answer_learning,
    answer_plates,
    answer_validate,
    answer_validate_number,
    area_to_cox_snell,
    check_count,
    fit_learning_curve,
    simulate_detection,
)
from panelkit.stability import ShortlistRules, draw_pairs, select_markers
from panelkit.workflow.run_tables import read_learning_curve

__all__ = [
    "size_accuracy",
    "size_area",
    "size_comparison",
    "size_detection",
    "size_development",
    "size_learning",
    "size_plates",
    "size_validation",
]

MOST_LEVELS = 12  # numbers with more distinct values are balanced by their quarters

size_accuracy = answer_accuracy
size_area = answer_area


def _one_way(where: str, ways: Sequence[Sequence[object]], accepted: str) -> int:
    """Return which way of asking is complete.

    Raises
    ------
    UsageError
        None is, or parts of two.
    """
    complete = [k for k, way in enumerate(ways) if all(v is not None for v in way)]
    begun = [k for k, way in enumerate(ways) if any(v is not None for v in way)]
    if len(complete) != 1 or begun != complete:
        raise UsageError(
            code="size-inputs-unclear",
            where=where,
            what="an input is missing"
            if len(begun) <= 1 and not complete
            else "inputs of two ways of asking are mixed",
            accepted=accepted,
            next_step="Give the inputs of one way",
        )
    return complete[0]


def size_development(
    *,
    parameters: int,
    prevalence: float | None = None,
    area: float | None = None,
    cox_snell: float | None = None,
    rate: float | None = None,
    follow_up: float | None = None,
) -> SizingAnswer:
    """Return the people for developing a model of given candidate parameters.

    Parameters
    ----------
    parameters : int
        Everything that was ever looked at.
    prevalence : float, optional
        Of a binary outcome; goes with `area` or `cox_snell`.
    area, cox_snell : float, optional
        How well the model is expected to do.
    rate, follow_up : float, optional
        Of a time to an event; go with `cox_snell`.

    Returns
    -------
    SizingAnswer
        By the criteria of Riley et al.

    Raises
    ------
    UsageError
        Inputs that do not go together, or that no study can have.
    """
    accepted = (
        "--prevalence with --area or --cox-snell; or --rate, --follow-up and "
        "--cox-snell"
    )
    if rate is not None or follow_up is not None:
        _one_way("panelkit size develop", ((rate, follow_up, cox_snell),), accepted)
        _refuse_beside(prevalence is not None or area is not None, accepted)
        assert rate is not None
        assert follow_up is not None
        assert cox_snell is not None
        return answer_develop_survival(rate, follow_up, parameters, cox_snell)
    _one_way("panelkit size develop", ((area,), (cox_snell,)), accepted)
    _one_way("panelkit size develop", ((prevalence,),), accepted)
    assert prevalence is not None
    explained = cox_snell
    if explained is None:
        assert area is not None
        explained = area_to_cox_snell(area, prevalence)
    return answer_develop(prevalence, parameters, explained)


def _refuse_beside(mixed: bool, accepted: str) -> None:
    if mixed:
        raise UsageError(
            code="size-inputs-mixed",
            where="panelkit size develop",
            what="inputs of two ways of asking are mixed",
            accepted=accepted,
            next_step="Give the inputs of one way",
        )


def size_validation(
    *,
    prevalence: float | None = None,
    area: float | None = None,
    threshold: float | None = None,
    r_squared: float | None = None,
) -> SizingAnswer:
    """Return the people for validating a locked model.

    Parameters
    ----------
    prevalence, area : float, optional
        Of a binary outcome.
    threshold : float, optional
        Probability at which someone is treated.
    r_squared : float, optional
        Of a number as outcome.

    Returns
    -------
    SizingAnswer
        By the criteria of Riley et al. and Archer et al.

    Raises
    ------
    UsageError
        Inputs that do not go together, or that no study can have.
    """
    way = _one_way(
        "panelkit size validate",
        ((prevalence, area), (r_squared,)),
        "--prevalence and --area; or --r-squared",
    )
    if way == 1:
        assert r_squared is not None
        return answer_validate_number(r_squared)
    assert prevalence is not None
    assert area is not None
    return answer_validate(prevalence, area, threshold)


def size_comparison(
    *,
    area: float | None = None,
    other_area: float | None = None,
    correlation: float | None = None,
    discordant: float | None = None,
    difference: float | None = None,
    power: float = SIZING.power,
) -> SizingAnswer:
    """Return the people for telling two panels apart that are read on the same people.

    Parameters
    ----------
    area, other_area, correlation : float, optional
        Areas and the correlation of their estimates.
    discordant, difference : float, optional
        Shares of one class.
    power : float
        Wanted.

    Returns
    -------
    SizingAnswer
        For areas, or for sensitivities or specificities.

    Raises
    ------
    UsageError
        Inputs that do not go together, or that no panels can have.
    """
    way = _one_way(
        "panelkit size compare",
        ((area, other_area, correlation), (discordant, difference)),
        "--area, --other-area and --correlation; or --discordant and --difference",
    )
    if way == 0:
        assert area is not None
        assert other_area is not None
        assert correlation is not None
        return answer_compare_areas(area, other_area, correlation, power=power)
    assert discordant is not None
    assert difference is not None
    return answer_compare_shares(discordant, difference, power)


def size_learning(
    run: Path, target: float | None = None, seed: int = SEED
) -> SizingAnswer:
    """Return what more people would bring, by the learning curve of a run.

    Parameters
    ----------
    run : Path
        The run folder.
    target : float, optional
        Metric that is wanted.
    seed : int
        For the interval.

    Returns
    -------
    SizingAnswer
        Extrapolation of the nested metric.

    Raises
    ------
    RunFolderError, UsageError
        The run has no learning curve, or one too short.
    """
    points = read_learning_curve(run)
    fit = fit_learning_curve(points, generator(seed, "size", "learning"))
    return answer_learning(points, fit, target)


def shortlist_selector(seed: int, n_subsamples: int, threads: int) -> Selector:
    """Return what `panelkit` itself would put on a shortlist, as a selector."""
    rules = ShortlistRules()

    def select(
        values: NDArray[np.float32], outcome: NDArray[np.float64], number: int
    ) -> NDArray[np.bool_]:
        rows = np.arange(len(outcome))
        plan = draw_pairs(
            rows,
            rows,
            outcome,
            n_subsamples // 2,
            generator(seed, "size", "subsamples", number),
        )
        found = select_markers(
            ArraySource(values),
            outcome,
            rows,
            rows,
            np.ones(len(outcome)),
            plan,
            rules,
            threads=threads,
        )
        picked = np.zeros(values.shape[1], np.bool_)
        picked[found.shortlist] = True
        return picked

    return select


def size_detection(  # noqa: PLR0913 - a simulation has many knobs
    people: Sequence[int],
    differences: Sequence[float],
    *,
    prevalence: float,
    features: int = SIZING.features,
    true_markers: int = SIZING.true_markers,
    simulations: int = SIZING.simulations,
    seed: int = SEED,
    threads: int = 1,
    listener: Listener = silent,
) -> SizingAnswer:
    """Return which differences the shortlist finds with so many people.

    Parameters
    ----------
    people : sequence of int
        Numbers of people.
    differences : sequence of float
        In within-class SD.
    prevalence : float
        Share of cases.
    features, true_markers, simulations : int
        Of each invented cohort; cohorts for each number and difference.
    seed, threads : int
        Root of every draw; threads of the fits.
    listener : callable
        Told of progress.

    Returns
    -------
    SizingAnswer
        By simulation with the default rules of the shortlist.

    Raises
    ------
    UsageError
        Values that no study can have.
    """
    check_count("number of invented cohorts", simulations, 2)
    if not people or not differences:
        raise UsageError(
            code="nothing-to-simulate",
            where="panelkit size detect",
            what="no number of people or no difference is given",
            accepted="at least one of each",
            next_step="Give both",
        )
    select = shortlist_selector(seed, SIZING.subsamples, threads)
    found = []
    asked = [(n, d) for n in people for d in differences]
    for number, (n, d) in enumerate(asked):
        listener(Progress("simulations", number, len(asked)))
        draws = [generator(seed, "size", "cohort", n, k) for k in range(simulations)]
        found.append(
            simulate_detection(
                n, d, select, draws, prevalence, features, true_markers,
                SHORTLIST.false_markers,
            )
        )  # fmt: skip
    listener(Progress("simulations", len(asked), len(asked)))
    how = (
        f"The shortlist of {SIZING.subsamples} subsamples in complementary pairs with "
        f"threshold {SHORTLIST.threshold:g} and at most "
        f"{SHORTLIST.false_markers:g} expected false marker(s) by the bound; seed "
        f"{seed}."
    )
    return answer_detection(found, prevalence, features, true_markers, simulations, how)


def size_plates(
    sheet: Path,
    balance: Sequence[str],
    *,
    subject: str | None = None,
    wells: int = SIZING.wells,
    controls: int = SIZING.controls,
    seed: int = SEED,
) -> SizingAnswer:
    """Return a plate map of the samples of a sheet, balanced and checked.

    Parameters
    ----------
    sheet : Path
        Sample sheet (CSV or TSV).
    balance : sequence of str
        Columns to spread evenly: outcome, site, ...
    subject : str, optional
        Column of the subject; None takes every sample for its own.
    wells, controls : int
        Of a plate; kept for controls.
    seed : int
        Gives the same map again.

    Returns
    -------
    SizingAnswer
        The map is its table ``plates``.

    Raises
    ------
    InputDataError
        The sheet cannot be used, or has no such column.
    UsageError
        Plates without room.
    """
    read = read_sheet(sheet, "sample_id")
    samples = [str(name) for name in read.ids]
    columns = {
        name: _levels([str(v).strip() for v in read.column(name, "--balance")])
        for name in dict.fromkeys(balance)
    }
    if not columns:
        raise UsageError(
            code="nothing-to-balance",
            where="--balance",
            what="no column is named",
            accepted="columns of the sheet, such as the outcome and the site",
            next_step="Name the outcome at least",
        )
    owners = [str(v) for v in read.column(subject, "--subject")] if subject else samples
    owners = [
        owner.strip() or sample for owner, sample in zip(owners, samples, strict=True)
    ]
    found = allocate_plates(
        columns, owners, generator(seed, "size", "plates"), wells, controls
    )
    return answer_plates(samples, owners, columns, found, seed, wells, controls)


def _levels(values: list[str]) -> list[str]:
    """Return values as they are, or numbers with many values as their quarters."""
    if len(set(values)) <= MOST_LEVELS:
        return [value or "(none)" for value in values]
    numbers = np.full(len(values), np.nan)
    for k, value in enumerate(values):
        try:
            numbers[k] = float(value)
        except ValueError:
            if value:
                return values
    ends = np.nanquantile(numbers, [0.25, 0.5, 0.75])
    return [
        "(none)" if np.isnan(v) else f"quarter {int(np.searchsorted(ends, v)) + 1}"
        for v in numbers
    ]
