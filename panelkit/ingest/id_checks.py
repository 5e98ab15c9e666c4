"""Ids that a spreadsheet or a typist has spoilt, or is about to."""

import re
import unicodedata
from collections import Counter
from collections.abc import Callable, Sequence

from panelkit.ingest.wording import counted, quoted
from panelkit.records import Finding

__all__ = ["check_ids"]

_MONTH = r"(?:jan|feb|mar|apr|may|jun|jul|aug|sept?|oct|nov|dec)[a-z]*"
_DATES = re.compile(
    rf"""(?ix)
    \d{{1,2}}[-/. ]{_MONTH}(?:[-/. ]\d{{2,4}})?   # 1-Mar, 2-Sep-2021
    | {_MONTH}[-/. ]\d{{1,4}}                     # Mar-01, Sep-02
    | \d{{4}}-\d{{2}}-\d{{2}}(?:[T ]00:00(?::00)?)?  # 2021-03-01
    | \d{{1,2}}/\d{{1,2}}/(?:\d{{2}}|\d{{4}})     # 03/01/2021
    """
)
_DATE_STARTS = frozenset(" 0123456789jfmasondJFMASOND")
_POWERS = re.compile(r"\d(?:\.\d+)?[eE]\+\d+")
_SERIAL = re.compile(r"\d{5}")
_SERIALS = (32874, 55153)  # days since 1900 from 1990 to 2050
_FEW = 0.05
"""Serial numbers among names; where more ids are such numbers, they are the ids."""


def check_ids(samples: Sequence[str], features: Sequence[str]) -> list[Finding]:
    """Return what is wrong, or easily goes wrong, with the ids.

    Parameters
    ----------
    samples, features : sequence of str
        Unique ids, as text.

    Returns
    -------
    list of Finding
        ``ids-nearly-equal``, ``ids-with-blanks``, ``ids-with-leading-zeros``,
        ``feature-names-dates`` and ``feature-names-powers``.

    References
    ----------
    Zeeberg et al. 2004, BMC Bioinformatics 5:80; Ziemann, Eren & El-Osta 2016, Genome
    Biology 17:177 (gene names turned into dates and into powers of ten).
    """
    return [
        *_nearly_equal(samples, "sample ids"),
        *_nearly_equal(features, "feature ids"),
        *_with_blanks(samples, "sample ids"),
        *_with_blanks(features, "feature ids"),
        *_leading_zeros(samples, "sample ids"),
        *_leading_zeros(features, "feature ids"),
        *_spoilt_names(features),
    ]


def _one(
    code: str, names: Sequence[str], where: str, what: tuple[str, str], advice: str
) -> list[Finding]:
    if not names:
        return []
    return [
        Finding(
            code=code,
            severity="warning",
            where=where,
            message=f"{counted(len(names), *what)}: {quoted(names)}",
            next_step=advice,
        )
    ]


def _plain(name: str) -> str:
    """Return an id without case, blanks and marks that cannot be seen."""
    if not name.isascii():
        name = "".join(c for c in name if unicodedata.category(c) != "Cf")
    return "".join(name.split()).casefold()


def _no_zeros(name: str) -> str:
    return name.lstrip("0") if name.isdigit() else name


def _alike(names: Sequence[str], key: Callable[[str], str]) -> list[str]:
    keys = [key(name) for name in names]
    counts = Counter(keys)
    if len(counts) == len(names):
        return []
    return [name for name, own in zip(names, keys, strict=True) if counts[own] > 1]


def _nearly_equal(names: Sequence[str], where: str) -> list[Finding]:
    return _one(
        "ids-nearly-equal",
        _alike(names, lambda name: _no_zeros(_plain(name))),
        where,
        (
            "id differs from another one only by letter case, blanks or leading zeros",
            "ids differ from another one only by letter case, blanks or leading zeros",
        ),
        "Check that they are not the same thing entered twice.",
    )


def _with_blanks(names: Sequence[str], where: str) -> list[Finding]:
    around = [
        name
        for name in names
        if name != name.strip() or (not name.isascii() and _hidden(name))
    ]
    inner = [name for name in names if len(name.split()) > 1 and name == name.strip()]
    found = _one(
        "ids-with-blanks",
        around,
        where,
        (
            "id begins or ends with a blank, or holds a mark that cannot be seen",
            "ids begin or end with a blank, or hold a mark that cannot be seen",
        ),
        "Take the blanks out in all files: ids are compared character by character.",
    )
    if inner:
        found.append(
            Finding(
                code="ids-with-inner-blanks",
                severity="info",
                where=where,
                message=f"{counted(len(inner), 'id has', 'ids have')} a blank inside: "
                f"{quoted(inner)}",
                next_step="Nothing, if all files write them so.",
            )
        )
    return found


def _hidden(name: str) -> bool:
    return any(unicodedata.category(letter) == "Cf" for letter in name)


def _leading_zeros(names: Sequence[str], where: str) -> list[Finding]:
    hit = [name for name in names if name.isdigit() and name[0] == "0" and name != "0"]
    if not hit:
        return []
    what = ("id is a number that begins", "ids are numbers that begin")
    return [
        Finding(
            code="ids-with-leading-zeros",
            severity="info",
            where=where,
            message=f"{counted(len(hit), *what)} with a zero, which a spreadsheet "
            f"would drop: {quoted(hit)}",
            next_step="Nothing here; elsewhere import them as text.",
        )
    ]


def _spoilt_names(features: Sequence[str]) -> list[Finding]:
    likely = [name.strip() for name in features if name[:1] in _DATE_STARTS]
    dates = [name for name in likely if _DATES.fullmatch(name)]
    serials = [
        name
        for name in features
        if _SERIAL.fullmatch(name) and _SERIALS[0] <= int(name) <= _SERIALS[1]
    ]
    numbers = sum(name.isdigit() for name in features)
    if numbers <= _FEW * len(features):
        dates += serials
    powers = [name for name in likely if _POWERS.fullmatch(name)]
    return [
        *_one(
            "feature-names-dates",
            dates,
            "feature ids",
            (
                "feature name looks like a date that a spreadsheet made of a name",
                "feature names look like dates that a spreadsheet made of names",
            ),
            "Take the names from the original file (MARCH1 becomes 1-Mar, SEPT2 "
            "2-Sep), imported as text.",
        ),
        *_one(
            "feature-names-powers",
            powers,
            "feature ids",
            (
                "feature name is a power of ten that a spreadsheet made of an id",
                "feature names are powers of ten that a spreadsheet made of ids",
            ),
            "Take the names from the original file (2310009E13 becomes 2.31E+19), "
            "imported as text.",
        ),
    ]
