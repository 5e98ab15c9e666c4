"""What crosses a border cannot be changed on the other side."""

from collections.abc import Mapping
from dataclasses import FrozenInstanceError, fields, is_dataclass

import numpy as np
import pandas as pd
import pytest

from panelkit import records
from panelkit.records import Record

CLASSES = sorted(
    name
    for name in records.__all__
    if isinstance(getattr(records, name), type) and is_dataclass(getattr(records, name))
)
ROWS = {
    "Assumption": "a row of ScenarioAnswer",
    "Conflict": "a row of Conflicts",
    "CostLine": "a row of PanelCost",
    "Crossing": "a row of BreakEven",
    "Driver": "a row of ScenarioAnswer",
    "KitPurchase": "a row of PanelCost",
    "PriceQuestion": "a row of PriceAnswer",
    "SheetAssay": "a row of CostSheet",
    "Stair": "a row of ScenarioAnswer",
    "StepDown": "part of ScenarioAnswer",
    "Variation": "a row of PriceAnswer",
    "Dropped": "a row of dropped.csv, held by Cohort",
    "Finding": "a row of Findings",
    "Flow": "a row of flow.csv, held by Cohort",
    "FrontierRow": "a row of Frontier",
    "Headline": "part of Choice",
    "Opening": "a line of the openings file, held by Cohort",
    "RuleChoice": "part of Choice",
    "Choice": "choice.json: a document, no table",
    "RunRecord": "record.json: a document, no table",
    "AssayStep": "part of a panel file",
    "CutOff": "part of a panel file",
    "Fallback": "part of a panel file",
    "HonestFigures": "part of a panel file",
    "MarkerShift": "a row of shifts.csv, held by Validation",
    "PanelContent": "a panel file: a document, no table",
    "PanelMarker": "part of a panel file",
    "PanelReference": "part of a panel file",
    "Parent": "part of a panel file",
    "TrainingRows": "part of a panel file",
    "Validation": "validation.json: a document, no table",
    "ValidationFigure": "a row of figures.csv, held by Validation",
}
"""Plain data without arrays; every other class is a `Record` with `to_frame`."""


def test_every_class_is_looked_at(record_names):
    """A new record has to be added to the conftest of this folder."""
    assert record_names == set(CLASSES)
    plain = {n for n in CLASSES if not issubclass(getattr(records, n), Record)}
    assert plain == set(ROWS)


@pytest.mark.parametrize("name", CLASSES)
def test_frozen_and_slotted(make_record, name):
    made = make_record(name)
    kind = type(made)
    assert kind.__dataclass_params__.frozen
    assert "__slots__" in vars(kind)
    assert not hasattr(made, "__dict__")
    for field in fields(made):
        with pytest.raises(FrozenInstanceError):
            setattr(made, field.name, None)
    # a name that is no field finds no room; python 3.11 says so by a TypeError
    with pytest.raises((FrozenInstanceError, AttributeError, TypeError)):
        made.another_name = 1


def arrays_of(value):
    """Yield every array in a field, those in tuples included."""
    if isinstance(value, np.ndarray):
        yield value
    elif isinstance(value, tuple):
        for item in value:
            yield from arrays_of(item)


def arrays_in(record):
    return [
        array
        for field in fields(record)
        for array in arrays_of(getattr(record, field.name))
    ]


@pytest.mark.parametrize("name", CLASSES)
def test_arrays_cannot_be_written_to(make_record, name):
    for array in arrays_in(make_record(name)):
        with pytest.raises(ValueError, match="read-only"):
            array[...] = array


def test_some_records_have_arrays(make_record):
    """The test above is not empty, and reaches arrays in tuples."""
    with_arrays = {name for name in CLASSES if arrays_in(make_record(name))}
    assert {"Cohort", "FoldPlan", "PathSet", "SubsamplePlan"} <= with_arrays


def test_the_caller_keeps_the_right_to_write():
    """The record holds a view: the flags of the caller's own array are left alone."""
    mine = np.zeros((1, 4), np.int64)
    plan = records.FoldPlan(mine, 2)
    mine[0, 0] = 1
    assert np.shares_memory(plan.test_fold, mine)


@pytest.mark.parametrize("name", ["sample_columns", "feature_columns"])
def test_arrays_in_mappings_cannot_be_written_to(make_record, name):
    columns = getattr(make_record("Cohort"), name)
    assert isinstance(columns, Mapping)
    for array in columns.values():
        with pytest.raises(ValueError, match="read-only"):
            array[0] = "another"


@pytest.mark.parametrize("name", [name for name in CLASSES if name not in ROWS])
def test_to_frame(make_record, name):
    made = make_record(name)
    table = made.to_frame()
    assert isinstance(table, pd.DataFrame)
    assert table.shape[0] >= 1
    assert table.shape[1] >= 1
    assert len(set(table.columns)) == table.shape[1]


ROW_COUNTS = {
    "AssayMap": 2,
    "Cohort": 4,
    "Conflicts": 1,
    "Comparator": 1,
    "Findings": 2,
    "Frontier": 2,
    "Outcome": 4,
    "PanelCost": 1,
    "PathSet": 3,
    "PriceList": 1,
    "ShortlistTable": 2,
}


@pytest.mark.parametrize(("name", "rows"), ROW_COUNTS.items())
def test_tables_have_a_row_each(make_record, name, rows):
    assert len(make_record(name).to_frame()) == rows


def test_findings_are_a_sequence(make_record):
    made = make_record("Findings")
    assert len(made) == len(list(made)) == 2
    assert made[0].code == "few-subjects"
    assert isinstance(made[:1], records.Findings)
    assert made[:1].of("warning") == (made[0],)
    assert made.of("stop") == ()


def test_cohort_shows_samples_in_rows(make_record):
    made = make_record("Cohort")
    assert made.X.shape == (made.n_samples, made.n_features) == (4, 3)
    assert made.X.base is made.values or np.shares_memory(made.X, made.values)
    frame = made.to_frame()
    assert list(frame.index) == list(made.samples)
    assert list(frame.columns) == list(made.features)
    assert (frame.to_numpy() == made.X).all()


def test_cohort_as_anndata(make_record):
    made = make_record("Cohort")
    whole = made.to_anndata()
    assert whole.shape == (4, 3)
    assert list(whole.obs_names) == list(made.samples)
    assert list(whole.var["role"]) == ["marker", "marker", "control"]
    assert list(whole.obs["age"]) == ["31", "32", "33", "34"]
    assert (whole.X == made.X).all()


def test_a_split_is_a_partition(make_record):
    plan = make_record("FoldPlan")
    for repeat in range(plan.n_repeats):
        for fold in range(plan.n_folds):
            training, test = plan.split(repeat, fold)
            assert sorted([*training, *test]) == [0, 1, 2, 3]
