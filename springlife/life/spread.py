"""The distributions of the scatter study: defaults from tolerance tables, or what the case says instead.

A tolerance is a normal distribution about the drawn value, cut off at the half-range; a factor is lognormal
about its median.
"""

from __future__ import annotations

import tomllib
from dataclasses import dataclass, replace
from functools import cache
from importlib.resources import files
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from springlife.errors import InputError
from springlife.life.scatter_input import VARIABLES, ScatterInput
from springlife.spring.helical import DIAMETERS
from springlife.strength import endurance
from springlife.units import METRIC, parse, significant

if TYPE_CHECKING:
    from springlife.life.case import Case
    from springlife.spring.helical import HelicalSpring

Floats = NDArray[np.float64]
FROM_CASE = "the case file"
B10 = 0.1  # part of the springs that a B10 strength leaves below it


@dataclass(frozen=True)
class Spread:
    """How one variable scatters about ``centre`` (SI; 1 for a factor).

    Either ``half_range`` and ``sigmas`` of a cut-off normal are set, or ``log_sd`` of a lognormal.
    """

    name: str
    kind: str  # of units.py; "number" for coils and factors
    centre: float
    source: str
    provenance: str
    half_range: float | None = None
    sigmas: float | None = None
    log_sd: float | None = None

    def values(self, u: Floats) -> Floats:
        """Turn uniform numbers between 0 and 1 into values of the variable, SI, same shape.

        Notes
        -----
        Cut-off normal, half-range h of s standard deviations: centre + h/s Phi^-1(u') with
        u' = Phi(-s) + u (Phi(s) - Phi(-s)). Lognormal: centre exp(sd Phi^-1(u)).
        """
        from scipy.special import ndtr, ndtri

        if self.log_sd is not None:
            return np.asarray(self.centre * np.exp(self.log_sd * ndtri(u)), dtype=np.float64)
        assert self.half_range is not None and self.sigmas is not None
        outside = ndtr(-self.sigmas)
        deviations = ndtri(outside + u * (1 - 2 * outside))
        return np.asarray(self.centre + self.half_range / self.sigmas * deviations, dtype=np.float64)

    def to_dict(self) -> dict[str, Any]:
        """Give the distribution for JSON, SI values."""
        law = "lognormal" if self.log_sd is not None else "normal, cut off at the half-range"
        return {
            "variable": self.name,
            "law": law,
            "centre": self.centre,
            "half_range": self.half_range,
            "sigmas": self.sigmas,
            "log_sd": self.log_sd,
            "unit": _SI[self.kind],
            "source": self.source,
            "provenance": self.provenance,
        }


_SI = {"length": "m", "stress": "Pa", "number": ""}


@cache
def defaults() -> dict[str, Any]:
    """Return data/scatter.toml as written: every number with its source and provenance."""
    text = files("springlife").joinpath("data/scatter.toml").read_text(encoding="utf-8")
    return tomllib.loads(text)


def spreads_of(case: Case, spring: HelicalSpring) -> tuple[Spread, ...]:
    """Return the distribution of every variable that the case does not switch off, in one fixed order.

    Raises
    ------
    InputError
        A half-range of the case as wide as the value itself.
    """
    given = case.input.scatter
    makers = {
        "wire_diameter": lambda: _tolerance(case, "wire_diameter", "length", spring.wire_diameter, spring),
        "coil_diameter": lambda: _tolerance(case, "coil_diameter", "length", drawn_diameter(case)[1], spring),
        "active_coils": lambda: _tolerance(case, "active_coils", "number", spring.active_coils, spring),
        "free_length": lambda: _tolerance(case, "free_length", "length", spring.free_length, spring),
        "shear_modulus": lambda: _tolerance(case, "shear_modulus", "stress", spring.G, spring),
        "tensile_strength": lambda: _tolerance(case, "tensile_strength", "stress", spring.Sut, spring),
        "endurance_strength": lambda: _endurance(given),
        "life": lambda: _life(given),
        "duty": lambda: _factor("duty", given, defaults()["duty"]),
        "allowed_damage": lambda: _allowed(given, case.judge.allowed_damage),
    }
    return tuple(makers[name]() for name in VARIABLES if name not in given.off)


def drawn_diameter(case: Case) -> tuple[str, float]:
    """Return name and value (m) of the one coil diameter that the drawing gives: its tolerance is on that one."""
    return next((name, value) for name in DIAMETERS if (value := getattr(case.spring, name)) is not None)


def _tolerance(case: Case, name: str, kind: str, centre: float, spring: HelicalSpring) -> Spread:
    reading = defaults()["reading"]
    override = getattr(case.input.scatter, name)
    if override is not None:
        half = centre * override.share if override.half_range is None else override.half_range
        if not half < centre / 2:
            seen, drawn = (_shown(value, kind) for value in (half, centre))
            raise InputError(
                f"{case.path}: scatter.{name}.half_range is {seen}, not under half of the drawing's {drawn}; "
                "check its unit"
            )
        return Spread(name, kind, centre, FROM_CASE, FROM_CASE, half, override.sigmas or reading["sigmas"])
    half, entry = _LOOKUPS[name](spring) if name in _LOOKUPS else (None, {})
    if half is None:
        entry = defaults()[name]["other"]
        half = entry["half_range_coils"] if "half_range_coils" in entry else centre * entry["share"]
    return Spread(name, kind, centre, entry["source"], entry["provenance"], half, reading["sigmas"])


