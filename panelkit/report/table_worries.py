"""What the tables beside the answer give to worry about."""

from panelkit.records import RunSummary
from panelkit.report.aftermath_words import (
    event_words,
    fatal_losses,
    is_rising,
    learning_words,
    low_subgroups,
    statistic_words,
    subgroup_label,
)
from panelkit.report.contrasts import named
from panelkit.report.wording import interval, shorten, three_figures
from panelkit.report.worry import Worry

__all__ = ["worries_of_tables"]

ENOUGH = 0.05
MOST_NAMED = 5
LONGEST = 40


def worries_of_tables(summary: RunSummary) -> list[Worry]:
    """Return what stands against the answer in the tables beside it.

    Parameters
    ----------
    summary : RunSummary
        A finished run.

    Returns
    -------
    list of Worry
        No better than random panels; handling that tells the outcome; a score that
        follows the handling; a loss of one marker that leaves nothing; a dense model
        that is better; a group below the headline; people that are still too few.
    """
    return [
        *_random(summary),
        *_handling(summary),
        *_lost(summary),
        *_dense(summary),
        *_groups(summary),
        *_people(summary),
    ]


def _warn(where: str, text: str, next_step: str) -> Worry:
    return Worry("warning", where, text, next_step)


def _some(names: list[str]) -> str:
    shown = ", ".join(shorten(name, LONGEST) for name in names[:MOST_NAMED])
    more = len(names) - MOST_NAMED
    return f"{shown} and {more} more" if more > 0 else shown


def _random(summary: RunSummary) -> list[Worry]:
    row = named(summary, "random-headline")
    if row is None or not row.p > ENOUGH:
        return []
    markers = "1 marker" if row.size == 1 else f"{row.size} markers"
    return [
        _warn(
            "random panels",
            "The procedure is not shown to be better than panels drawn by lot: of "
            f"random panels of {markers}, one in twenty reaches "
            f"{three_figures(row.metric_high)} or more (p = {row.p:.3g}).",
            "Do not read the chosen markers as special: nothing carries the signal, or "
            "nearly everything does, or people are too few to tell",
        )
    ]


def _handling(summary: RunSummary) -> list[Worry]:
    found = []
    for kind, what in (
        ("controls", "Control features, which should know nothing of the outcome,"),
        ("nuisance", "The nuisance columns, which say how samples were handled,"),
    ):
        row = named(summary, kind)
        if row is not None and row.metric_low > summary.no_skill:
            found.append(
                _warn(
                    "handling",
                    f"{what} predict it by themselves: {summary.metric_words} "
                    f"{three_figures(row.metric)} "
                    f"({interval(row.metric_low, row.metric_high)}).",
                    "Find out how handling and outcome came together before "
                    "believing any panel",
                )
            )
    rows = summary.aftermath.handling
    follows = [row for row in rows if row.p * len(rows) < ENOUGH]
    if follows:
        first = min(follows, key=lambda row: row.p)
        names = list(dict.fromkeys(row.column for row in follows))
        found.append(
            _warn(
                "handling",
                f"Scores follow how samples were handled ({_some(names)}) where the "
                f"outcome is the same: {statistic_words(first.statistic)} "
                f"{three_figures(first.value)} within {shorten(first.group, LONGEST)} "
                f"(p = {first.p:.2g}, {len(rows)} looked at).",
                "Look for markers that measure the handling",
            )
        )
    return found


def _lost(summary: RunSummary) -> list[Worry]:
    rows = fatal_losses(summary)
    if not rows:
        return []
    first = rows[0]
    names = _some([row.marker for row in rows])
    sole = len({row.marker for row in summary.aftermath.fragility if row.marker}) == 1
    if sole:
        text = (
            f"The panel is one marker, {names}: when its assay fails there is no "
            "result."
        )
    else:
        text = (
            f"The panel rests on single markers ({names}): without "
            f"{shorten(first.marker, LONGEST)} ({event_words(first.event)}) the "
            f"{summary.metric_words} falls to {three_figures(first.metric)}, which "
            f"these data do not tell from no skill ({summary.no_skill:g})."
        )
    return [_warn("fragility", text, "See the stand-ins, or carry a second marker")]


def _dense(summary: RunSummary) -> list[Worry]:
    row = named(summary, "ridge")
    if row is None or not row.difference_low > 0.0:
        return []
    return [
        _warn(
            "comparators",
            f"Ridge on all features is more accurate than the panel's procedure "
            f"({three_figures(row.metric)} against "
            f"{three_figures(summary.choice.headline.metric)}): a small panel gives "
            "something away here.",
            "Offer larger sizes, or weigh what the difference is worth",
        )
    ]


def _groups(summary: RunSummary) -> list[Worry]:
    rows = sorted(low_subgroups(summary), key=lambda row: row.metric)
    if not rows:
        return []
    first = rows[0]
    others = ""
    if len(rows) > 1:
        others = f" So do {_some([subgroup_label(row) for row in rows[1:]])}."
    n_judged = sum(row.metric == row.metric for row in summary.aftermath.subgroups)
    return [
        _warn(
            "subgroups",
            f"{shorten(subgroup_label(first), LONGEST)} lies below the headline with "
            f"its whole interval: {three_figures(first.metric)} "
            f"({interval(first.metric_low, first.metric_high)}; {first.n_samples:,} "
            f"samples, {n_judged} groups looked at).{others}",
            "Do not carry the headline over to such people without new data",
        )
    ]


def _people(summary: RunSummary) -> list[Worry]:
    if not is_rising(summary.aftermath.learning_curve):
        return []
    return [
        _warn(
            "people",
            f"Accuracy was still rising with the number of people. "
            f"{learning_words(summary)}",
            "Plan for more people before the panel is fixed",
        )
    ]
