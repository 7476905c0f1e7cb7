"""A small good case that tests bend: text, so that every fault is one a person could type."""

from __future__ import annotations

from pathlib import Path

CASE = """\
format = 1
title = "a latch"
[spring]
grade = "A228"
wire_diameter = "2.0 mm"
mean_diameter = "16 mm"
total_coils = 12
ends = "squared and ground"
free_length = "60 mm"
[duty]
one_pass = "1 h"
target = "100 h"
[[duty.event]]
name = "work"
record = "work.csv"
channel = "travel"
time = "t"
unit = "mm"
measures = "deflection"
repeats = 3
[judge]
criterion = "gerber"
"""
RECORD = "t,travel\n0.0,5\n0.1,12\n0.2,6\n0.3,15\n0.4,5\n0.5,10\n"


def write_case(folder: Path, case: str = CASE, record: str | bytes | None = RECORD) -> Path:
    """Write case.toml and work.csv; ``record=None`` leaves the record out."""
    (folder / "case.toml").write_text(case, encoding="utf-8")
    if isinstance(record, str):
        (folder / "work.csv").write_text(record, encoding="utf-8")
    elif record is not None:
        (folder / "work.csv").write_bytes(record)
    return folder / "case.toml"
