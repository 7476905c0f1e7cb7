"""The report as a PDF that can be archived and read aloud: PDF/A-2b and PDF/UA-1, set by typst."""

from __future__ import annotations

import json
import re
import tempfile
from collections.abc import Mapping
from datetime import date
from importlib.resources import files
from pathlib import Path
from typing import TYPE_CHECKING, Any

from springlife.report.style import with_glyphs

if TYPE_CHECKING:
    from springlife.report.contents import Report

PAPERS = {"a4": "a4", "letter": "us-letter"}
UNDATED = date(1970, 1, 1)  # archives want a date in the file; one that nobody takes for the report's
LONGEST = 22  # characters of a word that a line can always hold
WIDE, NARROW = 24, 60  # characters: columns of more than WIDE share the width, as if of NARROW at most
_LONG_WORD = re.compile(rf"\S{{{LONGEST + 1},}}")
_HASH = re.compile(r"[0-9a-f]{64}")


def sheet(report: Report, figures: Mapping[str, str], *, paper: str = "a4") -> bytes:
    """Return the PDF; ``figures`` holds the SVG text of each figure by name."""
    import matplotlib
    import typst

    lost: set[str] = set()
    data = _settable(report.to_dict(), lost)
    data |= {"paper": PAPERS[paper], "foot": " · ".join(t for t in (data["title"], data["subtitle"]) if t)[:110]}
    data["stamp"] = _stamp(report.date)
    data["notes"] = [_replaced(lost)] if lost else []
    for block in [*data["front"], *(block for section in data["sections"] for block in section["blocks"])]:
        if block["kind"] == "table":
            block["widths"] = widths(block["heads"], block["rows"])
    template = files("springlife").joinpath("report/templates/sheet.typ").read_text(encoding="utf-8")
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        (folder / "figures").mkdir()
        (folder / "sheet.typ").write_text(template, encoding="utf-8")
        (folder / "data.json").write_text(json.dumps(data), encoding="utf-8")
        for figure, svg in figures.items():
            (folder / "figures" / f"{figure}.svg").write_text(svg, encoding="utf-8")
        return bytes(
            typst.compile(
                str(folder / "sheet.typ"),
                root=name,
                format="pdf",
                font_paths=[str(Path(matplotlib.get_data_path()) / "fonts" / "ttf")],
                ignore_system_fonts=True,  # the same file on every machine
                pdf_standards=["a-2b", "ua-1"],
            )
        )


def _stamp(text: str) -> dict[str, int]:
    """Return the date of the file's own record; free text that is not a date leaves it undated."""
    try:
        day = date.fromisoformat(text)
    except ValueError:
        day = UNDATED
    return {"year": day.year, "month": day.month, "day": day.day}


def _settable(value: Any, lost: set[str]) -> Any:
    """Return data with text that can be set: every character has a shape, every long word can be broken."""
    if isinstance(value, str):
        text, gone = with_glyphs(value)
        lost |= gone
        return text if _HASH.fullmatch(text) else _LONG_WORD.sub(_breakable, text)
    if isinstance(value, dict):
        return {key: _settable(one, lost) for key, one in value.items()}
    if isinstance(value, list):
        return [_settable(one, lost) for one in value]
    return value


def _breakable(match: re.Match[str]) -> str:
    """Put places to break into a long word: zero-width spaces, which show nothing."""
    word = match[0]
    return "\u200b".join(word[at : at + LONGEST] for at in range(0, len(word), LONGEST))


def _replaced(lost: set[str]) -> str:
    """Say which characters the font has no shape for."""
    signs = ", ".join(f"U+{ord(sign):04X}" for sign in sorted(lost)[:12])
    more = f" and {len(lost) - 12} more" if len(lost) > 12 else ""
    return (
        f"{len(lost)} characters have no shape in the font of this file and are shown as □ ({signs}{more}); "
        "report.html and result.json hold them."
    )


def widths(heads: list[str], rows: list[list[str]]) -> list[int]:
    """Return a share of the width for each column; 0 for one that takes what it needs."""
    found = []
    for number, head in enumerate(heads):
        longest = max((len(row[number]) for row in rows), default=len(head))
        found.append(min(longest, NARROW) if longest > WIDE else 0)
    return found
