"""The files of `panelkit size` and `panelkit bridge`: tables, picture, JSON."""

from pathlib import Path
from typing import Any

from panelkit.records import RESEARCH_USE, SizingAnswer
from panelkit.report import draw_sizing, sizing_tables
from panelkit.runtime import json_bytes, write_whole

__all__ = ["sizing_content", "write_sizing"]


def sizing_content(answer: SizingAnswer) -> dict[str, Any]:
    """Return an answer as plain values for JSON: no NaN, no infinity."""
    content = _finite({**answer.content(), "research_use": RESEARCH_USE})
    assert isinstance(content, dict)
    return content


def _finite(value: Any) -> Any:
    if isinstance(value, dict):
        return {key: _finite(item) for key, item in value.items()}
    if isinstance(value, list | tuple):
        return [_finite(item) for item in value]
    if isinstance(value, float) and not abs(value) < float("inf"):
        return None
    return value


def write_sizing(answer: SizingAnswer, out: Path) -> list[str]:
    """Write an answer's tables, picture and JSON, and return the names of the files.

    Parameters
    ----------
    answer : SizingAnswer
        The answer.
    out : Path
        The folder; it is made, and files of the same names are replaced.

    Returns
    -------
    list of str
        Relative to the folder, in the order written.

    Raises
    ------
    RunFolderError
        A file cannot be written.
    """
    files = {"answer.json": json_bytes(sizing_content(answer))}
    files |= {f"{name}.csv": table for name, table in sizing_tables(answer).items()}
    for picture in draw_sizing(answer):
        files[f"{picture.name}.svg"] = picture.svg
        files[f"{picture.name}.csv"] = picture.table
    for name, content in files.items():
        with write_whole(out / name) as file:
            file.write(content)
    return list(files)
