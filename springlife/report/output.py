"""Figures to files, always the same bytes for the same figure."""

from __future__ import annotations

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

    from springlife.report.figures import STYLE

    path = Path(path)
    if path.suffix.lower() not in METADATA:
        raise InputError(f"{path}: a figure cannot be written as {path.suffix!r}; {nearest(path.suffix, METADATA)}")

    def save(place: Path) -> None:
        with matplotlib.rc_context(STYLE):  # type: ignore[arg-type]  # its keys are plain strings here
            figure.savefig(place, metadata=METADATA[path.suffix.lower()])

    return write_file(path, save, force=force)
