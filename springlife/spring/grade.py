"""Wire grades: tensile strength, moduli, static limits and what else belongs to the wire alone.

The numbers and their sources are data/wire_grades.toml; a person adds grades in a file with the same keys.
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from math import inf
from pathlib import Path
from typing import Any

from springlife.errors import FileError, InputError, nearest
from springlife.units import show

# Two spellings of one length ("0.063 in", "1.6002 mm") differ by a rounding error at a border.
_BORDER = 1e-9


class WireRangeError(InputError):
    """A wire diameter for which the grade's table of tensile strength has no value."""


@dataclass(frozen=True)
class Tensile:
    """Sut = A (at/d)^m, Pa, for wire diameters ``low`` to ``high``, m."""

    A: float
    at: float
    m: float
    low: float
    high: float

    def __call__(self, d: float) -> float:
        """Return the tensile strength at a wire diameter, without asking for the range."""
        # A strength that is given directly holds for every diameter, 0 included.
        return self.A * math.pow(self.at / d, self.m) if self.m else self.A


@dataclass(frozen=True)
class Moduli:
    """Young's and shear modulus, Pa, up to the wire diameter ``high``, m."""

    high: float
    E: float
    G: float


@dataclass(frozen=True)
class Grade:
    """A wire grade in SI. ``static_after`` is the lower and upper end; ``relative_cost`` is by mass.

    ``cyclic_family`` names the row of the handbook's cyclic fractions, None where it has none;
    ``tensile_bounds`` is the range of a tensile strength given directly, for scatter.
    """

    name: str
    title: str
    standard: str
    tensile: tuple[Tensile, ...]
    tensile_bounds: tuple[float, float] | None
    moduli_by_size: tuple[Moduli, ...]
    static_before: float
    static_after: tuple[float, float]
    greatest_temperature: float
    density: float
    relative_cost: float | None
    ferrous: bool
    stainless: bool
    cyclic_family: str | None
    note: str
    sources: tuple[str, ...]

    @property
    def diameter_range(self) -> tuple[float, float]:
        """Least and greatest wire diameter of the tensile table, m."""
        return self.tensile[0].low, self.tensile[-1].high

    def tensile_strength(self, d: float) -> float:
        """Return the tensile strength of wire of this grade, Pa.

        Parameters
        ----------
        d : float
            Wire diameter, m.

        Raises
        ------
        WireRangeError
            The diameter is outside the table: nothing is extrapolated.

        Notes
        -----
        Sut = A/d^m in segments of the diameter; at a shared border the thinner segment holds. A certificate
        or the wire standard's own table is better.

        References
        ----------
        Shigley's Mechanical Engineering Design, table 10-4; provenance by grade in data/wire_grades.toml.
        """
        if d >= self.tensile[0].low * (1 - _BORDER):
            for segment in self.tensile:
                if d <= segment.high * (1 + _BORDER):
                    return segment(d)
        low, high = self.diameter_range
        raise WireRangeError(
            f"wire diameter {_both(d)} is outside the table of {self.name}, {_both(low)} to {_both(high)}; "
            "give tensile_strength from a certificate, or choose a grade made in this size"
        )

    def moduli(self, d: float) -> tuple[float, float]:
        """Return Young's and shear modulus (E, G) at room temperature, Pa, for a wire diameter in m.

        References
        ----------
        Shigley's Mechanical Engineering Design, table 10-5; provenance by grade in data/wire_grades.toml.
        """
        for segment in self.moduli_by_size:
            if d <= segment.high * (1 + _BORDER):
                break
        return segment.E, segment.G

    def describe(self) -> list[str]:
        """Return the grade's numbers as lines for people, SI and inch units side by side."""
        high = self.diameter_range[1]
        before, (least, greatest) = self.static_before, self.static_after
        lines = [f"{self.title}, {self.standard}" if self.standard else self.title]
        if self.tensile_bounds:
            ends = (show(end, "MPa", "stress") for end in self.tensile_bounds)
            lines.append(f"tensile strength as given, {' to '.join(ends)}")
        lines += [_tensile_line(segment) for segment in self.tensile if segment.m or high < inf]
        lines += [
            f"E {show(one.E, 'GPa', 'stress')}, G {show(one.G, 'GPa', 'stress')}"
            + (f" up to {_both(one.high)}" if one.high < inf else "")
            for one in self.moduli_by_size
        ]
        lines.append(f"static limit {before:g} Sut, after set removal {least:g} to {greatest:g} Sut")
        lines.append(
            f"up to {show(self.greatest_temperature, 'degC', 'temperature')}, {self.density:g} kg/m^3"
            + (f", relative cost {self.relative_cost:g}" if self.relative_cost else "")
        )
        return lines + ([self.note] if self.note else []) + list(self.sources)

    def to_dict(self) -> dict[str, Any]:
        """Give the grade for JSON, SI values under keys that name the unit; no upper end is null."""
        return {
            "name": self.name,
            "title": self.title,
            "standard": self.standard,
            "tensile": [
                {
                    "A_Pa": s.A,
                    "at_m": s.at,
                    "m": s.m,
                    "from_m": s.low,
                    "to_m": s.high if s.high < inf else None,
                }
                for s in self.tensile
            ],
            "tensile_bounds_Pa": self.tensile_bounds,
            "moduli": [
                {"to_m": s.high if s.high < inf else None, "E_Pa": s.E, "G_Pa": s.G} for s in self.moduli_by_size
            ],
            "static_before": self.static_before,
            "static_after": self.static_after,
            "greatest_temperature_K": self.greatest_temperature,
            "density_kg_per_m3": self.density,
            "relative_cost": self.relative_cost,
            "ferrous": self.ferrous,
            "stainless": self.stainless,
            "cyclic_family": self.cyclic_family,
            "note": self.note,
            "sources": list(self.sources),
        }


