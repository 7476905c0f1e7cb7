"""Figures to files, always the same bytes for the same figure."""

from __future__ import annotations

import io
import re
from pathlib import Path
from typing import TYPE_CHECKING

from springlife.errors import InputError, nearest
from springlife.files import write_file

if TYPE_CHECKING:
    from matplotlib.figure import Figure

# Without its date a file is the same at every run.
METADATA: dict[str, dict[str, str | None]] = {
    ".svg": {"Date": None},
    ".png": {"Software": "springlife"},
    ".pdf": {"CreationDate": None},
}


def save_figure(figure: Figure, path: str | Path, *, force: bool = False) -> Path:
    """Save a figure as SVG, PNG or PDF, by the file's ending.

    Raises
    ------
    InputError
        Another ending.
    FileError
        The file is there already, or cannot be written.
    """
    import matplotlib

    from springlife.report.style import STYLE

    path = Path(path)
    if path.suffix.lower() not in METADATA:
        raise InputError(f"{path}: a figure cannot be written as {path.suffix!r}; {nearest(path.suffix, METADATA)}")

    def save(place: Path) -> None:
        if path.suffix.lower() == ".svg":
            place.write_text(svg_of(figure), encoding="utf-8")
            return
        with matplotlib.rc_context(STYLE):  # type: ignore[arg-type]  # its keys are plain strings here
            figure.savefig(place, metadata=METADATA[path.suffix.lower()])

    return write_file(path, save, force=force)


def svg_of(figure: Figure) -> str:
    """Return a figure as SVG text; what :func:`springlife.report.style.tip` noted is shown on hover."""
    import matplotlib

    from springlife.report.style import STYLE, TIP

    text = io.StringIO()
    with matplotlib.rc_context(STYLE):  # type: ignore[arg-type]  # its keys are plain strings here
        figure.savefig(text, format="svg", metadata=METADATA[".svg"])
    # The identifier has been escaped as an attribute, which is safe as text too.
    svg = re.sub(rf'<g id="{TIP}([^"]*)">', r'<g class="tip"><title>\1</title>', text.getvalue())
    return re.sub(r"<[^>]*>", _tidied, svg)


def _tidied(tag: re.Match[str]) -> str:
    """Return a tag with short paths and a second choice of font; text between tags is left alone."""
    named = tag[0].replace("'DejaVu Sans'", "'DejaVu Sans', Verdana, sans-serif")
    return re.sub(r'(?<= d=")[^"]*', _rounded, named)


def _rounded(path: re.Match[str]) -> str:
    """Round a path to hundredths of a point: nobody sees the rest, and a page stays small."""
    return re.sub(r"-?\d+\.\d{3,}", lambda number: f"{float(number[0]):.2f}".rstrip("0").rstrip("."), path[0])
