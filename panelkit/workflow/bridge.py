"""`panelkit bridge`: what the assay has to reach, and how two platforms are joined."""

from dataclasses import dataclass
from pathlib import Path

import numpy as np

from panelkit.config import SEED, SIZING
from panelkit.errors import InputDataError, UsageError, name_some
from panelkit.records import SizingAnswer, SizingTable
from panelkit.runtime import generator
from panelkit.sizing import (
    PanelModel,
    answer_bridging,
    answer_limits,
    answer_loss,
    answer_replicates,
    check_area,
    check_count,
    check_positive,
    choose_bridging_set,
)
from panelkit.workflow.check import check_study
from panelkit.workflow.run_tables import read_run_panel

__all__ = [
    "PanelSource",
    "bridge_choice",
    "bridge_limits",
    "bridge_loss",
    "bridge_replicates",
    "bridge_samples",
]


@dataclass(frozen=True, slots=True)
class PanelSource:
    """Where a panel's numbers come from: a run, markers, or an area and a size.

    Attributes
    ----------
    run : Path or None
        A run folder.
    panel : str or None
        Name of a panel of its ``frontier.csv``; None takes the chosen one.
    markers : tuple of str
        ``NAME=DIFFERENCE:SD`` or ``NAME=DIFFERENCE:SD:WEIGHT``, log2 scale.
    area : float or None
        Area that the panel is taken to have; None keeps that of the run or markers.
    size : int or None
        With `area` and without run or markers: so many equal markers.
    sd : float or None
        Their within-class SD, log2.
    correlation : float
        Of any two markers.
    """

    run: Path | None = None
    panel: str | None = None
    markers: tuple[str, ...] = ()
    area: float | None = None
    size: int | None = None
    sd: float | None = None
    correlation: float = 0.0


def _load(source: PanelSource) -> tuple[PanelModel, tuple[str, ...]]:
    """Return a panel and, in words, where its numbers come from."""
    if (source.run is not None) + bool(source.markers) + (source.size is not None) != 1:
        raise UsageError(
            code="panel-source-unclear",
            where="panelkit bridge",
            what="the panel is not stated, or stated twice",
            accepted="a run folder; or --marker NAME=DIFFERENCE:SD for each; or "
            "--size, "
            "--area and --sd",
            next_step="Give one of the three",
        )
    if source.area is not None:
        check_area("area under the ROC curve", source.area)
    if source.run is not None:
        return _of_run(source, source.run)
    if source.markers:
        return _of_markers(source)
    return _of_size(source)


def _together(correlation: float) -> str:
    return (
        f"Any two markers correlate by {correlation:g} within a class, once each "
        "points "
        "to the cases."
    )


def _of_run(source: PanelSource, run: Path) -> tuple[PanelModel, tuple[str, ...]]:
    found = read_run_panel(run, source.panel)
    model = PanelModel.of_effects(
        found.markers, found.differences, found.sds, source.correlation
    )
    area = found.area if source.area is None else source.area
    apparent = model.area
    model = model.scaled_to(area)
    return model, (
        f"Markers are those of panel {found.name} of the run; their differences and SD "
        f"are apparent and would give an area of {apparent:.3g}, so all differences "
        "are "
        f"scaled by one factor to the {'honest' if source.area is None else 'given'} "
        f"area of {area:.3g}.",
        "Weights are those of the linear discriminant of these numbers, not those of a "
        "locked panel.",
        _together(source.correlation),
        "The matrix was prepared to the log2 scale.",
    )