def _shown(value: float, kind: str) -> str:
    return significant(value) if kind == "number" else METRIC(value, kind)


def _factor(name: str, given: ScatterInput, entry: dict[str, Any], centre: float = 1.0) -> Spread:
    override = getattr(given, name)
    cov = entry["cov"] if override is None else override.cov
    source, provenance = _origin(override, entry)
    return Spread(name, "number", centre, source, provenance, log_sd=_log_sd(cov))


def _origin(override: object, entry: dict[str, Any]) -> tuple[str, str]:
    """Return source and provenance of what is used."""
    return (entry["source"], entry["provenance"]) if override is None else (FROM_CASE, FROM_CASE)


def _log_sd(cov: float) -> float:
    """Standard deviation of ln x of a lognormal with this coefficient of variation."""
    return float(np.sqrt(np.log1p(cov**2)))


def _endurance(given: ScatterInput) -> Spread:
    """The factor on strengths; read as B10, the printed strength is passed by nine springs in ten."""
    from scipy.special import ndtri

    spread = _factor("endurance_strength", given, defaults()["endurance_strength"])
    assert spread.log_sd is not None
    if given.strengths_are == "median":
        return spread
    return replace(spread, centre=float(np.exp(-spread.log_sd * ndtri(B10))))


def _life(given: ScatterInput) -> Spread:
    entry = defaults()["life"]
    sd = entry["log10_sd"] if given.life is None else given.life.log10_sd
    source, provenance = _origin(given.life, entry)
    return Spread("life", "number", 1.0, source, provenance, log_sd=sd * float(np.log(10)))


def _allowed(given: ScatterInput, allowed: float) -> Spread:
    entry = endurance.data()["miner"]["scatter"]
    return _factor("allowed_damage", given, entry, allowed * entry["median"])


Found = tuple[float | None, dict[str, Any]]


def wire_half_range(grade: str, diameter: float) -> Found:
    """Return the half-range of a wire diameter, m, with its table; None outside every table."""
    inches = diameter / parse("1 in", "length")
    for table in defaults()["wire_diameter"]["table"]:
        if grade in table["grades"] and table["from_in"] <= inches:
            # A hair of rounding must not push a diameter on a border into the thicker row.
            for up_to, half in zip(table["up_to_in"], table["half_range_in"], strict=True):
                if inches <= up_to * (1 + 1e-9):
                    return half * parse("1 in", "length"), table
    return None, {}


def coil_half_range(diameter: float, index: float) -> Found:
    """Return the half-range of a coil diameter, m, for a wire diameter in m and an index; None outside."""
    table, inch = defaults()["coil_diameter"]["table"], parse("1 in", "length")
    half = _between(table["wire_in"], table["index"], table["half_range_in"], diameter / inch, index)
    return None if half is None else half * inch, table


def length_half_range(free_length: float, active_coils: float, index: float) -> Found:
    """Return the half-range of a free length, m; None outside the table."""
    table = defaults()["free_length"]["table"]
    pitch = active_coils / (free_length / parse("1 in", "length"))
    half = _between(table["coils_per_in"], table["index"], table["half_range_in_per_in"], pitch, index)
    return None if half is None else half * free_length, table


def tensile_share(grade: str, diameter: float) -> Found:
    """Return the half-range of a tensile strength as a share of the middle; None outside every table."""
    for table in defaults()["tensile_strength"]["table"]:
        if grade not in table["grades"]:
            continue
        unit, stress = ("in", "kpsi") if "wire_in" in table else ("mm", "MPa")
        rows, seen = np.asarray(table[f"wire_{unit}"], dtype=float), diameter / parse(f"1 {unit}", "length")
        low, high = (np.asarray(table[f"{end}_{stress}"], dtype=float) for end in ("least", "greatest"))
        if rows[0] * (1 - 1e-9) <= seen <= rows[-1] * (1 + 1e-9):
            return float(np.interp(seen, rows, (high - low) / (high + low))), table
    return None, {}


def _tensile_half_range(spring: HelicalSpring) -> Found:
    share, table = tensile_share(spring.grade.name, spring.wire_diameter)
    return None if share is None else share * spring.Sut, table


_LOOKUPS = {
    "wire_diameter": lambda spring: wire_half_range(spring.grade.name, spring.wire_diameter),
    "coil_diameter": lambda spring: coil_half_range(spring.wire_diameter, spring.index),
    "free_length": lambda spring: length_half_range(spring.free_length, spring.active_coils, spring.index),
    "tensile_strength": _tensile_half_range,
}


def _between(
    rows: list[float], columns: list[float], table: list[list[float]], row: float, column: float
) -> float | None:
    """Read a table on straight lines between its rows and columns; None outside it."""
    hair = 1e-9
    for ends, seen in ((rows, row), (columns, column)):
        if not ends[0] * (1 - hair) <= seen <= ends[-1] * (1 + hair):
            return None
    at_column = [float(np.interp(column, columns, line)) for line in table]
    return float(np.interp(row, rows, at_column))
