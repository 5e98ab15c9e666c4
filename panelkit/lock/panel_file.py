"""The panel file: written once, read strictly."""

import hashlib
import json
import math
import types
from collections.abc import Mapping, Sequence
from dataclasses import asdict, fields, is_dataclass, replace
from pathlib import Path
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

from panelkit.errors import PanelFileError, name_some
from panelkit.records import PanelContent

__all__ = ["content_of", "panel_bytes", "parse_panel", "read_panel", "sealed"]

FORMAT: Final = 1
LARGEST_BYTES: Final = 64 << 20
DEEPEST: Final = 12
NULL_ALLOWED: Final = frozenset(
    {
        "prevalence", "positive_value", "negative_value", "net_benefit",
        "chance_low", "chance_high", "metric", "metric_low", "metric_high", "slope",
        "loss", "loss_low", "loss_high", "sensitivity_low", "sensitivity_high",
        "specificity_low", "specificity_high",
    }
)  # fmt: skip
"""Figures that may be null, "not estimable"; whatever enters a score may not."""


def content_of(panel: PanelContent) -> dict[str, Any]:
    """Return a panel as plain values, NaN as None.

    Parameters
    ----------
    panel : PanelContent
        The panel.

    Returns
    -------
    dict of str to object
        As the file holds it.
    """
    found = _plain(asdict(panel))
    assert isinstance(found, dict)  # a mapping stays one
    return found


def _plain(value: Any) -> Any:
    if isinstance(value, Mapping):
        return {key: _plain(item) for key, item in value.items()}
    if isinstance(value, list | tuple):
        return [_plain(item) for item in value]
    if isinstance(value, float):
        return None if math.isnan(value) else float(value)
    return value


def _digest(content: Mapping[str, Any]) -> str:
    """Return the hash of everything but the hash itself."""
    rest = {key: item for key, item in content.items() if key != "content_sha256"}
    text = json.dumps(rest, sort_keys=True, separators=(",", ":"), allow_nan=False)
    return hashlib.sha256(text.encode()).hexdigest()


def sealed(panel: PanelContent) -> PanelContent:
    """Return a panel with the hash of its content.

    Parameters
    ----------
    panel : PanelContent
        Its own hash is not looked at.

    Returns
    -------
    PanelContent
        To be written.
    """
    return replace(panel, content_sha256=_digest(content_of(panel)))


def panel_bytes(panel: PanelContent) -> bytes:
    """Return the bytes of a panel file.

    Parameters
    ----------
    panel : PanelContent
        Sealed.

    Returns
    -------
    bytes
        JSON, two spaces, keys in the order of the record; equal for equal panels.
    """
    text = json.dumps(content_of(panel), indent=2, ensure_ascii=False, allow_nan=False)
    return (text + "\n").encode()


def read_panel(path: Path) -> PanelContent:
    """Return the panel that a file holds.

    Parameters
    ----------
    path : Path
        The file.

    Returns
    -------
    PanelContent
        Checked: layout, hash, sense.

    Raises
    ------
    PanelFileError
        The file is missing or is no panel file that can be trusted.
    """
    try:
        size = path.stat().st_size
        data = path.read_bytes() if size <= LARGEST_BYTES else b""
    except OSError as error:
        raise PanelFileError(
            code="panel-unreadable",
            where=str(path),
            what=f"the file cannot be read ({error.strerror or error})",
            accepted="a panel file that `panelkit lock` wrote",
            next_step="Check the name",
        ) from error
    if size > LARGEST_BYTES:
        _refuse(path.name, f"{size:,} bytes are no panel file")
    return parse_panel(data, path.name)


def parse_panel(data: bytes, where: str) -> PanelContent:
    """Return the panel that bytes hold.

    Parameters
    ----------
    data : bytes
        Of a panel file.
    where : str
        For errors.

    Returns
    -------
    PanelContent
        Checked: layout, hash, sense.

    Raises
    ------
    PanelFileError
        It is no panel file that can be trusted.
    """
    content = _document(data, where)
    version = content.get("panel_format")
    if "panel_format" not in content:
        _refuse(where, "there is no key 'panel_format'")
    if isinstance(version, bool) or version != FORMAT or not isinstance(version, int):
        raise PanelFileError(
            code="panel-format-unknown",
            where=f"{where}, key 'panel_format'",
            what=f"this version cannot be read (got {_shown(version)})",
            accepted=f"version {FORMAT}",
            next_step="Read it with the version of panelkit that wrote it, or lock "
            "the panel again",
        )
    panel = _built(PanelContent, content, where, "")
    assert isinstance(panel, PanelContent)  # by the call
    if panel.content_sha256 != _digest(content_of(panel)):
        raise PanelFileError(
            code="panel-edited",
            where=f"{where}, key 'content_sha256'",
            what="the content is not what was locked: its hash differs",
            accepted="a file that nobody has changed since `panelkit lock`",
            next_step="Take the file that was locked, or lock the panel again",
        )
    _check_sense(panel, where)
    return panel


def _document(data: bytes, where: str) -> dict[str, Any]:
    """Return the JSON object in some bytes; nothing lenient about it."""
    text = _text(data, where)

    def pairs(items: list[tuple[str, Any]]) -> dict[str, Any]:
        names = [name for name, _value in items]
        twice = sorted({name for name in names if names.count(name) > 1})
        if twice:
            _refuse(where, f"a key is repeated: {name_some(twice)}")
        return dict(items)

    def number(text: str) -> float:
        value = float(text)
        if not math.isfinite(value):
            _refuse(where, f"a number is too large (got {text[:30]})")
        return value

    def whole(text: str) -> int:
        if len(text) > 18:
            _refuse(where, f"a number is too long (got {text[:30]})")
        return int(text)

    def constant(name: str) -> NoReturn:
        _refuse(where, f"a value is no number (got {name})")

    try:
        found = json.loads(
            text,
            object_pairs_hook=pairs,
            parse_float=number,
            parse_int=whole,
            parse_constant=constant,
        )
    except json.JSONDecodeError as error:
        _refuse(
            where,
            f"this is no complete JSON (line {error.lineno}, column {error.colno})",
        )
    if not isinstance(found, dict):
        _refuse(where, "the JSON is no object")
    return found


