"""Tables of TOML files as frozen sections, and what is said about wrong ones."""

import difflib
import tomllib
from collections.abc import Sequence
from decimal import Decimal
from pathlib import Path
from typing import Any, Final, NoReturn, TypeVar

from pydantic import BaseModel, ConfigDict, ValidationError

from panelkit.errors import StudyFileError, name_some

__all__ = ["Section", "check_section", "plain_number", "read_toml", "refuse_key"]

MAX_SHOWN: Final = 60


class Section(BaseModel):
    """A table of a TOML file: frozen, no key but its own."""

    model_config = ConfigDict(frozen=True, extra="forbid", allow_inf_nan=False)


def plain_number(value: object) -> object:
    """Return a decimal as a float; TOML decimals arrive as Decimal."""
    return float(value) if isinstance(value, Decimal) else value


S = TypeVar("S", bound=Section)


def check_section(kind: type[S], values: object, where: str) -> S:
    """Return the values as a section of the asked kind.

    Raises
    ------
    StudyFileError
        If a key is unknown, missing, or holds what it does not accept.
    """
    if isinstance(values, kind):
        return values
    try:
        return kind.model_validate(values, context={"where": where})
    except ValidationError as error:
        _refuse(error, kind, where)


def _refuse(error: ValidationError, kind: type[BaseModel], where: str) -> NoReturn:
    first = error.errors(include_url=False)[0]
    key = ".".join(str(part) for part in first["loc"])
    here = f"{where}, key '{key}'" if key else where
    if first["type"] == "extra_forbidden":
        refuse_key(key, list(kind.model_fields), where)
    if first["type"] == "missing":
        raise StudyFileError(
            code="key-missing",
            where=here,
            what="a value is needed (got none)",
            accepted="the key has no default",
            next_step=f"Add {key}",
        ) from None
    message, given = _accepted(first["type"], first["msg"]), first["input"]
    got = str(given) if isinstance(given, Decimal) else repr(given)
    if len(got) > MAX_SHOWN:
        got = f"{got[:MAX_SHOWN]}..."
    raise StudyFileError(
        code="value-refused",
        where=here,
        what=f"the value cannot be used (got {got})",
        accepted=f"accepted is {message}",
        next_step="Correct the value",
    ) from None


_OWN_WORDS: Final = {
    "dict_type": "a table, { key = value }",
    "finite_number": "a number that is not infinite",
    "mapping_type": "a table, { key = value }",
    "model_type": "a table, { key = value }",
    "too_short": "a list with at least one value",
    "tuple_type": "a list",
}


def _accepted(kind: str, message: str) -> str:
    """Return what is accepted, in our words."""
    plain = message.removeprefix("Value error, ").removeprefix("Input should be ")
    return _OWN_WORDS.get(kind, plain)


def refuse_key(key: str, known: list[str], where: str) -> NoReturn:
    """Refuse an unknown key, with the nearest known name.

    Raises
    ------
    StudyFileError
        Always.
    """
    near = difflib.get_close_matches(key, known, n=1)
    hint = f"perhaps '{near[0]}' is meant; " if near else ""
    raise StudyFileError(
        code="key-unknown",
        where=f"{where}, key '{key}'",
        what=f"no such key is known (got {key!r})",
        accepted=f"{hint}known are {name_some(known, len(known))}",
        next_step="Rename or remove the key",
    ) from None


def read_toml(path: str | Path, keys: Sequence[str]) -> dict[str, Any]:
    """Return the tables of a TOML file, decimals as decimals.

    Parameters
    ----------
    path : str or Path
        The file.
    keys : sequence of str
        Top-level keys that are known.

    Returns
    -------
    dict of str to object
        As written.

    Raises
    ------
    StudyFileError
        If the file cannot be read, is not TOML, or has another top-level key.
    """
    try:
        text = Path(path).read_text(encoding="utf-8-sig")
    except (OSError, UnicodeDecodeError) as error:
        raise StudyFileError(
            code="file-unreadable",
            where=str(path),
            what=f"the file cannot be read (got {error})",
            accepted="a readable TOML file in UTF-8",
            next_step="Check the path and the file",
        ) from None
    try:
        # A binary float would move an amount that is written as a decimal.
        tables = tomllib.loads(text, parse_float=Decimal)
    except (ValueError, ArithmeticError) as error:  # also a number out of all bounds
        raise StudyFileError(
            code="toml-unreadable",
            where=str(path),
            what=f"the file is not valid TOML (got {error})",
            accepted="TOML as in the commented study files",
            next_step="Correct the place named",
        ) from None
    for key in tables:
        if key not in keys:
            refuse_key(key, list(keys), str(path))
    return tables
