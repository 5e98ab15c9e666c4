"""How every figure looks, and how it becomes bytes."""

import io
import re
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from typing import Any, Final

import matplotlib
from markupsafe import Markup
from matplotlib.axes import Axes
from matplotlib.backends.backend_svg import FigureCanvasSVG
from matplotlib.figure import Figure
from matplotlib.font_manager import findfont, get_font

from panelkit.report.wording import shorten

__all__ = [
    "FAINT",
    "GRID",
    "INK",
    "PAPER",
    "SERIES",
    "WIDTH_INCHES",
    "Series",
    "drawable",
    "inline",
    "new_figure",
    "settings",
    "svg_bytes",
]

PAPER: Final = "#fffefb"
INK: Final = "#20262d"
FAINT: Final = "#66707a"
GRID: Final = "#dcdad2"
WIDTH_INCHES: Final = 5.6  # text stays readable when a phone shrinks it to 360 pixels


Line = str | tuple[int, tuple[int, ...]]
"""A named line style, or an offset with lengths of dashes and gaps."""


class Series:
    """Colour, marker and line of one series; each alone tells series apart."""

    __slots__ = ("colour", "line", "marker")

    def __init__(self, colour: str, marker: str, line: Line) -> None:
        self.colour = colour
        self.marker = marker
        self.line = line


SERIES: Final = (
    Series("#14606a", "o", "-"),
    Series("#c9822b", "s", "--"),
    Series("#74468f", "^", "-."),
    Series("#8f9c3a", "D", ":"),
    Series("#a33a3a", "v", (0, (5, 1, 1, 1, 1, 1))),
)
"""Rising lightness alternates, so neighbours stay apart in grey too."""

_VARIABLES: Final[Mapping[str, str]] = {
    PAPER: "var(--paper)",
    INK: "var(--ink)",
    FAINT: "var(--faint)",
    GRID: "var(--rule)",
    **{
        series.colour: f"var(--series-{number})"
        for number, series in enumerate(SERIES, start=1)
    },
}
_LOOK: Final[dict[Any, Any]] = {
    "svg.fonttype": "none",
    "svg.hashsalt": "panelkit",
    "font.size": 9.5,
    "font.sans-serif": ["DejaVu Sans", "Verdana", "Arial", "Helvetica"],
    "text.color": INK,
    "text.parse_math": False,
    "axes.edgecolor": FAINT,
    "axes.labelcolor": INK,
    "axes.linewidth": 0.8,
    "axes.unicode_minus": True,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.facecolor": PAPER,
    "figure.facecolor": PAPER,
    "savefig.facecolor": PAPER,
    "xtick.color": FAINT,
    "ytick.color": FAINT,
    "xtick.labelcolor": INK,
    "ytick.labelcolor": INK,
    "grid.color": GRID,
    "grid.linewidth": 0.7,
    "legend.frameon": False,
    "hatch.linewidth": 0.5,
    "lines.linewidth": 1.6,
}


@contextmanager
def settings() -> Iterator[None]:
    """Draw with our look alone, whatever the user's own settings are.

    The settings that were there before come back at the end.
    """
    with matplotlib.rc_context():
        matplotlib.rcdefaults()
        matplotlib.rcParams.update(_LOOK)
        yield


def new_figure(height_inches: float) -> tuple[Figure, Axes]:
    """Return an empty figure of the common width, with one pair of axes."""
    figure = Figure(figsize=(WIDTH_INCHES, height_inches), layout="constrained")
    FigureCanvasSVG(figure)
    axes = figure.add_subplot()
    axes.set_axisbelow(True)
    return figure, axes


def svg_bytes(figure: Figure) -> bytes:
    """Return the figure as SVG: the same bytes on every call."""
    target = io.BytesIO()
    nothing = dict.fromkeys(("Creator", "Date", "Format", "Type"))
    figure.savefig(target, format="svg", metadata=nothing)
    lines = target.getvalue().splitlines()
    return b"\n".join(line.rstrip() for line in lines) + b"\n"


def inline(svg: bytes, name: str, label: str) -> Markup:
    """Return a figure for the page: ids of its own, colours that follow the page.

    Parameters
    ----------
    svg : bytes
        What `svg_bytes` returned.
    name : str
        Unique on the page; it begins every id.
    label : str
        What the picture shows, for those who do not see it.

    Returns
    -------
    Markup
        An ``svg`` element without anything that refers outside it.
    """
    text = svg.decode()
    opening, _, body = text[text.index("<svg") :].partition(">")
    box = re.search(r'viewBox="[^"]*"', opening)
    body = re.sub(r"<style.*?</style>", "", body, flags=re.DOTALL)  # the page's own
    body = re.sub(r"<[^>]*>", lambda tag: _own(tag.group(), name), body)
    start = Markup('<svg role="img" aria-label="{}" {}>').format(
        label, Markup(box.group()) if box else ""
    )
    return start + Markup(body.strip())


def _own(tag: str, name: str) -> str:
    """Return one tag with ids under `name` and with the page's colours."""
    tag = re.sub(r'(\sid="|href="#|url\(#)', rf"\g<1>{name}-", tag)
    for colour, variable in _VARIABLES.items():
        tag = tag.replace(colour, variable)
    return tag


def drawable(name: str, longest: int) -> str:
    """Return an id that a figure's font can draw, at most `longest` signs."""
    font = get_font(findfont("DejaVu Sans"))
    return "".join(
        sign if font.get_char_index(ord(sign)) else "□"
        for sign in shorten(name, longest)
    )
