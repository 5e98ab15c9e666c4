"""What the names and the content of columns suggest to a drafted study."""

import re
from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from itertools import takewhile
from pathlib import Path
from typing import Any

from panelkit.ingest import is_missing

__all__ = ["SurvivalPair", "files_beside", "suggestions", "survival_pairs"]

TIME = (
    r"(^|_)(time|days?|weeks?|months?|years?|follow_?up|surv\w*|os|pfs|dfs|rfs|efs|"
    r"dss|ttp)(_|$)"
)
NO_TIME = r"(^|_)(birth|age|date|collected|visit|timepoint|time_point|storage)(_|$)"
EVENT = (
    r"(^|_)(event|status|dead|died|death|deceased|vital|censor\w*|relapsed?|"
    r"recurrence|progress\w*|os|pfs|dfs|rfs|efs|dss)(_|$)"
)
CODE_WORDS = (  # event first; the last pair is common practice in older files
    (r"^(1|1\.0)$", r"^(0|0\.0)$"),
    (r"^(dead|deceased|died|event|yes|true|relapsed?|progress\w*)$",
     r"^(alive|living|censored|no|false|none)$"),
    (r"^2$", r"^1$"),
)  # fmt: skip
UNIT = re.compile(r"(^|_)(days?|weeks?|months?|years?)(_|$)")
FEWEST_TIMES = 10
MATCHED = r"(^|_)(pair|matched|match|matched_set|stratum)(_?(id|set|no|nr))?$"
ORDER = r"(^|_)(run_order|injection|injection_order|acquisition_order|order)$"
YEAR = r"(^|_)(year|recruited|recruitment|enrolled|enrolment|date)(_|$)"
EXTENSIONS = (".csv", ".csv.gz", ".tsv", ".tsv.gz")


@dataclass(frozen=True, slots=True)
class SurvivalPair:
    """A column of times and one of event codes that belong together.

    Attributes
    ----------
    time, event : str
        The columns.
    codes : tuple of str
        What seems to mean event and censored.
    counts : Counter
        How often each code occurs.
    """

    time: str
    event: str
    codes: tuple[str, str]
    counts: Counter[str]

    def keys(self) -> dict[str, str]:
        """Return the keys of ``[cohort]`` that name this outcome."""
        keys = {"time": self.time, "event": self.event}
        if self.codes != ("1", "0"):
            keys |= {"event_value": self.codes[0], "censored_value": self.codes[1]}
        if unit := UNIT.search(self.time.lower()):
            keys["time_unit"] = unit.group(2)
        return keys


def survival_pairs(columns: Mapping[str, Sequence[str]]) -> list[SurvivalPair]:
    """Return pairs of times and event codes, by name and content, likeliest first.

    Parameters
    ----------
    columns : mapping of str to sequence of str
        The sample sheet's columns.

    Returns
    -------
    list of SurvivalPair
        Each event column once, with the time whose name is most like its own.
    """
    times = [name for name, cells in columns.items() if _is_time(name, cells)]
    pairs = []
    for name, cells in columns.items():
        codes = _codes(name, cells)
        if codes is None or not times:
            continue
        near = max(times, key=lambda time: _alike(time, name))
        counts = Counter(cell for cell in cells if not is_missing(cell))
        pairs.append(SurvivalPair(near, name, codes, counts))
    return sorted(pairs, key=lambda pair: -_alike(pair.time, pair.event))


def _alike(one: str, other: str) -> int:
    """Return how many letters two names have in common at their beginning."""
    pairs = zip(one, other, strict=False)
    return sum(1 for _ in takewhile(lambda pair: pair[0] == pair[1], pairs))


def _is_time(name: str, cells: Sequence[str]) -> bool:
    plain = name.lower()
    if not re.search(TIME, plain) or re.search(NO_TIME, plain):
        return False
    filled = [cell for cell in cells if not is_missing(cell)]
    numbers = [float(cell) for cell in filled if re.fullmatch(r"\d+(\.\d+)?", cell)]
    return (
        len(numbers) == len(filled)
        and len(set(numbers)) > FEWEST_TIMES
        and min(numbers) > 0
    )


def _codes(name: str, cells: Sequence[str]) -> tuple[str, str] | None:
    """Return the codes of event and censored, None when the column has no such."""
    found = {cell for cell in cells if not is_missing(cell)}
    if len(found) != 2 or not re.search(EVENT, name.lower()):
        return None
    for event, censored in CODE_WORDS:
        for first, second in (sorted(found), sorted(found, reverse=True)):
            if re.search(event, first.lower()) and re.search(censored, second.lower()):
                # 1.0 and 0.0 are read as 1 and 0
                whole = (first.removesuffix(".0"), second.removesuffix(".0"))
                return whole if whole == ("1", "0") else (first, second)
    return None


def files_beside(expression: Path) -> dict[str, Path]:
    """Return a feature sheet and an assay sheet that lie beside the matrix.

    Parameters
    ----------
    expression : Path
        The matrix.

    Returns
    -------
    dict of str to Path
        ``features`` and ``assays``, where a file of that name is there.
    """
    found = {}
    for role in ("features", "assays"):
        for extension in EXTENSIONS:
            file = expression.parent / f"{role}{extension}"
            if file.is_file() and role not in found:
                found[role] = file
    return found


def suggestions(
    columns: Mapping[str, Sequence[str]], taken: set[str]
) -> dict[str, dict[str, Any]]:
    """Return keys that are worth a commented line, by section.

    Parameters
    ----------
    columns : mapping of str to sequence of str
        The sample sheet's columns.
    taken : set of str
        Columns that play a part already.

    Returns
    -------
    dict of str to dict
        Section to key to value.
    """
    cohort: dict[str, Any] = {}
    sections: dict[str, dict[str, Any]] = {"cohort": cohort}
    free = {name: cells for name, cells in columns.items() if name not in taken}
    latest: list[tuple[str, int | str | None]] = []
    for name, cells in free.items():
        plain = name.lower()
        filled = [cell for cell in cells if not is_missing(cell)]
        numeric = all(re.fullmatch(r"-?\d+(\.\d+)?", cell) for cell in filled)
        several = 1 < len(set(filled)) < len(filled)
        if re.search(MATCHED, plain) and several:
            cohort.setdefault("matched_set", name)
            sections.setdefault("design", {"kind": "matched"})
        elif re.search(ORDER, plain) and numeric and filled:
            cohort.setdefault("run_order", name)
        elif re.search(YEAR, plain) and several and len(filled) == len(cells):
            latest.append((name, _latest(filled)))
    for name, last in latest:
        if last is not None:
            cohort.setdefault("set_aside", {"column": name, "from": last})
    return sections


def _latest(cells: Sequence[str]) -> int | str | None:
    """Return from when on about the last quarter of the rows lies."""
    ordered = sorted(cells)
    cut = ordered[int(0.75 * len(ordered))]
    if cut == ordered[0]:
        return None
    if all(re.fullmatch(r"(19|20)\d{2}", cell) for cell in cells):
        return int(cut)
    dated = all(re.fullmatch(r"(19|20)\d{2}-\d{2}(-\d{2})?", cell) for cell in cells)
    return cut if dated else None
