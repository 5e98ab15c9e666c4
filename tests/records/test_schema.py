"""JSON Schemas of records: made from types, committed, and true of a real run."""

import json
import runpy
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from decimal import Decimal
from typing import Any, Literal

import numpy as np
import pandas as pd
import pytest
from jsonschema import Draft202012Validator

from panelkit import run_study
from panelkit.errors import UsageError
from panelkit.records import Choice, Cohort, RunRecord
from panelkit.records.schema import json_schema

NAMES = {
    "panelkit/records/schemas/record.json": RunRecord,
    "panelkit/records/schemas/choice.json": Choice,
}
STUDY = """[cohort]
expression = "expression.csv"
samples = "samples.csv"
outcome = "response"
positive = "yes"
[shortlist]
subsamples = 8
candidates = 5
[panels]
sizes = [1, 2]
[accuracy]
folds = 2
repeats = 1
inner_folds = 2
inner_subsamples = 8
"""


@pytest.fixture(scope="module", params=[1.0, 20.0], ids=["overlapping", "separated"])
def documents(request, tmp_path_factory):
    """The two documents of a tiny run; separated classes have no interval."""
    folder = tmp_path_factory.mktemp("run")
    sick = np.arange(40) % 2
    values = np.random.default_rng(5).normal(8.0, 1.0, (40, 20))
    values[:, 0] += request.param * sick
    ids = pd.Index([f"S{number}" for number in range(40)], name="sample_id")
    pd.DataFrame(values, index=ids).add_prefix("F").to_csv(folder / "expression.csv")
    pd.DataFrame({"response": np.where(sick, "yes", "no")}, index=ids).to_csv(
        folder / "samples.csv"
    )
    (folder / "study.toml").write_text(STUDY)
    out = run_study(folder / "study.toml", folder / "out", threads=1).path
    return {
        f"panelkit/records/schemas/{name}": json.loads((out / name).read_text())
        for name in ("record.json", "choice.json")
    }


def schema_of(repository, name):
    return json.loads((repository / name).read_text(encoding="utf-8"))


@pytest.mark.parametrize("name", NAMES)
def test_committed_is_generated(repository, name):
    made = runpy.run_path(str(repository / "tests" / "records" / "write_committed.py"))
    assert (repository / name).read_text(encoding="utf-8") == made["committed"]()[
        name
    ], (
        f"{name} is not what json_schema({NAMES[name].__name__}) gives. A change of "
        "these documents is a change of their format. Read the difference, then run "
        f"{made['COMMAND']}"
    )


@pytest.mark.parametrize("name", NAMES)
def test_documents_of_a_run_validate(repository, documents, name):
    schema = schema_of(repository, name)
    Draft202012Validator.check_schema(schema)
    Draft202012Validator(schema).validate(documents[name])


@pytest.mark.parametrize("name", NAMES)
def test_schemas_refuse_another_document(repository, documents, name):
    """A key more, a key less, a number as text: else they would say nothing."""
    validator = Draft202012Validator(schema_of(repository, name))
    right = documents[name]
    assert not validator.is_valid({**right, "another": 1})
    for key in right:
        assert not validator.is_valid({k: v for k, v in right.items() if k != key})
        assert not validator.is_valid({**right, key: 3.5})


def test_every_field_is_described(repository):
    for name in NAMES:
        schema = schema_of(repository, name)
        parts = [schema, *schema.get("$defs", {}).values()]
        bare = [
            f"{part['title']}.{key}"
            for part in parts
            for key, value in part["properties"].items()
            if "description" not in value and "$ref" not in value
        ]
        assert bare in ([], ["Choice.rules"])


@dataclass(frozen=True)
class Inner:
    """A thing inside.

    Attributes
    ----------
    first, second : float
        Two figures.
    """

    first: float
    second: float


@dataclass(frozen=True)
class Outer:
    """A thing with one field of every kind.

    More is said here.

    Attributes
    ----------
    text : str
        Some words,
        on two lines.
    """

    text: str
    number: int
    switch: bool
    amount: Decimal
    maybe: str | None
    kind: Literal["a", "b"]
    anything: Any
    names: tuple[str, ...]
    pair: tuple[int, str]
    inners: Sequence[Inner]
    table: Mapping[str, Inner | None]


RIGHT = {
    "text": "words",
    "number": 3,
    "switch": True,
    "amount": "12.50",
    "maybe": None,
    "kind": "a",
    "anything": {"deep": [1, None]},
    "names": ["x", "y"],
    "pair": [1, "x"],
    "inners": [{"first": 0.5, "second": None}],
    "table": {"a": {"first": 1, "second": 2}, "b": None},
}
WRONG = {
    "text": 3,
    "number": 3.5,
    "switch": 1,
    "amount": 12.5,
    "maybe": 3,
    "kind": "c",
    "names": "x",
    "pair": [1, "x", 2],
    "inners": [{"first": 0.5}],
    "table": {"a": 3},
}


def test_every_kind_of_field():
    schema = json_schema(Outer)
    Draft202012Validator.check_schema(schema)
    validator = Draft202012Validator(schema)
    validator.validate(RIGHT)
    for key, value in WRONG.items():
        assert not validator.is_valid({**RIGHT, key: value}), key
    assert not validator.is_valid({**RIGHT, "amount": "twelve"})
    assert not validator.is_valid({**RIGHT, "pair": [1]})


def test_words_come_from_docstrings():
    schema = json_schema(Outer)
    assert schema["title"] == "Outer"
    assert schema["description"] == "A thing with one field of every kind."
    text = schema["properties"]["text"]
    assert text["description"] == "Some words, on two lines."
    inner = schema["$defs"]["Inner"]["properties"]
    assert inner["first"]["description"] == inner["second"]["description"]
    assert inner["second"]["description"] == "Two figures."


@pytest.mark.parametrize("kind", [Cohort, int])
def test_what_json_cannot_carry_is_refused(kind):
    with pytest.raises(UsageError) as refused:
        json_schema(kind)
    assert refused.value.code == "type-without-schema"
