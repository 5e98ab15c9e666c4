"""The study file's JSON Schema: as generated, and of one mind with the reader."""

import json
import runpy

import pytest
from jsonschema import Draft202012Validator

from panelkit.config import TEMPLATE_SECTIONS, read_study
from panelkit.config.study_schema import study_schema
from panelkit.errors import StudyFileError

NAME = "panelkit/config/schemas/study.json"
PRICED = {
    "cohort": {"expression": "e.csv", "positive": 1},
    "panels": {"prices": "p.csv", "sizes": [1, 3]},
    "programme": {"currency": "EUR", "samples": 10, "repeat_rate": "0.04"},
    "platform": {
        "wells": {"positions": 96, "groups": "each", "run_cost": 12.5},
        "pools": {"positions": 96, "groups": 2, "position_cost": [[4, 1], [8, "1.5"]]},
    },
}


@pytest.fixture(scope="module")
def schema(repository):
    return json.loads((repository / NAME).read_text(encoding="utf-8"))


@pytest.fixture(scope="module")
def validator(schema):
    Draft202012Validator.check_schema(schema)
    return Draft202012Validator(schema)


def test_committed_is_generated(repository):
    made = runpy.run_path(str(repository / "tests" / "records" / "write_committed.py"))
    text = (repository / NAME).read_text(encoding="utf-8")
    assert text == made["committed"]()[NAME], (
        f"{NAME} is not what study_schema() gives: read the difference, then run "
        f"{made['COMMAND']}"
    )


def test_every_key_of_every_section(schema):
    for name, kind in TEMPLATE_SECTIONS.items():
        assert schema["properties"][name]["$ref"].endswith(kind.__name__)
        section = schema["$defs"][kind.__name__]
        assert set(section["properties"]) == set(kind.model_fields)
        assert section["additionalProperties"] is False
        assert all("description" in key for key in section["properties"].values())
    assert study_schema() == schema


def test_committed_studies_validate(repository, validator, as_json):
    studies = [
        path
        for path in sorted((repository / "configs").glob("*.toml"))
        if "[cohort]" in path.read_text(encoding="utf-8")
    ]
    assert studies
    for path in studies:
        assert [error.message for error in validator.iter_errors(as_json(path))] == []


def test_platform_files_validate(repository, validator, as_json):
    found = sorted((repository / "sample_cohorts").rglob("platform_*.toml"))
    assert found
    for path in found:
        whole = {"cohort": {"expression": "e.csv"}, **as_json(path)}
        assert [error.message for error in validator.iter_errors(whole)] == []


def written(value):
    if isinstance(value, dict):
        inside = ", ".join(f"{key} = {written(part)}" for key, part in value.items())
        return f"{{ {inside} }}"
    if isinstance(value, list):
        return f"[{', '.join(map(written, value))}]"
    return json.dumps(value)


def read(tables, tmp_path):
    path = tmp_path / "study.toml"
    path.write_text("".join(f"{key} = {written(v)}\n" for key, v in tables.items()))
    return read_study(path)


def test_a_full_study_is_right_to_both(validator, tmp_path):
    validator.validate(PRICED)
    assert read(PRICED, tmp_path).platforms["wells"].groups == "each"


WRONG = {
    "unknown table": ("cohrt", None, {}),
    "unknown key": ("accuracy", "fold", 3),
    "seed": ("seed", None, -1),
    "text": ("accuracy", "folds", "five"),
    "folds": ("accuracy", "folds", 1),
    "threshold": ("shortlist", "threshold", 0.5),
    "odd": ("shortlist", "subsamples", 7),
    "odd inside": ("accuracy", "inner_subsamples", 7),
    "sizes twice": ("panels", "sizes", [1, 1]),
    "no sizes": ("panels", "sizes", []),
    "rule": ("choice", "primary", {"rule": "largest"}),
    "currency": ("programme", "currency", "euro"),
    "rate": ("programme", "repeat_rate", 1.0),
    "negative": ("programme", "collection_cost", -1),
    "samples": ("programme", "samples", 0),
    "class": ("cohort", "positive", ["a"]),
    "list": ("shortlist", "always", "F01"),
    "groups": ("platform", "wells", {"positions": 96, "groups": 0}),
    "family": ("platform", "wells", {"positions": 96, "family": "abacus"}),
    "positions": ("platform", "wells", {}),
    "tier": ("platform", "wells", {"positions": 96, "position_cost": [[4]]}),
}


@pytest.mark.parametrize(("table", "key", "value"), WRONG.values(), ids=WRONG)
def test_what_is_wrong_is_wrong_to_both(validator, tmp_path, table, key, value):
    """The study is right but for one value, so that nothing else refuses it."""
    tables = json.loads(json.dumps(PRICED))
    if key is None:
        tables = {table: value, **tables}
    else:
        tables.setdefault(table, {})[key] = value
    assert not validator.is_valid(tables)
    with pytest.raises(StudyFileError):
        read(tables, tmp_path)
