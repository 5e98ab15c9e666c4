"""Write what is committed although it is generated.

Run from anywhere: ``python tests/records/write_committed.py``. It writes the JSON
Schemas of `record.json`, `choice.json`, panel files, validations and the study file,
and the signatures of the public functions; the tests only compare.
"""

import inspect
import json
from pathlib import Path

import panelkit
from panelkit.config.study_schema import study_schema
from panelkit.records import Choice, PanelContent, RunRecord, Validation
from panelkit.records.schema import json_schema

REPOSITORY = Path(__file__).parents[2]
COMMAND = "python tests/records/write_committed.py"


def bare(parameter):
    """Return a parameter as text: name, kind and default; types are mypy's affair."""
    default = parameter.default
    if inspect.isfunction(default):
        return f"{parameter.name}={default.__name__}"
    return str(parameter.replace(annotation=inspect.Parameter.empty))


def signatures():
    """Return the public functions with arguments and defaults, one a paragraph."""
    parts = []
    for name in sorted(panelkit.__all__):
        thing = getattr(panelkit, name)
        if not inspect.isfunction(thing):
            continue
        parameters = inspect.signature(thing).parameters.values()
        lines = [f"    {bare(parameter)}," for parameter in parameters]
        kinds = [parameter.kind for parameter in parameters]
        if inspect.Parameter.KEYWORD_ONLY in kinds:
            lines.insert(kinds.index(inspect.Parameter.KEYWORD_ONLY), "    *,")
        parts.append("\n".join([f"{name}(", *lines, ")"]))
    return "\n\n".join(parts) + "\n"


def committed():
    """Return every committed file's name, relative to the repository, and content."""
    schemas = {
        "panelkit/records/schemas/record.json": json_schema(RunRecord),
        "panelkit/records/schemas/choice.json": json_schema(Choice),
        "panelkit/records/schemas/panel.json": json_schema(PanelContent),
        "panelkit/records/schemas/validation.json": json_schema(Validation),
        "panelkit/config/schemas/study.json": study_schema(),
    }
    texts = {
        name: json.dumps(schema, indent=2, ensure_ascii=False) + "\n"
        for name, schema in schemas.items()
    }
    return {**texts, "tests/public_signatures.txt": signatures()}


if __name__ == "__main__":
    for name, text in committed().items():
        path = REPOSITORY / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text(text, encoding="utf-8")