def _text(data: bytes, where: str) -> str:
    try:
        text = data.decode("utf-8")
    except UnicodeDecodeError:
        _refuse(where, "the bytes are no UTF-8 text")
    _check_depth(text, where)
    return text


def _check_depth(text: str, where: str) -> None:
    """Refuse deep nesting before a parser recurses into it."""
    depth, quoted, escaped = 0, False, False
    for sign in text:
        if quoted:
            if escaped:
                escaped = False
            elif sign == "\\":
                escaped = True
            elif sign == '"':
                quoted = False
        elif sign == '"':
            quoted = True
        elif sign in "[{":
            depth += 1
            if depth > DEEPEST:
                _refuse(where, f"more than {DEEPEST} levels deep")
        elif sign in "]}":
            depth -= 1


def _built(hint: Any, value: Any, where: str, place: str) -> Any:
    """Return a value as its type hint asks for, strictly."""
    if isinstance(hint, type) and is_dataclass(hint):
        return _built_record(hint, value, where, place)
    origin, arguments = get_origin(hint), get_args(hint)
    if origin is Literal:
        if not any(value == each and type(value) is type(each) for each in arguments):
            _wrong(where, place, value, f"one of {name_some(map(repr, arguments))}")
        return value
    if origin in (Union, types.UnionType):
        if value is None:
            return None
        inner = next(each for each in arguments if each is not type(None))
        return _built(inner, value, where, place)
    if origin is Mapping:
        if not isinstance(value, dict):
            _wrong(where, place, value, "an object")
        return {
            key: _built(arguments[1], item, where, f"{place}.{key}")
            for key, item in value.items()
        }
    if origin in (Sequence, tuple):
        many = origin is Sequence
        if not isinstance(value, list) or not (many or len(value) == len(arguments)):
            _wrong(
                where, place, value, "a list" if many else f"{len(arguments)} values"
            )
        return tuple(
            _built(arguments[0], item, where, f"{place}[{k}]")
            for k, item in enumerate(value)
        )
    return _plain_value(hint, value, where, place)


def _built_record(hint: Any, value: Any, where: str, place: str) -> Any:
    if not isinstance(value, dict):
        _wrong(where, place or "the file", value, "an object")
    names = [field.name for field in fields(hint)]
    here = place or "the top"
    if unknown := sorted(set(value) - set(names)):
        _refuse(where, f"{here}: unknown {name_some(unknown)}")
    if missing := [name for name in names if name not in value]:
        _refuse(where, f"{here}: missing {name_some(missing)}")
    hints = get_type_hints(hint)
    return hint(
        **{
            name: _built(hints[name], value[name], where, f"{place}.{name}".lstrip("."))
            for name in names
        }
    )


def _plain_value(hint: Any, value: Any, where: str, place: str) -> Any:
    if hint is float:
        if value is None and place.rpartition(".")[2] in NULL_ALLOWED:
            return float("nan")
        if isinstance(value, bool) or not isinstance(value, int | float):
            _wrong(where, place, value, "a number")
        return float(value)
    if hint is int:
        if isinstance(value, bool) or not isinstance(value, int):
            _wrong(where, place, value, "a whole number")
        return value
    if not isinstance(value, str):
        _wrong(where, place, value, "text")
    return value


def _check_sense(panel: PanelContent, where: str) -> None:
    """Refuse what has the layout of a panel and cannot be one."""
    names = list(panel.features)
    twice = sorted({name for name in names if names.count(name) > 1})
    if twice:
        _refuse(where, f"repeated markers: {name_some(twice)}")
    if not panel.markers or "" in names:
        _refuse(where, "a panel needs markers with ids")
    known = ("log2", "m-values", "reference-ratio", "fill")
    if strange := [each.step for each in panel.steps if each.step not in known]:
        _refuse(where, f"unknown step {name_some(strange)}")
    needed = {"log2": {"offset"}, "m-values": {"offset"}}
    for step in panel.steps:
        if set(step.parameters) != needed.get(step.step, set()):
            _refuse(where, f"parameters of {step.step} do not fit it")
    own = [marker.feature for marker in panel.markers]
    for each in panel.fallbacks:
        rest = [name for name in own if name != each.missing]
        if each.missing not in own or list(each.coefficients) != rest:
            _refuse(where, f"the fallback for {each.missing} has "
                    "other markers than the panel")  # fmt: skip
    for cut in panel.cutoffs:
        if not 0.0 < cut.chance < 1.0:
            _refuse(where, f"cut-off {cut.name} is no chance")


def _shown(value: object) -> str:
    text = repr(value)
    return text if len(text) <= 40 else f"{text[:40]}..."


def _wrong(where: str, place: str, value: object, accepted: str) -> NoReturn:
    raise PanelFileError(
        code="panel-value",
        where=f"{where}, {place}",
        what=f"the value cannot be used (got {_shown(value)})",
        accepted=f"{accepted} is needed there",
        next_step="Take the file that was locked, or lock the panel again",
    )


def _refuse(where: str, what: str) -> NoReturn:
    raise PanelFileError(
        code="panel-file-wrong",
        where=where,
        what=what,
        accepted="a panel file that `panelkit lock` wrote and nobody changed",
        next_step="Take the file that was locked, or lock the panel again",
    )