def _of_markers(source: PanelSource) -> tuple[PanelModel, tuple[str, ...]]:
    names, differences, sds, weights = [], [], [], []
    for text in source.markers:
        name, sign, numbers = text.rpartition("=")
        try:
            values = [float(part) for part in numbers.split(":")]
        except ValueError:
            values = []
        if not sign or not name or len(values) not in (2, 3):
            raise UsageError(
                code="marker-unreadable",
                where=f"--marker {text}",
                what=f"this states no marker (got {text!r})",
                accepted="NAME=DIFFERENCE:SD or NAME=DIFFERENCE:SD:WEIGHT, log2 scale",
                next_step="Write it so, for example IL6=0.8:1.1",
            )
        names.append(name)
        differences.append(values[0])
        sds.append(values[1])
        weights.extend(values[2:])
    if len(set(names)) < len(names) or len(weights) not in (0, len(names)):
        raise UsageError(
            code="markers-incomplete",
            where="--marker",
            what="a marker is named twice, or only some have a weight",
            accepted="each marker once, and weights for all or for none",
            next_step="Correct the markers",
        )
    model = PanelModel.of_effects(
        names, differences, sds, source.correlation, weights or None
    )
    said = "given" if weights else "those of the linear discriminant"
    origin = [f"Differences and SD are given; weights are {said}."]
    if source.area is not None:
        model = model.scaled_to(source.area)
        origin.append(f"Differences are scaled to the given area of {source.area:.3g}.")
    return model, (*origin, _together(source.correlation))


def _of_size(source: PanelSource) -> tuple[PanelModel, tuple[str, ...]]:
    if source.area is None or source.sd is None or source.size is None:
        raise UsageError(
            code="panel-of-size-incomplete",
            where="panelkit bridge",
            what="--size needs --area and --sd",
            accepted="all three: markers, area, within-class SD on the log2 scale",
            next_step="Add what is missing",
        )
    check_count("size of the panel", source.size)
    check_positive("SD of the markers", source.sd)
    names = [f"marker {k + 1}" for k in range(source.size)]
    model = PanelModel.of_effects(
        names, [1.0] * source.size, [source.sd] * source.size, source.correlation
    ).scaled_to(source.area)
    return model, (
        f"{source.size} markers alike, each with within-class SD {source.sd:g}, that "
        f"together have an area of {source.area:.3g}.",
        _together(source.correlation),
    )


def bridge_limits(
    source: PanelSource,
    loss: float,
    plates: int = SIZING.plates,
    seed: int = SEED,
) -> SizingAnswer:
    """Return the assay requirement sheet: what the assay of each marker has to reach.

    Parameters
    ----------
    source : PanelSource
        The panel.
    loss : float
        Of area that is accepted.
    plates, seed : int
        Plates of a study; root of the simulation.

    Returns
    -------
    SizingAnswer
        Largest CV, shift and least correlation of each marker.

    Raises
    ------
    UsageError, InputDataError, RunFolderError
        The panel cannot be read, or cannot lose that.
    """
    model, origin = _load(source)
    return answer_limits(
        model, loss, generator(seed, "bridge", "limits"), origin, plates
    )


def bridge_loss(
    source: PanelSource,
    within: float,
    between: float = 0.0,
    replicates: int = 1,
    plates: int = SIZING.plates,
    seed: int = SEED,
) -> SizingAnswer:
    """Return what a stated error of the assay costs a panel.

    Parameters
    ----------
    source : PanelSource
        The panel.
    within, between : float
        Added CV within and between plates, in percent.
    replicates, plates, seed : int
        Readings averaged; plates of a study; root of the simulation.

    Returns
    -------
    SizingAnswer
        Loss of area, closed form and simulated.

    Raises
    ------
    UsageError, InputDataError, RunFolderError
        The panel cannot be read, or the error cannot be.
    """
    check_count("number of replicates", replicates)
    model, origin = _load(source)
    return answer_loss(
        model,
        _fraction("CV within plates", within),
        _fraction("CV between plates", between),
        replicates,
        generator(seed, "bridge", "loss"),
        origin,
        plates,
    )


def bridge_replicates(
    source: PanelSource,
    loss: float,
    within: float,
    between: float = 0.0,
    plates: int = SIZING.plates,
) -> SizingAnswer:
    """Return how many replicates keep a loss of area.

    Parameters
    ----------
    source : PanelSource
        The panel.
    loss : float
        Of area that is accepted.
    within, between : float
        Added CV within and between plates, in percent.
    plates : int
        Of a study.

    Returns
    -------
    SizingAnswer
        The smallest number.

    Raises
    ------
    UsageError, InputDataError, RunFolderError
        The panel cannot be read, or cannot lose that.
    """
    model, origin = _load(source)
    return answer_replicates(
        model,
        loss,
        _fraction("CV within plates", within),
        _fraction("CV between plates", between),
        origin,
        plates,
    )


