"""The picture of a sizing answer: its numbers are the curve's, its words are safe."""

import csv
import io
from xml.etree import ElementTree

import pytest

from panelkit.records import SizingAnswer, SizingCurve, SizingSeries, SizingTable
from panelkit.report import draw_sizing, sizing_tables


def answer(**changes):
    series = (
        SizingSeries("one", (10.0, 20.0, 40.0), (0.4, 0.3, 0.2)),
        SizingSeries("two", (10.0, 40.0), (0.1, 0.2), (0.0, 0.1), (0.2, 0.3), True),
    )
    parts = {
        "name": "precision", "title": "t", "caption": "c", "x_label": "people",
        "y_label": "width", "series": series, "target": 0.25,
        "marked": (("20 people", 20.0),),
    }  # fmt: skip
    curve = SizingCurve(**{**parts, **changes})
    made = SizingTable("range", "t", ("people", "name"), ((3, "=1+1"), (4, None)))
    return SizingAnswer("q", "s", {}, {}, (), (made,), curve, ())


@pytest.mark.parametrize(
    "changes", [{}, {"logarithmic": True, "target": None}, {"ticks": ("a", "b" * 90)}]
)
def test_numbers_beside_the_picture_are_those_of_the_curve(changes):
    made = answer(**changes)
    (picture,) = draw_sizing(made)
    rows = list(csv.reader(io.StringIO(picture.table.decode())))
    assert rows[0] == ["series", "people", "width", "low", "high"]
    expected = [
        (line.name, x, y)
        for line in made.curve.series
        for x, y in zip(line.x, line.y, strict=True)
    ]
    assert [(r[0], float(r[1]), float(r[2])) for r in rows[1:]] == expected
    assert len(made.curve.to_frame()) == len(expected)
    words = {
        "".join(each.itertext()).strip()
        for each in ElementTree.fromstring(picture.svg).iter()
        if each.tag.endswith("text")
    }
    assert {"people", "width", "one", "two", "20 people"} <= words


def test_the_same_bytes_every_time():
    one, two = (draw_sizing(answer())[0] for _ in range(2))
    assert one.svg == two.svg


def test_tables_are_guarded_against_formulas():
    rows = list(csv.reader(io.StringIO(sizing_tables(answer())["range"].decode())))
    assert rows == [["people", "name"], ["3", "'=1+1"], ["4", ""]]


def test_no_curve_no_picture():
    made = answer(series=())
    assert draw_sizing(made) == ()
