"""What the sections of a study file may not say together."""

from collections.abc import Mapping
from typing import Any

from panelkit.config.design import check_design, outcome_kind
from panelkit.errors import StudyFileError, name_some

__all__ = ["check_cohort_section", "check_even", "check_lists", "check_rule"]


def check_lists(sections: Mapping[str, Any], path: str) -> None:
    """Refuse lists that contradict themselves."""
    always, never = sections["shortlist"].always, sections["shortlist"].never
    if both := sorted(set(always) & set(never)):
        raise StudyFileError(
            code="always-and-never",
            where=f"{path}, [shortlist], keys 'always' and 'never'",
            what=f"both name {name_some(both)}",
            accepted="a feature under one of the two",
            next_step="Remove it from one of them",
        )
    makers = sections["panels"].makers
    if len(set(makers)) < len(makers):
        raise StudyFileError(
            code="maker-twice",
            where=f"{path}, [panels], key 'makers'",
            what=f"a maker is named twice (got {list(makers)})",
            accepted="each maker once",
            next_step="Remove the repeated one",
        )


_NEEDED = {
    "smallest-within-margin": "margin",
    "cheapest-within-margin": "margin",
    "best-under-budget": "budget",
    "cheapest-above-accuracy": "required_accuracy",
}


def check_rule(choice: Any, path: str, *, priced: bool) -> None:
    """Refuse a primary rule without its figure, and money rules without money."""
    if choice.primary is not None:
        needed = _NEEDED.get(choice.primary.rule)
        if needed is not None and choice.demand(needed) is None:
            raise StudyFileError(
                code="rule-without-figure",
                where=f"{path}, [choice], key 'primary'",
                what=f"the rule {choice.primary.rule} has no {needed}",
                accepted=f"a {needed} fixed before the run",
                next_step=f"Add {needed} to primary",
            )
    rule = choice.rule
    if not priced and (rule.startswith("cheapest") or choice.demand("budget")):
        raise StudyFileError(
            code="rule-needs-prices",
            where=f"{path}, [choice]",
            what="a rule about money is asked for, and nothing is priced",
            accepted="[programme], platforms and [panels] prices beside such a rule",
            next_step="Add prices, or take a rule about size",
        )


def check_cohort_section(sections: Mapping[str, Any], path: str) -> None:
    """Refuse a design and folds that contradict the columns."""
    cohort, design = sections["cohort"], sections["design"]
    check_design(
        design.kind,
        design.prevalence,
        cohort.matched_set,
        outcome_kind(cohort.kind, cohort.time, cohort.event, cohort.classes),
        f"{path}, [design]",
    )
    accuracy = sections["accuracy"]
    drawn = {"folds", "repeats"} & accuracy.model_fields_set
    if accuracy.leave_out is not None and cohort.site is None:
        raise StudyFileError(
            code="leave-out-without-site",
            where=f"{path}, [accuracy], key 'leave_out'",
            what="sites are to be left out in turn, and no site is named",
            accepted="[cohort] site beside leave_out",
            next_step="Name the column with the sites, or take leave_out away",
        )
    if accuracy.leave_out is not None and (cohort.folds is not None or drawn):
        raise StudyFileError(
            code="folds-twice",
            where=f"{path}, [accuracy], key 'leave_out'",
            what="sites are the folds, and folds are given or drawn as well",
            accepted="leave_out, or [cohort] folds, or folds and repeats",
            next_step="Remove one of them",
        )
    if cohort.folds is not None and drawn:
        raise StudyFileError(
            code="folds-twice",
            where=f"{path}, [accuracy], key '{min(drawn)}'",
            what=f"folds are given by the column {cohort.folds!r} and drawn as well",
            accepted="[cohort] folds, or folds and repeats under [accuracy]",
            next_step="Remove one of them",
        )


def check_even(number: int, where: str) -> None:
    """Refuse an odd number of subsamples: they come in pairs."""
    if number % 2:
        raise StudyFileError(
            code="subsamples-odd",
            where=where,
            what=f"subsamples come in pairs (got {number})",
            accepted="an even number of at least 4",
            next_step=f"Write {number + 1}",
        )
