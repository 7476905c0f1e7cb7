"""The one style of all figures: sober ink, one accent, greys; readable in grey and by colour-blind people."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from functools import cache
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

# Ink, one accent, greys: dark enough to print, apart in lightness as well as in hue.
INK, ACCENT, GREY, PALE = "#1d2733", "#a8401c", "#66707a", "#c9ced3"
PATTERNS = {"goodman": (0, (6, 2)), "gerber": "-", "asme-elliptic": (0, (6, 2, 1, 2)), "sines": (0, (1, 1.6))}
SIZE = (7.2, 4.6)  # inches: the width of a text column on A4 and letter
MISSING = "\N{WHITE SQUARE}"  # stands for a character that the font has no shape for
TIP = "tip "  # an artist whose gid begins so shows the rest on hover

STYLE = {
    "font.family": "DejaVu Sans",
    "font.size": 9.0,
    "axes.edgecolor": GREY,
    "axes.labelcolor": INK,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "text.color": INK,
    "xtick.color": INK,
    "ytick.color": INK,
    "figure.dpi": 110,
    "svg.hashsalt": "springlife",
    "svg.fonttype": "none",  # text stays text: it can be searched, selected and read aloud
}


@contextmanager
def figure_in_style(size: tuple[float, float] = SIZE) -> Iterator[Figure]:
    """Make a figure in the house style without pyplot."""
    import matplotlib
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    with matplotlib.rc_context(STYLE):  # type: ignore[arg-type]  # its keys are plain strings here
        figure = Figure(figsize=size, layout="constrained")
        FigureCanvasAgg(figure)
        yield figure


@contextmanager
def axes_in_style(size: tuple[float, float] = SIZE) -> Iterator[tuple[Figure, Axes]]:
    """Make a figure with one pair of axes in the house style."""
    with figure_in_style(size) as figure:
        yield figure, figure.add_subplot()


def tip(artist: Any, text: str) -> None:
    """Have an artist show a text on hover in the page; the writer of SVG turns it into a title."""
    artist.set_gid(TIP + text)


@cache
def _glyphs() -> frozenset[int]:
    """Return the characters that the font of figures and PDF has shapes for."""
    from matplotlib.font_manager import FontProperties, findfont, get_font

    return frozenset(get_font(findfont(FontProperties(family="DejaVu Sans"))).get_charmap())


def with_glyphs(text: str) -> tuple[str, set[str]]:
    """Return text with every character that has no shape replaced, and those characters."""
    lost = {sign for sign in text if ord(sign) not in _glyphs() and sign not in "\n\t"}
    return "".join(MISSING if sign in lost else sign for sign in text), lost


def drawable(text: str, most: int = 40) -> str:
    """Return text of a case as a figure can show it: shortened, on one line, never read as mathematics."""
    text = " ".join(text.split())
    short = text if len(text) <= most else text[: most - 1] + "…"
    # A leading underscore would hide a legend's entry.
    return (" " if short.startswith("_") else "") + with_glyphs(short)[0].replace("$", r"\$")
