"""Rows set aside: nothing reads them, opening them is recorded and cannot be undone."""

import json
import re

import numpy as np
import pytest

from panelkit.errors import InputDataError, UsageError
from panelkit.ingest import read_cohort, read_openings, record_opening
from panelkit.records import Opening

OUTCOME = {"outcome": "group", "positive": "case"}
LATE = {"column": "year", "from": 2020}


@pytest.fixture
def dated(small):
    """Sixteen samples before 2020, eight since."""
    small.sheet["year"] = ["2018"] * 8 + ["2019"] * 8 + ["2020"] * 4 + ["2021"] * 4
    small.sheet["day"] = [f"2019-{1 + k // 2:02d}-15" for k in range(24)]
    return small


def finding(cohort, code):
    return next(item for item in cohort.findings if item.code == code)


def read(small, **more):
    return read_cohort(*small.write(), **OUTCOME, set_aside=LATE, **more)


def test_they_leave_and_are_counted(dated):
    cohort = read(dated)
    assert cohort.n_samples == 16
    assert cohort.set_aside == 8
    assert cohort.samples[-1] == "0016"
    last = cohort.flow[-1]
    assert (last.outcome_class, last.received, last.set_aside) == ("(set aside)", 8, 8)
    assert sum(entry.received for entry in cohort.flow) == 24
    assert sum(entry.analysed for entry in cohort.flow) == 16
    gone = [drop for drop in cohort.dropped if drop.stage == "set aside"]
    assert [drop.id for drop in gone] == [f"{k:04d}" for k in range(17, 25)]
    assert gone[0].reason == "year is at least 2020"
    assert "8 rows are set aside" in finding(cohort, "rows-set-aside").message


def everything(cohort):
    """Return all that a cohort says, but the hashes of its files."""
    return (
        cohort.values.tobytes(),
        list(cohort.samples),
        cohort.outcome.values.tobytes(),
        cohort.findings.items,
        cohort.dropped,
        cohort.flow,
        {name: list(text) for name, text in cohort.sample_columns.items()},
    )


def test_nothing_in_them_is_read(dated):
    """Values, outcomes and dirt in hidden rows change nothing; in others they do."""
    before = everything(read(dated))
    hidden, seen = dated.matrix.index[20], dated.matrix.index[2]
    dated.matrix = dated.matrix.astype(object)
    dated.matrix.loc[hidden] = [9e9, np.nan, "text", -5.0, "inf", 0.0]
    dated.sheet.loc[20:, "group"] = ["third", "", "control", "case"]
    dated.sheet.loc[20:, "age"] = "?"
    assert everything(read(dated)) == before
    dated.matrix.loc[seen, "E5"] = "text"
    assert everything(read(dated)) != before


def test_a_sheet_that_has_lost_its_hidden_outcomes_is_enough(dated):
    before = everything(read(dated))
    dated.sheet.loc[16:, "group"] = ""
    assert everything(read(dated)) == before


def test_opened_they_are_the_ones_that_are_read(dated, tmp_path):
    file = tmp_path / "openings.jsonl"
    cohort = read(dated, open_set_aside="the panel is locked", openings=file)
    assert list(cohort.samples) == [f"{k:04d}" for k in range(17, 25)]
    assert cohort.set_aside == 0
    assert finding(cohort, "set-aside-opened").severity == "warning"
    assert [o.reason for o in cohort.openings] == ["the panel is locked"]
    assert cohort.openings[0].samples == 8
    assert read_openings(file) == cohort.openings
    # reading the others afterwards knows how often there was a look
    assert len(read(dated, openings=file).openings) == 1
    assert read(dated).openings == ()


def test_an_opening_is_recorded_before_anything_is_read(dated, tmp_path):
    """A look that ends in an error was a look."""
    dated.sheet.loc[16:, "group"] = "case"
    file = tmp_path / "openings.jsonl"
    with pytest.raises(InputDataError) as caught:
        read(dated, open_set_aside="first", openings=file)
    assert caught.value.code == "one-class-only"
    assert len(read_openings(file)) == 1


def test_openings_hold_no_clock_and_no_names(tmp_path):
    files = [tmp_path / "one.jsonl", tmp_path / "two.jsonl"]
    for file in files:
        record_opening(file, ["S2", "S1"], "first look")
        record_opening(file, ["S1", "S2"], "second look")
    assert files[0].read_bytes() == files[1].read_bytes()
    assert not re.search("S1|S2", files[0].read_text())
    first, second = read_openings(files[0])
    assert first.ids_sha256 == second.ids_sha256
    assert second.previous_sha256 == first.sha256
    assert (first.number, second.number) == (1, 2)


def remove_first(lines):
    return lines[1:]


def exchange(lines):
    return [lines[1], lines[0], lines[2]]


def other_reason(lines):
    return [lines[0].replace("look 0", "look 9"), *lines[1:]]


def other_reason_rehashed(lines):
    """Whoever also mends the hash of the line breaks the link of the next one."""
    content = json.loads(lines[0])
    content.pop("sha256")
    content["reason"] = "look 9"
    made = Opening(**content)
    return [json.dumps(content | {"sha256": made.sha256}), *lines[1:]]


def no_json(lines):
    return [*lines, "and another"]


