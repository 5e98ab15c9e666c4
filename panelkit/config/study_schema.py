"""The JSON Schema of the study file, from the sections themselves.

It is for editors and for programs that write studies. It knows the form that the
commented study file shows; `read_study` also takes a whole number written as text,
and it alone knows what keys mean together.
"""

import inspect
from typing import Any, Final

from pydantic.json_schema import models_json_schema

from panelkit.config.currency import MINOR_DIGITS
from panelkit.config.defaults import SEED
from panelkit.config.programme import PlatformSection
from panelkit.config.sections import Section
from panelkit.config.template import TEMPLATE_SECTIONS, explanations

__all__ = ["study_schema"]

DIALECT: Final = "https://json-schema.org/draft/2020-12/schema"
REFERENCE: Final = "#/$defs/{model}"
AMOUNT: Final = {"type": "string", "pattern": r"^[0-9]+(\.[0-9]+)?$"}
PRICE: Final = {"anyOf": [{"type": "number", "minimum": 0}, AMOUNT]}
TIER: Final = {
    "type": "array",
    "prefixItems": [{"type": "integer", "minimum": 1}, PRICE],
    "items": False,
    "minItems": 2,
}
CLASS_NAME: Final = {"type": ["string", "number", "boolean"]}
EVEN: Final = {"multipleOf": 2}
BEYOND_TYPES: Final[dict[tuple[str, str], dict[str, Any]]] = {
    ("CohortSection", "positive"): CLASS_NAME,
    ("CohortSection", "negative"): CLASS_NAME,
    ("CohortSection", "event_value"): CLASS_NAME,
    ("CohortSection", "censored_value"): CLASS_NAME,
    ("CohortSection", "classes"): {"items": CLASS_NAME, "uniqueItems": True},
    ("ShortlistSection", "subsamples"): EVEN,
    ("AccuracySection", "inner_subsamples"): EVEN,
    ("PanelsSection", "sizes"): {"uniqueItems": True},
    ("ProgrammeSection", "currency"): {"enum": sorted(MINOR_DIGITS)},
    ("PlatformSection", "groups"): {
        "anyOf": [{"type": "integer", "minimum": 1}, {"enum": ["auto", "each"]}]
    },
    ("PlatformSection", "position_cost"): {
        "anyOf": [*PRICE["anyOf"], {"type": "array", "items": TIER, "minItems": 1}]
    },
}
"""What the sections check by functions, which leave no trace in their types."""


def study_schema() -> dict[str, Any]:
    """Return the JSON Schema of a study file, its TOML read as JSON.

    Returns
    -------
    dict of str to object
        Draft 2020-12, with the defaults and the explanations of every key.
    """
    kinds: list[type[Section]] = [*TEMPLATE_SECTIONS.values(), PlatformSection]
    made = models_json_schema(
        [(kind, "validation") for kind in kinds], ref_template=REFERENCE
    )[1]
    sections = {name: _section(name, made["$defs"][name]) for name in made["$defs"]}
    for kind in kinds:
        section = sections[kind.__name__]
        section["description"] = (inspect.getdoc(kind) or "").partition("\n\n")[0]
        for key, text in explanations(kind).items():
            if key in section["properties"]:
                section["properties"][key]["description"] = text
    tables = {
        name: {"$ref": REFERENCE.format(model=kind.__name__)}
        for name, kind in TEMPLATE_SECTIONS.items()
    }
    platform = {"$ref": REFERENCE.format(model=PlatformSection.__name__)}
    return {
        "$schema": DIALECT,
        "title": "Study",
        "description": "A panelkit study. Paths are relative to the file.",
        "type": "object",
        "properties": {
            "seed": {
                "type": "integer",
                "minimum": 0,
                "default": SEED,
                "description": "Root of every random draw.",
            },
            **tables,
            "platform": {"type": "object", "additionalProperties": platform},
        },
        "required": ["cohort"],
        "additionalProperties": False,
        "$defs": dict(sorted(sections.items())),
    }


def _section(name: str, made: dict[str, Any]) -> dict[str, Any]:
    """Return the schema of one section as its table in the file is."""
    section = {**made, "properties": {}}
    section.pop("description", None)
    for key, value in made["properties"].items():
        plain = _plain(value)
        if (name, key) in BEYOND_TYPES:
            plain |= BEYOND_TYPES[name, key]
        section["properties"][key] = plain
    return section


def _plain(value: dict[str, Any]) -> dict[str, Any]:
    """Return a value's schema without null, which TOML has not, and made-up titles."""
    plain = {key: part for key, part in value.items() if key != "title"}
    if plain.get("default", ...) is None:
        del plain["default"]
    choices = [each for each in plain.pop("anyOf", ()) if each != {"type": "null"}]
    numeric = any(each.get("type") == "number" for each in choices)
    if numeric:  # amounts: a number, or the same as text
        choices = [AMOUNT if each == {"type": "string"} else each for each in choices]
    if len(choices) == 1:
        return {**choices[0], **plain}
    return {"anyOf": choices, **plain} if choices else plain
