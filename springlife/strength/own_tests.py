"""Reader of a table of own tests: a CSV file with one row a spring, failed or run-out."""

from __future__ import annotations

import csv
import hashlib
import io
import math
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from springlife.errors import FileError, InputError, nearest
from springlife.strength.criteria import Floats
from springlife.units import factor

OUTCOMES = {"failed": True, "run-out": False}
COLUMNS = ("stress_amplitude", "stress_mean", "cycles", "outcome", "group")


@dataclass(frozen=True)
class OwnTests:
    """A table of tests, one row a spring: stresses in Pa, ``group`` None without such a column."""

    path: Path
    sha256: str
    amplitude: Floats
    mean: Floats
    cycles: Floats
    failed: NDArray[np.bool_]
    group: tuple[str, ...] | None


def read_tests(path: str | Path) -> OwnTests:
    """Read a CSV table of tests, one row a spring.

    Columns: ``stress_amplitude [MPa]``, ``stress_mean [MPa]`` (any unit of stress), ``cycles``, ``outcome``
    (failed or run-out) and, if wanted, ``group``.

    Raises
    ------
    FileError, InputError
        Named by file, row and column; every fault of the rows is listed.
    """
    path = Path(path)
    try:
        content = path.read_bytes()
    except FileNotFoundError as error:
        raise FileError(f"{path}: there is no such file; check the path") from error
    except OSError as error:
        raise FileError(f"{path}: cannot be read ({error.strerror}); name a CSV file of tests") from error
    try:
        rows = list(csv.reader(io.StringIO(content.decode("utf-8-sig"), newline="")))
    except (UnicodeDecodeError, csv.Error) as error:
        raise InputError(f"{path}: not CSV in UTF-8 ({error}); save the table as such") from error
    rows = [[cell.strip() for cell in row] for row in rows]
    if not any(any(row) for row in rows):
        raise InputError(f"{path}: is empty; the first row names the columns {', '.join(COLUMNS[:4])}")
    places, scales = _header(rows[0], path)
    faults: list[str] = []
    read = [
        _row(row, f"{path}: row {number}", places, scales, faults)
        for number, row in enumerate(rows[1:], start=2)
        if any(row)
    ]
    if faults:
        raise InputError("\n".join(faults[:20]))
    if not read:
        raise InputError(f"{path}: has a header but no tests; give one row a spring")
    amplitude, mean, cycles = (np.array([row[i] for row in read]) for i in range(3))
    return OwnTests(
        path=path,
        sha256=hashlib.sha256(content).hexdigest(),
        amplitude=amplitude,
        mean=mean,
        cycles=cycles,
        failed=np.array([OUTCOMES[row[3]] for row in read]),
        group=tuple(row[4] for row in read) if "group" in places else None,
    )


def _header(cells: list[str], path: Path) -> tuple[dict[str, int], dict[str, float]]:
    """Return each column's place, and the factor to SI of the stress columns."""
    places: dict[str, int] = {}
    scales: dict[str, float] = {}
    for i, cell in enumerate(cells):
        name, bracket, rest = (part.strip() for part in cell.partition("["))
        unit = rest.removesuffix("]").strip()
        if name not in COLUMNS:
            raise InputError(f"{path}: column {cell!r} is not known; {nearest(name, COLUMNS)}")
        if name in places:
            raise InputError(f"{path}: column {name!r} is there twice; keep one")
        if name.startswith("stress"):
            if not unit:
                raise InputError(f"{path}: column {cell!r} has no unit; write it as '{name} [MPa]'")
            try:
                scales[name] = factor(unit, "stress")[0]
            except InputError as error:
                raise InputError(f"{path}: column {cell!r}: {error}") from error
        elif bracket:
            raise InputError(f"{path}: column {cell!r} takes no unit; write it as {name!r}")
        places[name] = i
    for name in COLUMNS[:4]:
        if name not in places:
            raise InputError(f"{path}: column {name!r} is missing; the header names {', '.join(map(repr, cells))}")
    return places, scales


def _row(
    cells: list[str], where: str, places: dict[str, int], scales: dict[str, float], faults: list[str]
) -> tuple[float, float, float, str, str]:
    """Return amplitude, mean, cycles, outcome and group of one row; add what is wrong to ``faults``."""
    if len(cells) != len(places):
        faults.append(f"{where} has {len(cells)} cells; the header has {len(places)}")
        return 0.0, 0.0, 0.0, "failed", ""

    def number(name: str, least: str) -> float:
        text = cells[places[name]]
        try:
            value = float(text)
        except ValueError:
            value = math.nan
        if not math.isfinite(value) or value < 0 or (value == 0 and least == "above zero"):
            faults.append(f"{where}, column {name!r}: {text!r} must be a number, {least}")
        return value * scales.get(name, 1.0)

    outcome = cells[places["outcome"]]
    if outcome not in OUTCOMES:
        faults.append(f"{where}, column 'outcome': {outcome!r} is not known; {nearest(outcome, OUTCOMES)}")
    group = cells[places["group"]] if "group" in places else ""
    if "group" in places and not group:
        faults.append(f"{where}, column 'group': is empty; name the group of every spring")
    amplitude, mean = number("stress_amplitude", "above zero"), number("stress_mean", "zero or above")
    return amplitude, mean, number("cycles", "above zero"), outcome, group