def deep(lines):
    return [*lines, "[" * 100_000]


def other_type(lines):
    return [lines[0].replace('"samples": 2', '"samples": "2"'), *lines[1:]]


@pytest.mark.parametrize(
    "spoil",
    [
        remove_first, exchange, other_reason, other_reason_rehashed, no_json, deep,
        other_type,
    ],
)  # fmt: skip
def test_a_changed_record_is_noticed(tmp_path, spoil):
    file = tmp_path / "openings.jsonl"
    for number in range(3):
        record_opening(file, ["a", "b"], f"look {number}")
    file.write_text("\n".join(spoil(file.read_text().splitlines())) + "\n")
    for attempt in (read_openings, lambda f: record_opening(f, ["a"], "again")):
        with pytest.raises(InputDataError) as caught:
            attempt(file)
        assert caught.value.code == "openings-changed"
    assert not file.with_name("openings.jsonl.lock").exists()


@pytest.mark.parametrize(
    ("options", "code"),
    [
        ({"open_set_aside": "why"}, "openings-missing"),
        ({"open_set_aside": " ", "openings": "o.jsonl"}, "opening-without-reason"),
    ],
)
def test_openings_that_cannot_be_recorded(dated, tmp_path, options, code):
    if "openings" in options:
        options = options | {"openings": tmp_path / "o.jsonl"}
    with pytest.raises(UsageError) as caught:
        read(dated, **options)
    assert caught.value.code == code
    assert not (tmp_path / "o.jsonl").exists()


def test_nothing_to_open(dated, tmp_path):
    with pytest.raises(UsageError) as caught:
        read_cohort(
            *dated.write(), **OUTCOME, open_set_aside="x", openings=tmp_path / "o"
        )
    assert caught.value.code == "nothing-set-aside"


@pytest.mark.parametrize(
    ("wanted", "n_left"),
    [
        ({"column": "year", "values": [2021, "2020"]}, 16),
        ({"column": "year", "values": "2018"}, 16),
        ({"column": "year", "from": 2019, "to": 2019}, 16),
        ({"column": "year", "from": "2020"}, 16),
        ({"column": "year", "max": 2018}, 16),
        ({"column": "day", "from": "2019-09"}, 16),
        ({"column": "day", "from": "2019-05-16"}, 10),
        ({"column": "day", "to": "2019-05-15"}, 14),
        ({"column": "day", "to": "2019-05"}, 14),
    ],
)
def test_ways_to_name_the_rows(dated, wanted, n_left):
    assert read_cohort(*dated.write(), set_aside=wanted).n_samples == n_left


@pytest.mark.parametrize(
    "wanted",
    [
        {"column": "year"},
        {"from": 2020},
        {"column": 5, "from": 2020},
        {"column": "year", "values": []},
        {"column": "year", "from": 2020, "values": [2021]},
        {"column": "year", "from": 2021, "to": 2020},
    ],
)
def test_names_of_no_rows(dated, wanted):
    with pytest.raises(UsageError) as caught:
        read_cohort(*dated.write(), set_aside=wanted)
    assert caught.value.code == "set-aside-not-understood"


@pytest.mark.parametrize(
    ("wanted", "code"),
    [
        ({"column": "yaer", "from": 2020}, "unknown-column"),
        ({"column": "year", "values": ["2022"]}, "set-aside-value-absent"),
        ({"column": "year", "from": 2000}, "set-aside-one-sided"),
        ({"column": "year", "from": 2030}, "set-aside-one-sided"),
        ({"column": "group", "from": 2030}, "set-aside-unclear"),
    ],
)
def test_names_that_the_sheet_does_not_have(dated, wanted, code):
    with pytest.raises(InputDataError) as caught:
        read_cohort(*dated.write(), set_aside=wanted)
    assert caught.value.code == code


def test_a_row_that_cannot_be_placed_is_named(dated):
    """Blank is neither early nor late: to guess would be to read it or to lose it."""
    dated.sheet.loc[[3, 5], "year"] = ["", "soon"]
    with pytest.raises(InputDataError) as caught:
        read(dated)
    assert caught.value.code == "set-aside-unclear"
    assert "'0004' ('')" in caught.value.what
    assert "'0006' ('soon')" in caught.value.what


def test_dates_of_other_forms(small):
    cells = ["2019-03-01", "2019-03", "2019", "2019-02-28 23:59", "March", ""]
    small.sheet["seen"] = cells * 4
    cohort = read_cohort(*small.write(), keep={"seen": {"from": "2019-03"}})
    assert list(cohort.samples[:3]) == ["0001", "0002", "0007"]
    assert "'March'" in finding(cohort, "keep-cells-not-numeric").message


def test_people_on_both_sides_are_named(dated):
    """Their later samples are no test on new people."""
    dated.sheet["person"] = [f"p{number % 20}" for number in range(24)]
    said = finding(read(dated, subject="person"), "set-aside-not-apart")
    assert said.severity == "warning"
    assert "4 entries" in said.message
    assert "'p0', 'p1', 'p2', 'p3'" in said.message
    dated.sheet["person"] = [f"p{number // 2}" for number in range(24)]
    cohort = read(dated, subject="person", matched_set="person", design="matched")
    assert "set-aside-not-apart" not in [item.code for item in cohort.findings]
