"""JSON Schemas of records, from their type hints and docstrings."""

import inspect
import re
import types
from collections.abc import Mapping, Sequence
from dataclasses import fields, is_dataclass
from decimal import Decimal
from typing import (
    Any,
    Final,
    Literal,
    NoReturn,
    Union,
    get_args,
    get_origin,
    get_type_hints,
)

from panelkit.errors import UsageError

__all__ = ["json_schema"]

DIALECT: Final = "https://json-schema.org/draft/2020-12/schema"
AMOUNT: Final = r"^-?[0-9]+(\.[0-9]+)?$"
_PLAIN: Final[dict[object, dict[str, Any]]] = {
    Any: {},
    bool: {"type": "boolean"},
    int: {"type": "integer"},
    str: {"type": "string"},
    float: {"type": ["number", "null"]},  # JSON has no NaN: it is written as null
    Decimal: {"type": "string", "pattern": AMOUNT},
    types.NoneType: {"type": "null"},
}


def json_schema(kind: type) -> dict[str, Any]:
    """Return the JSON Schema of a record as it is written to a file.

    A float may be null, which stands for "not estimable"; an amount of money is
    text, so that no reader rounds it; every field is there and no other.

    Parameters
    ----------
    kind : type
        A dataclass of text, numbers, truth values, literals, None, mappings with
        text keys, sequences, and such dataclasses.

    Returns
    -------
    dict of str to object
        Draft 2020-12; titles are class names, descriptions come from docstrings.

    Raises
    ------
    UsageError
        A field of a type that JSON cannot carry, or a kind that is no dataclass.

    References
    ----------
    JSON Schema, draft 2020-12.
    """
    inner: dict[str, Any] = {}
    schema = {"$schema": DIALECT, **_object(kind, inner)}
    if inner:
        schema["$defs"] = dict(sorted(inner.items()))
    return schema


def _object(kind: type, inner: dict[str, Any]) -> dict[str, Any]:
    """Return the schema of one dataclass; those inside it are put into `inner`."""
    if not is_dataclass(kind):
        _refuse(kind, kind.__name__)
    hints = get_type_hints(kind)
    described = _descriptions(kind)
    properties = {}
    for field in fields(kind):
        place = f"{kind.__name__}.{field.name}"
        text = described.get(field.name)
        properties[field.name] = {
            **_value(hints[field.name], inner, place),
            **({"description": text} if text else {}),
        }
    return {
        "title": kind.__name__,
        "description": (inspect.getdoc(kind) or "").partition("\n\n")[0],
        "type": "object",
        "properties": properties,
        "required": list(properties),
        "additionalProperties": False,
    }


def _value(hint: Any, inner: dict[str, Any], place: str) -> dict[str, Any]:
    """Return the schema of one type hint."""
    if hint in _PLAIN:
        return dict(_PLAIN[hint])
    if isinstance(hint, type) and is_dataclass(hint):
        if hint.__name__ not in inner:
            inner[hint.__name__] = {}  # a dataclass that holds itself ends here
            inner[hint.__name__] = _object(hint, inner)
        return {"$ref": f"#/$defs/{hint.__name__}"}
    origin, arguments = get_origin(hint), get_args(hint)
    if origin is Literal:
        return {"enum": list(arguments)}
    if origin in (Union, types.UnionType):
        return {"anyOf": [_value(each, inner, place) for each in arguments]}
    if origin in (Mapping, dict) and arguments[0] is str:
        values = _value(arguments[1], inner, place)
        return {"type": "object", "additionalProperties": values}
    if origin in (Sequence, list) or (origin is tuple and Ellipsis in arguments):
        return {"type": "array", "items": _value(arguments[0], inner, place)}
    if origin is tuple:
        return {
            "type": "array",
            "prefixItems": [_value(each, inner, place) for each in arguments],
            "items": False,
            "minItems": len(arguments),
        }
    _refuse(hint, place)


def _refuse(hint: object, place: str) -> NoReturn:
    raise UsageError(
        code="type-without-schema",
        where=place,
        what=f"no JSON carries this type (got {hint!r})",
        accepted="dataclasses of text, numbers, truth values, literals, None, "
        "mappings with text keys and sequences",
        next_step="Give the field such a type",
    )


def _descriptions(kind: type) -> dict[str, str]:
    """Return what the section Attributes of a docstring says of each name."""
    text = inspect.getdoc(kind) or ""
    section = text.partition("\nAttributes\n----------\n")[2].partition("\n\n")[0]
    found: dict[str, str] = {}
    names: list[str] = []
    for line in section.splitlines():
        head = re.match(r"(\w+(?:, \w+)*) : ", line)
        if head:
            names = head.group(1).split(", ")
        for name in names if line.startswith(" ") else ():
            found[name] = f"{found.get(name, '')} {line.strip()}".strip()
    return found