def grade(name: str, grade_file: str | Path | None = None) -> Grade:
    """Return a wire grade by name: ``"A228"``, ``"a228"`` and ``"ASTM A228"`` are one.

    Parameters
    ----------
    name : str
        A grade of the package, or of ``grade_file``.
    grade_file : path, optional
        A file of further grades.

    Raises
    ------
    InputError
        An unknown grade (all known ones are listed), or a faulty file.
    FileError
        The file cannot be read.
    """
    known = grades(grade_file)
    if isinstance(name, str):
        for one in known.values():
            if _key(one.name) == _key(name):
                return one
    where = f" (with {grade_file})" if grade_file else ""
    raise InputError(f"grade {name!r} is not known{where}; {nearest(name, known)}")


def grades(grade_file: str | Path | None = None) -> dict[str, Grade]:
    """Return all grades by name: those of the package, then those of ``grade_file``.

    Raises
    ------
    InputError
        The file is faulty, or gives a grade of the package another meaning.
    FileError
        The file cannot be read.
    """
    known = _own()
    if grade_file is None:
        return dict(known)
    path = Path(grade_file)
    try:
        text = path.read_text(encoding="utf-8-sig")
    except OSError as error:
        raise FileError(f"{path}: cannot be read ({error.strerror}); check the path") from error
    except UnicodeDecodeError as error:
        raise InputError(f"{path}: byte {error.start} is not UTF-8 text; save the file as UTF-8") from error
    added = _read(text, str(path))
    for name in added:
        if _key(name) in {_key(ours) for ours in known}:
            raise InputError(f"{path}: grade {name!r} is in the package already; give yours a name of its own")
    return known | added


@cache
def _own() -> dict[str, Grade]:
    file = files("springlife").joinpath("data/wire_grades.toml")
    return _read(file.read_text(encoding="utf-8"), "wire_grades.toml")


@cache
def _read(text: str, where: str) -> dict[str, Grade]:
    from springlife.spring.grade_file import read_grades

    return read_grades(text, where)


def _key(name: str) -> str:
    return re.sub(r"[^a-z0-9]", "", name.lower()).removeprefix("astm")


def _both(length: float) -> str:
    return f"{show(length, 'mm', 'length', 5)} ({show(length, 'in', 'length', 4)})"


def _tensile_line(segment: Tensile) -> str:
    low, high = segment(segment.low), segment(segment.high)
    ends = f"{show(low, 'MPa', 'stress')} to {show(high, 'MPa', 'stress')}" if segment.m else show(low, "MPa", "stress")
    return f"Sut {ends} from {_both(segment.low)} to {_both(segment.high)} (exponent {segment.m:g})"
