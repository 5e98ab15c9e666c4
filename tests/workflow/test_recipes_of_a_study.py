"""What a study file says about preparation, up to the record and the accuracy."""

import json

import numpy as np
import pytest

from panelkit import check_study, read_cohort, run_study
from panelkit.config import read_study
from panelkit.errors import InputDataError, StudyFileError
from panelkit.workflow.check import checked
from panelkit.workflow.recipes import recipes_of

COUNTS = {"discovery": ["log-cpm", "filter", "median-fill"]}
RATIOS = [
    "log2",
    {"step": "reference-ratio", "features": ["F10", "F11", "F12"], "references": 2},
    "median-fill",
]


@pytest.fixture
def counted(tiny):
    """The tiny study with counts in libraries of different sizes."""
    draws = np.random.default_rng(5)
    depth = draws.uniform(0.3, 3.0, len(tiny.expression))
    expected = np.exp2(tiny.expression.fillna(8.0)).mul(depth, axis=0)
    tiny.expression = expected.round().astype(int)
    del tiny.sections["preparation"]
    return tiny


def tables(out):
    record = json.loads((out.path / "record.json").read_text())
    return record["study"]["preparation"]


def test_defaults_are_written_out_in_the_record(counted, tmp_path):
    """Counts: log counts per million, and why panels cannot be locked like that."""
    out = run_study(counted.write(), tmp_path / "out", threads=1)
    found = tables(out)
    assert found["discovery"] == [
        {"step": "log-cpm", "prior": 2.0},
        {"step": "filter", "max_missing_share": 0.5},
        {"step": "median-fill"},
    ]
    assert found["assay"] is None
    codes = (out.path / "findings.csv").read_text()
    assert "recipe-not-assay-ready" in codes
    assert "log2 counts per million, prior of 2" in (
        out.path / "report.html"
    ).read_text(encoding="utf-8")


def test_what_the_record_holds_is_a_study_again(counted, tmp_path):
    """The written-out steps, pasted into the study file, give the same results."""
    first = run_study(counted.write(), tmp_path / "one", threads=1)
    counted.sections["preparation"] = {"discovery": tables(first)["discovery"]}
    second = run_study(counted.write(), tmp_path / "two", threads=1)
    for name in ("predictions.csv", "shortlist.csv", "frontier.csv"):
        one, two = ((run.path / name).read_bytes() for run in (first, second))
        assert one == two


def test_accuracy_is_that_of_the_assay_part_where_there_is_one(counted, tmp_path):
    """Selection stays as it was; scores are those of ratios to references."""
    first = run_study(counted.write(), tmp_path / "one", threads=1)
    counted.sections["preparation"] = {"assay": RATIOS}
    second = run_study(counted.write(), tmp_path / "two", threads=1)
    one, two = ((run.path / "shortlist.csv").read_bytes() for run in (first, second))
    assert one == two
    one, two = ((run.path / "predictions.csv").read_bytes() for run in (first, second))
    assert one != two
    assert tables(second)["assay"][1] == {
        "step": "reference-ratio",
        "features": ["F10", "F11", "F12"],
        "measure": "pairwise-variation",
        "references": 2,
    }
    assert "recipe-not-assay-ready" not in (second.path / "findings.csv").read_text()


@pytest.mark.parametrize(
    "discovery",
    [
        ["log-cpm", "filter", "median-fill"],
        ["median-of-ratios", "quantile", "batch-centre", "filter", "neighbours"],
        ["log2", "median-difference", "reference-ratio", "filter", "below-limit"],
    ],
)
def test_held_out_values_change_nothing_that_a_fold_learns(counted, discovery):
    """With a fold's own matrix, with shifts, and with an assay part."""
    counted.sections["cohort"]["batch"] = "plate"
    discovery = [RATIOS[1] if name == "reference-ratio" else name for name in discovery]
    counted.sections["preparation"] = {"discovery": discovery, "assay": RATIOS}
    path = counted.write()
    known = checked(read_study(path))
    split = known.draws.splits[0, 0]
    names = known.cohort.samples[split.test]
    counted.expression.loc[list(names)] = np.random.default_rng(6).integers(
        1, 5000, (len(names), counted.expression.shape[1])
    )
    other = checked(read_study(counted.write()))
    assert other.draws.splits[0, 0].test.tolist() == split.test.tolist()
    one, two = (
        each.procedure.learn(each.data, each.draws.splits[0, 0])
        for each in (known, other)
    )
    assert one.selected.view.state.digest() == two.selected.view.state.digest()
    assert one.penalties.tolist() == two.penalties.tolist()
    assert one.tuning.metric.tobytes() == two.tuning.metric.tobytes()
    for first, second in zip(one.selected.panels, two.selected.panels, strict=True):
        assert first.tolist() == second.tolist()
    assert one.predicted.tobytes() != two.predicted.tobytes()  # it was applied


def test_the_assay_part_reads_markers_and_references_alone(counted):
    """All other features gone: the scores of the test rows keep their bits."""
    counted.sections["preparation"] = {"assay": RATIOS}
    known = checked(read_study(counted.write()))
    split = known.draws.splits[0, 0]
    procedure, data = known.procedure, known.data
    selected = procedure.select(data, split)
    panel = selected.panels[-1]
    values = np.full_like(data.values, 1.0)
    measured = [*panel, 10, 11, 12]
    values[measured] = data.values[measured]
    whole, alone = (
        procedure.markers(selected.view, each, split.training).columns(
            np.sort(panel), split.test
        )
        for each in (data, type(data)(**{**_fields(data), "values": values}))
    )
    assert whole.tobytes() == alone.tobytes()


def _fields(data):
    return {name: getattr(data, name) for name in type(data).__slots__}


@pytest.mark.parametrize(
    ("code", "preparation"),
    [
        ("unknown-step", {"discovery": ["log-cmp", "median-fill"]}),
        ("step-parameter-unknown", {"discovery": [{"step": "log2", "ofset": 1}]}),
        ("value-refused", {"discovery": [{"name": "log2"}]}),
        ("value-refused", {"discovery": "log2"}),
        ("step-not-for-assay", {"assay": ["log-cpm", "median-fill"]}),
    ],
)
def test_wrong_steps_are_refused_before_anything_is_fitted(tiny, code, preparation):
    tiny.sections["preparation"] = preparation
    with pytest.raises(StudyFileError) as caught:
        check_study(tiny.write())
    assert caught.value.code == code
    assert "[preparation]" in caught.value.where


@pytest.mark.parametrize(
    ("code", "step"),
    [
        ("no-batches", "batch-centre"),
        ("no-analytes", "collapse"),
        ("no-references", "reference-ratio"),
        ("no-replicates", "replicate-reliability"),
    ],
)
def test_steps_without_what_they_need_are_refused_by_the_check(tiny, code, step):
    tiny.sections["preparation"] = {"discovery": [step, "median-fill"]}
    with pytest.raises(InputDataError) as caught:
        check_study(tiny.write())
    assert caught.value.code == code
    assert step in caught.value.where


def test_decimals_of_the_file_become_numbers(counted):
    counted.sections["preparation"] = {
        "discovery": [{"step": "log-cpm", "prior": 0.25}, "median-fill"]
    }
    path = counted.write()
    cohort = read_cohort(path.parent / "expression.csv", path.parent / "samples.csv")
    recipe, assay = recipes_of(read_study(path), cohort)
    assert recipe.tables()[0] == {"step": "log-cpm", "prior": 0.25}
    assert assay is None