def _fraction(name: str, percent: float) -> float:
    if not 0.0 <= percent <= 1000.0:
        raise UsageError(
            code="cv-out-of-range",
            where=name,
            what=f"no assay has this (got {percent:g} %)",
            accepted="a percentage from 0 to 1000",
            next_step="Give 20 % as 20",
        )
    return percent / 100.0


def bridge_samples(
    cv: float, other_cv: float, shift: float, correlation: float
) -> SizingAnswer:
    """Return how many samples to measure on both platforms.

    Parameters
    ----------
    cv, other_cv : float
        Of the two platforms, in percent.
    shift : float
        Half-width wanted of the interval of the mean difference, log2.
    correlation : float
        Expected, of the two platforms.

    Returns
    -------
    SizingAnswer
        The largest of three demands.

    Raises
    ------
    UsageError
        Values that no study can have.
    """
    return answer_bridging(
        _fraction("CV of the first platform", cv),
        _fraction("CV of the second platform", other_cv),
        shift,
        correlation,
    )


def bridge_choice(
    study: Path, run: Path, size: int, panel: str | None = None
) -> SizingAnswer:
    """Return which samples of a study to measure on both platforms.

    Parameters
    ----------
    study : Path
        The study file: its samples.
    run : Path
        The run folder: its panel.
    size : int
        Samples wanted.
    panel : str, optional
        Name of a panel; None takes the chosen one.

    Returns
    -------
    SizingAnswer
        Samples that span every marker's range in both classes.

    Raises
    ------
    StudyFileError, InputDataError, RunFolderError, UsageError
        Files that cannot be used, or more samples than there are.
    """
    cohort = check_study(study)
    found = read_run_panel(run, panel)
    place = {str(name): k for k, name in enumerate(cohort.features)}
    strangers = [name for name in found.markers if name not in place]
    if strangers or cohort.outcome is None:
        raise InputDataError(
            code="panel-of-another-cohort",
            where=str(study),
            what=f"the cohort does not have {name_some(strangers) or 'an outcome'}",
            accepted="the study that the run was made from",
            next_step="Name that study",
        )
    values = np.asarray(cohort.X[:, [place[m] for m in found.markers]], np.float64)
    complete = np.asarray(np.isfinite(values).all(axis=1))
    rows = np.flatnonzero(complete)
    outcome = np.asarray(cohort.outcome.values, np.float64)
    ranks = values[rows].argsort(axis=0, kind="stable").argsort(axis=0)
    chosen = rows[choose_bridging_set(ranks.astype(float), outcome[rows], size)]
    covered: list[tuple[str | float, ...]] = [
        (
            marker,
            *(float(v) for v in (values[rows, j].min(), values[rows, j].max())),
            *(float(v) for v in (values[chosen, j].min(), values[chosen, j].max())),
        )
        for j, marker in enumerate(found.markers)
    ]
    cases = int(outcome[chosen].sum())
    return SizingAnswer(
        question="Which samples have to be measured on both platforms?",
        sentence=f"{size} samples, {cases} of them cases, that span the range of every "
        f"marker of panel {found.name}.",
        figures={"samples": size, "cases": cases},
        inputs={"study": study.name, "panel": found.name, "size": size},
        assumptions=(
            "The lowest and highest sample of every marker come first, then always the "
            "sample farthest from those chosen (distances of the markers' ranks, which "
            "no scale distorts), of the class that is behind its share.",
            f"{len(complete) - len(rows)} samples with a missing marker are left out; "
            "whether material is left is for the laboratory to say.",
            "Samples at the ends of the range are over-represented on purpose: their "
            "correlation is higher than that of a random sample.",
            "For research and planning only.",
        ),
        tables=(
            SizingTable(
                "samples",
                "samples in the order chosen",
                ("sample", "outcome", *found.markers),
                tuple(
                    (
                        str(cohort.samples[k]),
                        int(outcome[k]),
                        *(float(v) for v in values[k]),
                    )
                    for k in chosen
                ),
            ),
            SizingTable(
                "ranges",
                "range of each marker: all samples, and those chosen",
                ("marker", "low", "high", "chosen_low", "chosen_high"),
                tuple(covered),
            ),
        ),
        curve=None,
        sources=("Gonzalez 1985, Theor Comput Sci 38:293",),
    )
