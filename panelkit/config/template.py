"""The commented study file, written from the sections themselves.

Every key of every section appears once: as a line where the draft proposes a value,
else as a comment that shows its default. The explanations are those of the sections'
own docstrings, so there is one place for them.
"""

import inspect
import json
import re
from collections.abc import Mapping
from textwrap import fill
from typing import Any

from panelkit.config.programme import ProgrammeSection
from panelkit.config.sections import Section
from panelkit.config.study import PLAIN_SECTIONS

__all__ = ["TEMPLATE_SECTIONS", "explanations", "study_text", "toml_value"]

TEMPLATE_SECTIONS: dict[str, type[Section]] = {
    **PLAIN_SECTIONS,
    "programme": ProgrammeSection,
}
WIDTH = 78


def toml_value(value: Any) -> str:
    """Return a value as TOML writes it.

    Parameters
    ----------
    value : str, bool, int, float, Decimal, sequence or mapping
        None is not a TOML value and must not be asked for.

    Returns
    -------
    str
        On one line.
    """
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, str):
        return json.dumps(value, ensure_ascii=False)  # TOML's basic strings
    if isinstance(value, Mapping):
        inside = ", ".join(
            f"{json.dumps(k)} = {toml_value(v)}" for k, v in value.items()
        )
        return f"{{ {inside} }}" if inside else "{}"
    if isinstance(value, list | tuple):
        return f"[{', '.join(toml_value(item) for item in value)}]"
    return str(value)


def study_text(
    proposed: Mapping[str, Mapping[str, Any]],
    notes: Mapping[str, Mapping[str, str]] | None = None,
    seed: int | None = None,
    suggested: Mapping[str, Mapping[str, Any]] | None = None,
) -> str:
    """Return a commented study file.

    Parameters
    ----------
    proposed : mapping of section to mapping of key to value
        Keys that are written as lines.
    notes : mapping of section to mapping of key to str, optional
        Why a value is proposed, written above it.
    seed : int, optional
        Written as a line when given.
    suggested : mapping of section to mapping of key to value, optional
        Keys that are written as a comment with this value.

    Returns
    -------
    str
        TOML; every other key is a comment with its default.
    """
    parts = ["# A panelkit study. Paths are relative to this file."]
    if seed is not None:
        parts.append(f"# Root of every random draw.\nseed = {seed}")
    for name, kind in TEMPLATE_SECTIONS.items():
        parts.append(
            _section_text(
                name,
                kind,
                proposed.get(name),
                (notes or {}).get(name, {}),
                (suggested or {}).get(name, {}),
            )
        )
    return "\n\n".join(parts) + "\n"


def _section_text(
    name: str,
    kind: type[Section],
    proposed: Mapping[str, Any] | None,
    notes: Mapping[str, str],
    suggested: Mapping[str, Any],
) -> str:
    explained = explanations(kind)
    off = "" if proposed or name != "programme" else "# "
    lines = [f"{off}[{name}]"]
    for key, field in kind.model_fields.items():
        text = notes.get(key) or explained.get(key, "")
        if text:
            lines += _comment(text)
        if proposed is not None and key in proposed:
            lines.append(f"{key} = {toml_value(proposed[key])}")
            continue
        if key in suggested:
            lines.append(f"# {key} = {toml_value(suggested[key])}")
            continue
        default = field.get_default(call_default_factory=True)
        if field.is_required():
            lines.append(f"# {key} =")
        elif default is None:
            lines.append(f"# {key} =    # none unless given")
        else:
            lines.append(f"# {key} = {toml_value(default)}")
    return "\n".join(lines)


def _comment(text: str) -> list[str]:
    prefix = "#   "
    return fill(
        text, WIDTH, initial_indent=prefix, subsequent_indent=prefix
    ).splitlines()


def explanations(kind: type[Section]) -> dict[str, str]:
    """Return the descriptions of a section's docstring by key."""
    document = inspect.getdoc(kind) or ""
    body = document.partition("Attributes\n----------\n")[2]
    found: dict[str, str] = {}
    keys: list[str] = []
    for line in body.splitlines():
        head = re.match(r"^(\w+(?:, \w+)*) : ", line)
        if head:
            keys = head.group(1).split(", ")
        elif line.startswith("    ") and keys:
            for key in keys:
                found[key] = f"{found.get(key, '')} {line.strip()}".strip()
        else:
            keys = []
    return found
