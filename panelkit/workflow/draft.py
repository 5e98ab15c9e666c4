"""`draft_study`: a study file proposed by looking at the data."""

import os
import re
from collections import Counter
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from panelkit.config import SEED, study_text
from panelkit.errors import InputDataError
from panelkit.ingest import guess_scale, is_missing, read_cohort
from panelkit.preparation import DEFAULT_REASONS, default_steps
from panelkit.workflow.draft_columns import (
    SurvivalPair,
    files_beside,
    suggestions,
    survival_pairs,
)

__all__ = ["draft_study"]

ROLE_WORDS = {
    "replicate_of": r"^(replicate_of|replicate.?of|technical.?of)$",
    "subject": r"(^|_)(subject|person|patient|donor|participant|individual)(_?id)?$",
    "site": r"(^|_)(site|clinic|centre|center|hospital|country)$",
    "batch": r"(^|_)(batch|plate|slide|chip|array_run|run_id|lane)$",
}
SEX_AND_AGE = r"(^|_)(sex|gender|age)(_|$)"
NUISANCE = r"(hours|delay|handling|rin|library|lib_size|storage|freeze|operator)"
OUTCOME = (
    r"(respon|outcome|status|diagnos|class|group|relapse|event|disease|cancer|type|"
    r"label|remission|symptom|case|mol_biol|lineage|histolog)"
)
POSITIVE = (
    r"^(1|yes|y|true|t|case|cases|positive|pos|responder|disease|diseased|tumou?r|"
    r"cancer|relapse|event|symptomatic|sx|sick|affected)$"
)
NEGATIVE = (
    r"^(0|no|n|false|f|control|controls|normal|healthy|negative|neg|"
    r"non.?responder|asymptomatic|asx|unaffected|benign)$"
)
MAX_CLASSES = 6
NAMED = 2.0
"""Score of a column that is an outcome by its name."""
SMALLEST_CLASS = 4


@dataclass(frozen=True, slots=True)
class _Outcome:
    """A column that may be the outcome, best guess first."""

    column: str
    counts: Counter[str]
    score: float


def draft_study(
    expression: "str | os.PathLike[str]",
    samples: "str | os.PathLike[str] | None" = None,
    *,
    folder: "str | os.PathLike[str] | None" = None,
) -> str:
    """Return a commented study file for the given data.

    Parameters
    ----------
    expression : path
        The expression matrix.
    samples : path, optional
        The sample sheet; an .h5ad file brings its own.
    folder : path, optional
        Where the study file will lie; paths are written relative to it. None means
        the current folder.

    Returns
    -------
    str
        TOML that `read_study` reads; what was guessed is said above each line.

    Raises
    ------
    InputDataError
        The data cannot be read, or no column could be an outcome.
    """
    cohort = read_cohort(Path(expression), None if samples is None else Path(samples))
    columns = {
        name: [str(value) for value in values]
        for name, values in cohort.sample_columns.items()
    }
    base = Path.cwd() if folder is None else Path(folder)
    proposed: dict[str, Any] = {"expression": _relative(expression, base)}
    notes: dict[str, str] = {}
    if samples is not None:
        proposed["samples"] = _relative(samples, base)
    roles = _roles(columns)
    pairs = survival_pairs(
        {name: cells for name, cells in columns.items() if name not in roles.values()}
    )
    taken = {*roles.values(), *(c for pair in pairs for c in (pair.time, pair.event))}
    outcomes = _outcomes(columns, taken, SEX_AND_AGE)
    if not outcomes and not pairs:  # sex is the outcome where there is nothing else
        outcomes = _outcomes(columns, taken, "^$")
    if not outcomes and not pairs:
        raise InputDataError(
            code="no-outcome-found",
            where=str(samples or expression),
            what=f"no column looks like an outcome among {len(columns)}",
            accepted=f"a column with 2 to {MAX_CLASSES} classes of at least "
            f"{SMALLEST_CLASS} samples, or a time with an event",
            next_step="Add the outcome to the sample sheet, or write [cohort] outcome "
            "and positive by hand",
        )
    suggested = suggestions(columns, taken)
    if outcomes and (not pairs or outcomes[0].score >= NAMED):
        _propose_outcome(outcomes, proposed, notes)
        _note_survival(pairs, suggested["cohort"], notes)
    else:
        _note_survival(pairs, proposed, notes)
    for role, file in files_beside(Path(expression)).items():
        proposed[role] = _relative(file, base)
        notes[role] = "Found beside the expression matrix. Check this line."
    design = _paired(columns, roles, proposed, notes)
    for role, column in roles.items():
        proposed[role] = column
        notes[role] = f"Guessed by the column's name; {_spread(columns[column])}."
    _propose_columns(columns, {*taken, *map(str, proposed.values())}, proposed)
    _note_suggestions(suggested, columns, notes)
    scale = guess_scale(cohort.values).kind
    preparation = {
        "discovery": (
            f"The values look like {scale}; without this key the steps would be "
            f"{', '.join(default_steps(scale))}: {DEFAULT_REASONS[scale]}."
        )
    }
    return study_text(
        {
            "cohort": proposed,
            "design": design,
            "choice": {"primary": {"rule": "smallest-within-one-se"}},
        },
        {
            "cohort": notes,
            "preparation": preparation,
            "design": {
                key: "To be set together with matched_set."
                for key in (*design, *suggested.get("design", {}))
            },
        },
        SEED,
        suggested,
    )


def _relative(path: "str | os.PathLike[str]", base: Path) -> str:
    return Path(os.path.relpath(Path(path).resolve(), base.resolve())).as_posix()


