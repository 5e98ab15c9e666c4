"""Numbers in words, ids that cannot harm, labels that do not collide."""

from decimal import Decimal

import numpy as np
import pytest

from panelkit.report.canvas import drawable, inline
from panelkit.report.draw_frontier import LABEL_STEP, apart
from panelkit.report.ruler import ruler
from panelkit.report.wording import (
    identifier,
    interval,
    money,
    printable,
    shorten,
    three_figures,
)


@pytest.mark.parametrize(
    ("value", "said"),
    [
        (0.8, "0.800"),
        (12.0, "12.0"),
        (123.4, "123"),
        (999.7, "1,000"),
        (1881.8, "1,882"),
        (-0.0214, "-0.0214"),
        (0.0, "0.00"),
        (np.nan, "not estimated"),
        (np.inf, "not estimated"),
    ],
)
def test_three_figures(value, said):
    assert three_figures(value) == said


def test_an_interval_with_a_missing_end_is_none():
    assert interval(0.7, np.nan) == "no interval"
    assert interval(0.7, 0.8, 2) == "0.70 to 0.80"


def test_money_keeps_its_minor_unit():
    assert money(Decimal("1250.50")) == "1,250.50"
    assert money(Decimal("1250"), Decimal("1300")) == "1,250 to 1,300"
    assert money(None) == "not priced"


def test_invisible_signs_become_visible():
    assert printable("a\u202eb\x00c\ud800") == "a[U+202E]b[U+0000]c[U+D800]"
    assert identifier("<b>\n") == '<bdi class="id">&lt;b&gt;[U+000A]</bdi>'


@pytest.mark.parametrize("longest", [3, 8, 9, 22])
def test_shortened_ids_keep_both_ends(longest):
    name = "start" + "x" * 200 + "end"
    short = shorten(name, longest)
    assert len(short) == longest
    assert short[0] == "s"
    assert short[-1] == "d"
    assert shorten("short", 5) == "short"


def test_signs_that_the_font_lacks_are_boxes():
    assert drawable("A中B", 10) == "A□B"


def test_labels_stand_apart_inside_the_axes():
    wanted = [0.2, 0.21, 0.22, 0.97, 0.98, 0.99]
    places = apart(wanted)
    assert min(np.diff(places)) >= LABEL_STEP - 1e-12
    assert max(places) <= 1.0
    assert apart([]) == []


def test_a_figure_below_guessing_widens_the_ruler():
    assert "0.5 guessing" in ruler(0.8, 0.7, 0.9, 0.5)
    assert ">0</text>" in ruler(0.55, 0.42, 0.66, 0.5)
    assert "band" not in ruler(0.8, np.nan, np.nan, 0.5)
    assert ruler(np.nan, np.nan, np.nan, 0.5) == ""


def test_text_in_a_picture_is_left_alone():
    """Ids and colours are changed in tags, never in the text between them."""
    svg = (
        b'<svg viewBox="0 0 1 1"><text id="a" style="fill: #20262d"> id="b" #20262d'
        b"</text></svg>"
    )
    assert inline(svg, "x", "what") == (
        '<svg role="img" aria-label="what" viewBox="0 0 1 1">'
        '<text id="x-a" style="fill: var(--ink)"> id="b" #20262d</text></svg>'
    )
