"""Answer about plates: which sample goes where, and how even that is."""

from collections.abc import Mapping, Sequence

from panelkit.config import SIZING
from panelkit.records import SizingAnswer, SizingCurve, SizingSeries, SizingTable
from panelkit.sizing.plates import Allocation
from panelkit.sizing.words import figures, whole

__all__ = ["answer_plates"]


def answer_plates(
    samples: Sequence[str],
    subjects: Sequence[str],
    columns: Mapping[str, Sequence[str]],
    found: Allocation,
    seed: int,
    wells: int = SIZING.wells,
    controls: int = SIZING.controls,
) -> SizingAnswer:
    """Return the plate map of samples with its check.

    Parameters
    ----------
    samples, subjects : sequence of str
        Ids.
    columns : mapping of str to sequence of str
        What was balanced.
    found : Allocation
        Plates and wells.
    seed : int
        That gives the same map again.
    wells, controls : int
        Of a plate.

    Returns
    -------
    SizingAnswer
        The map is its table ``plates``.
    """
    names = list(columns)
    worst = max(found.balance, key=lambda each: each.association)
    order = sorted(
        range(len(samples)), key=lambda k: (found.plate[k], found.position[k])
    )
    places = tuple(range(len(found.balance)))
    return SizingAnswer(
        question="Which sample goes onto which plate?",
        sentence=f"{whole(len(samples))} samples of {whole(len(set(subjects)))} "
        f"subjects on {whole(found.n_plates)} plates. The least even is "
        f"{worst.column}, with Cramer's V {figures(worst.association)} to the plate, "
        f"where dealing by chance gives {figures(worst.by_chance)} on average.",
        figures={
            "plates": found.n_plates,
            "samples": len(samples),
            "largest_association": worst.association,
            "by_chance": worst.by_chance,
        },
        inputs={
            "balanced": ", ".join(names),
            "wells": wells,
            "controls": controls,
            "seed": seed,
        },
        assumptions=(
            "All samples of a subject are on one plate; plates are filled evenly, so "
            "that the last is not a small one of its own.",
            f"{whole(controls)} wells of each plate are kept for controls: "
            f"{', '.join(found.control_wells) or 'none'}.",
            "Subjects come in random order and go where the columns and their pairs "
            "are "
            "most even, ties by chance; positions within a plate are drawn by chance.",
            f"share_as_even is the share of {whole(SIZING.chance_draws)} allocations "
            "by "
            "chance that are at least as even: small is good.",
            "Whoever runs the plates should not see the outcome: hand over sample, "
            "plate "
            "and well only.",
            "For research and planning only.",
        ),
        tables=(
            SizingTable(
                "plates",
                "plate map",
                ("sample", "subject", "plate", "well", *names),
                tuple(
                    (
                        samples[k],
                        subjects[k],
                        int(found.plate[k]) + 1,
                        str(found.well[k]),
                        *(str(columns[name][k]) for name in names),
                    )
                    for k in order
                ),
            ),
            SizingTable(
                "balance",
                "association of plate and column, against dealing by chance",
                (
                    "column",
                    "cramers_v",
                    "by_chance_mean",
                    "by_chance_95_percent",
                    "share_as_even",
                    "largest_gap",
                ),
                tuple(
                    (
                        b.column,
                        b.association,
                        b.by_chance,
                        b.by_chance_high,
                        b.share_as_even,
                        b.largest_gap,
                    )
                    for b in found.balance
                ),
            ),
        ),
        curve=SizingCurve(
            "balance",
            "How evenly the plates are filled",
            "Association of plate and column (Cramer's V): this allocation against the "
            "mean and 95th percentile of allocations by chance.",
            "",
            "Cramer's V to the plate",
            (
                SizingSeries(
                    "this allocation",
                    tuple(float(k + 1) for k in places),
                    tuple(b.association for b in found.balance),
                    points_only=True,
                ),
                SizingSeries(
                    "by chance",
                    tuple(float(k + 1) for k in places),
                    tuple(b.by_chance for b in found.balance),
                    tuple(b.by_chance for b in found.balance),
                    tuple(b.by_chance_high for b in found.balance),
                    points_only=True,
                ),
            ),
            ticks=tuple(b.column for b in found.balance),
        ),
        sources=(
            "Taves 1974, Clin Pharmacol Ther 15:443",
            "Pocock & Simon 1975, Biometrics 31:103",
        ),
    )
