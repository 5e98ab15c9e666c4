"""Conflict lists: what is read, what is refused."""

import pytest

from panelkit.errors import InputDataError
from panelkit.ingest import read_conflicts
from panelkit.records import Conflict, Conflicts


@pytest.fixture
def read(tmp_path):
    def run(text):
        path = tmp_path / "conflicts.csv"
        path.write_text(text)
        return read_conflicts(path)

    return run


def test_pairs_and_scopes(read):
    found = read("marker_a,marker_b,scope\nA,B,pool\nB,C,\nA,C,panel\n")
    assert [pair.scope for pair in found.pairs] == ["pool", "pool", "panel"]
    assert found.among("ABC", "pool") == (("A", "B"), ("B", "C"))
    assert found.among("AB", "panel") == ()
    assert list(found.to_frame().columns) == ["marker_a", "marker_b", "scope"]
    assert read("marker_a,marker_b\nA,B\n").pairs[0].scope == "pool"


@pytest.mark.parametrize(
    ("text", "code"),
    [
        ("marker_a\nA\n", "column-missing"),
        ("marker_a,marker_b,why\nA,B,x\n", "column-unknown"),
        ("marker_a,marker_b,scope\nA,B,plate\n", "choice-unknown"),
        ("marker_a,marker_b\nA,A\n", "conflict-with-itself"),
        ("marker_a,marker_b\nA,\n", "conflict-with-itself"),
        ("marker_a,marker_b\nA,B\nB,A\n", "conflict-repeated"),
        ("marker_a,marker_b\nA\n", "cells-miscounted"),
        ('marker_a,marker_b\n"A,B\n', "csv-unreadable"),
    ],
)
def test_refusals(read, text, code):
    with pytest.raises(InputDataError) as caught:
        read(text)
    assert caught.value.code == code
    assert "conflicts.csv" in caught.value.where


def test_a_missing_file(tmp_path):
    with pytest.raises(InputDataError) as caught:
        read_conflicts(tmp_path / "none.csv")
    assert caught.value.code == "file-unreadable"


def test_a_pair_of_one_marker_is_refused_in_memory():
    with pytest.raises(InputDataError) as caught:
        Conflicts((Conflict("A", "A"),))
    assert caught.value.code == "conflict-with-itself"