def _roles(columns: dict[str, list[str]]) -> dict[str, str]:
    """Return role to column, by the names of the columns."""
    found: dict[str, str] = {}
    for role, pattern in ROLE_WORDS.items():
        for name in columns:
            if re.search(pattern, name.lower()) and name not in found.values():
                found[role] = name
                break
    if "subject" in found and any(map(is_missing, columns[found["subject"]])):
        del found["subject"]
    return found


def _outcomes(
    columns: dict[str, list[str]], taken: set[str], barred: str
) -> list[_Outcome]:
    found = []
    for name, values in columns.items():
        if name in taken or re.search(barred, name.lower()):
            continue
        counts = Counter(value for value in values if not is_missing(value))
        enough = [value for value, n in counts.items() if n >= SMALLEST_CLASS]
        if not len(enough) >= 2 or len(counts) > MAX_CLASSES:
            continue
        score = 2.0 * bool(re.search(OUTCOME, name.lower())) + (len(counts) == 2)
        score += sum(counts.values()) / len(values)
        score -= 2.0 * (name.lower() in ("visit", "timepoint", "time_point"))
        found.append(_Outcome(name, counts, score))
    return sorted(found, key=lambda each: -each.score)


def _propose_outcome(
    outcomes: list[_Outcome], proposed: dict[str, Any], notes: dict[str, str]
) -> None:
    best = outcomes[0]
    classes = [value for value, _n in best.counts.most_common()]
    named = [value for value in classes if re.search(POSITIVE, value.lower())]
    plain = [value for value in classes if re.search(NEGATIVE, value.lower())]
    pair = classes[:2]
    if plain:  # a class that is named as the negative one settles the pair
        pair = [plain[0], next(v for v in [*named, *classes] if v != plain[0])]
    positive = next((value for value in named if value in pair), pair[1])
    negative = pair[0] if positive == pair[1] else pair[1]
    others = ", ".join(each.column for each in outcomes[1:8])
    notes["outcome"] = (
        f"Guessed: {', '.join(f'{v} ({n})' for v, n in best.counts.most_common())}. "
        + (f"Other columns that could be meant: {others}. " if others else "")
        + "Check this line."
    )
    notes["positive"] = "Guessed: the class that scores point to. Check this line."
    proposed.update(outcome=best.column, positive=positive, negative=negative)


def _paired(
    columns: dict[str, list[str]],
    roles: dict[str, str],
    proposed: dict[str, Any],
    notes: dict[str, str],
) -> dict[str, Any]:
    """Take people with samples of both classes for matched sets, not for subjects."""
    if "subject" not in roles or "outcome" not in proposed:
        return {}
    pair = (proposed["positive"], proposed["negative"])
    classes: dict[str, set[str]] = {}
    for person, value in zip(
        columns[roles["subject"]], columns[proposed["outcome"]], strict=True
    ):
        if value in pair:
            classes.setdefault(person, set()).add(value)
    both = sum(len(found) == len(pair) for found in classes.values())
    if 2 * both < len(classes):
        return {}
    column = roles.pop("subject")
    proposed["matched_set"] = column
    notes["matched_set"] = (
        f"Guessed: {both} of {len(classes)} values of this column hold both classes, "
        "so each is a matched set (such as tumour and normal tissue of one person). "
        "Check this line."
    )
    return {"kind": "matched"}


def _note_survival(
    pairs: list[SurvivalPair], keys: dict[str, Any], notes: dict[str, str]
) -> None:
    """Put the likeliest survival outcome among the keys, and say where it is from."""
    if not pairs:
        return
    best = pairs[0]
    keys.update(best.keys())
    others = ", ".join(f"{pair.time} with {pair.event}" for pair in pairs[1:5])
    counts = ", ".join(f"{code} ({n})" for code, n in best.counts.most_common())
    notes["time"] = (
        f"Guessed: a time until the event in {best.event}. "
        + (f"Other pairs that could be meant: {others}. " if others else "")
        + "It stands in place of outcome and positive. Check this line."
    )
    notes["event"] = (
        f"Guessed: {counts}; {best.codes[0]} means event, {best.codes[1]} censored. "
        "Check this line."
    )


def _note_suggestions(
    suggested: dict[str, dict[str, Any]],
    columns: dict[str, list[str]],
    notes: dict[str, str],
) -> None:
    cohort = suggested["cohort"]
    if "matched_set" in cohort:
        spread = _spread(columns[cohort["matched_set"]])
        notes["matched_set"] = (
            f"Perhaps, by the column's name; {spread}. "
            'It needs kind = "matched" under [design].'
        )
    if "run_order" in cohort:
        notes["run_order"] = "Perhaps, by the column's name."
    if "set_aside" in cohort:
        notes["set_aside"] = (
            "Perhaps: the latest quarter, as a last test that nothing reads before all "
            "choices are made. Name openings too."
        )


def _propose_columns(
    columns: dict[str, list[str]],
    taken: set[str],
    proposed: dict[str, Any],
) -> None:
    """Propose covariates and nuisance columns by name."""
    free = [name for name in columns if name not in taken]
    covariates = [name for name in free if re.search(SEX_AND_AGE, name.lower())]
    nuisance = [
        name
        for name in free
        if re.search(NUISANCE, name.lower()) and name not in covariates
    ]
    if covariates:
        proposed["covariates"] = covariates
    if nuisance:
        proposed["nuisance"] = nuisance


def _spread(values: list[str]) -> str:
    filled = [value for value in values if not is_missing(value)]
    return f"{len(set(filled))} different values in {len(filled)} rows"
