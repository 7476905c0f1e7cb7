"""The helical compression spring of round wire: geometry, rate, solid, buckling, surge frequency.

Everything in SI. Deflection is counted from the free length.
"""

from __future__ import annotations

import math
import tomllib
from collections.abc import Iterator
from dataclasses import dataclass
from functools import cached_property
from importlib.resources import files
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from springlife.errors import InputError, nearest
from springlife.spring.grade import Grade, grade
from springlife.units import show

DIAMETERS = ("mean_diameter", "outer_diameter", "inner_diameter")
_SIZES = ("wire_diameter", "total_coils", "free_length")
_OPTIONAL = ("tensile_strength", "shear_modulus", "measured_rate")
_PROPERTIES = ("temperature", *_OPTIONAL)
_UNITS = dict.fromkeys((*DIAMETERS, "wire_diameter", "free_length"), "m") | {
    "total_coils": "coils",
    "temperature": "K",
    "tensile_strength": "Pa",
    "shear_modulus": "Pa",
    "measured_rate": "N/m",
}


def _rules() -> dict[str, Any]:
    return tomllib.loads(files("springlife").joinpath("data/spring_rules.toml").read_text(encoding="utf-8"))


_RULES = _rules()
_SOURCED = ("source", "provenance")
ENDS: dict[str, dict[str, int]] = {key: row for key, row in _RULES["ends"].items() if key not in _SOURCED}
SUPPORTS: dict[str, float] = _RULES["supports"]["alpha"]
SSU_OVER_SUT: float = _RULES["ultimate_shear"]["fraction_of_tensile"]


class GeometryError(InputError):
    """A spring that cannot exist. ``faults`` holds one sentence each."""

    def __init__(self, faults: tuple[str, ...]) -> None:
        """Join the faults into one message."""
        super().__init__("; ".join(faults))
        self.faults = faults

    def __reduce__(self) -> tuple[Any, ...]:
        """Let the error pass between processes."""
        return type(self), (self.faults,)


class _Derived(float):
    """A diameter that follows from the one given; ``dataclasses.replace`` has it derived anew."""


_NOT_GIVEN = _Derived("nan")


@dataclass(frozen=True, kw_only=True)
class HelicalSpring:
    """A helical compression spring of round wire, SI.

    Parameters
    ----------
    grade : Grade or str
        The wire.
    wire_diameter, free_length : float
        m.
    total_coils : float
        Nt, end coils included.
    mean_diameter, outer_diameter, inner_diameter : float
        Exactly one of them, m; the other two follow. ``dataclasses.replace`` keeps the one that was given
        when the wire changes; to give another one, pass the first as None.
    ends : str
        A key of :data:`ENDS`.
    shot_peened, set_removed : bool
        Treatments.
    supports : str
        A key of :data:`SUPPORTS`, for buckling.
    guided : bool
        Whether a rod or a bore keeps the spring from buckling.
    temperature : float
        K. Strength and moduli are those at room temperature.
    tensile_strength, shear_modulus : float, optional
        Pa, from a certificate or test, instead of the grade's.
    measured_rate : float, optional
        N/m, from the drawing or a test; used instead of the calculated one.

    Raises
    ------
    InputError
        Arguments that are not of the right kind, or an unknown grade, ends or supports.
    GeometryError
        The spring cannot exist; all faults are named.
    WireRangeError
        The grade's table has no strength for this wire, and none is given.
    """

    grade: Grade
    wire_diameter: float
    total_coils: float
    free_length: float
    mean_diameter: float = _NOT_GIVEN
    outer_diameter: float = _NOT_GIVEN
    inner_diameter: float = _NOT_GIVEN
    ends: str = "squared and ground"
    shot_peened: bool = False
    set_removed: bool = False
    supports: str = "flat-flat"
    guided: bool = False
    temperature: float = 293.15
    tensile_strength: float | None = None
    shear_modulus: float | None = None
    measured_rate: float | None = None

    def __post_init__(self) -> None:
        """Check everything once and derive the diameters that were not given."""
        if not isinstance(self.grade, Grade):
            self._set("grade", grade(self.grade))
        given = self._diameters_given()
        wrong = [*self._wrong_arguments(given)] or [*self._wrong_modulus()]
        if wrong:
            raise InputError("; ".join(wrong))
        faults = [*self._wrong_sizes(given)]
        if not faults:
            self._derive(*given)
            faults = [*self._impossible()]
        if faults:
            raise GeometryError(tuple(faults))
        if self.tensile_strength is None:
            self.grade.tensile_strength(self.wire_diameter)

    def _set(self, name: str, value: object) -> None:
        object.__setattr__(self, name, value)

    def _diameters_given(self) -> list[str]:
        values = ((name, getattr(self, name)) for name in DIAMETERS)
        return [name for name, value in values if value is not None and not isinstance(value, _Derived)]

    def _wrong_arguments(self, given: list[str]) -> Iterator[str]:
        """Yield arguments of the wrong kind: they are mistakes in the call rather than in the spring."""
        if len(given) != 1:
            seen = " and ".join(given) or "none"
            yield f"give exactly one of {', '.join(DIAMETERS)}; {seen} given"
        for name in (*_SIZES, *given, *_PROPERTIES):
            value = getattr(self, name)
            if value is None and name in _OPTIONAL:
                continue
            if type(value) is not float:
                try:
                    self._set(name, _float(value))
                except InputError as error:
                    yield f"{name} is {error} in {_UNITS[name]}"
                    continue
            if name in _PROPERTIES and not 0 < value < math.inf:
                yield f"{name} is {value:g} {_UNITS[name]}; it must be above 0 and finite"
        if self.ends not in ENDS:
            yield f"ends {self.ends!r} is not known; {nearest(self.ends, ENDS)}"
        if self.supports not in SUPPORTS:
            yield f"supports {self.supports!r} is not known; {nearest(self.supports, SUPPORTS)}"

    def _wrong_modulus(self) -> Iterator[str]:
        if self.G >= self.E:
            yield (
                f"shear_modulus {show(self.G, 'GPa', 'stress')} is not below Young's modulus "
                f"{show(self.E, 'GPa', 'stress')} of {self.grade.name}; check its unit"
            )

    def _wrong_sizes(self, given: list[str]) -> Iterator[str]:
        for name in (*_SIZES, *given):
            value = getattr(self, name)
            if not 0 < value < math.inf:
                yield f"{name} is {value:g} {_UNITS[name]}; it must be above 0 and finite"

    def _derive(self, given: str) -> None:
        """Work the other two diameters out of the one given."""
        d = self.wire_diameter
        steps = dict(zip(DIAMETERS, (0.0, d, -d), strict=True))
        D = getattr(self, given) - steps[given]
        for name, step in steps.items():
            if name != given:
                self._set(name, _Derived(D + step))

    def _impossible(self) -> Iterator[str]:
        """Yield what cannot be built, in the numbers of the drawing."""
        if self.inner_diameter <= 0:
            yield (
                f"inner diameter {_mm(self.inner_diameter)} is left of mean diameter "
                f"{_mm(self.mean_diameter)} with wire {_mm(self.wire_diameter)}; "
                "check the diameters and which of them is given"
            )
        if self.active_coils <= 0:
            yield (
                f"{self.active_coils:g} active coils are left of total_coils {self.total_coils:g} "
                f"with {self.ends} ends; total_coils must be above {ENDS[self.ends]['inactive']}"
            )
        elif self.solid_deflection <= 0:
            yield (
                f"free length {_mm(self.free_length)} is not above the solid length {_mm(self.solid_length)} "
                f"of {self.total_coils:g} coils; check the free length, coils and wire"
            )
        elif self.inner_diameter > 0 and not (0 < self.calculated_rate < math.inf and 0 < self.mass < math.inf):
            yield (
                f"the rate comes out as {self.calculated_rate:g} N/m and the mass as {self.mass:g} kg; "
                "check the units of the lengths"
            )

    # --- geometry -------------------------------------------------------------------------------

    @property
    def index(self) -> float:
        """C = D/d."""
        return self.mean_diameter / self.wire_diameter

    @property
    def active_coils(self) -> float:
        """Na: total coils less the inactive ones of the ends (Shigley's table 10-1, memory)."""
        return self.total_coils - ENDS[self.ends]["inactive"]

    @property
    def solid_length(self) -> float:
        """Ls, m: the coils touch (Shigley's table 10-1, memory)."""
        return self.wire_diameter * (self.total_coils + ENDS[self.ends]["solid_wires"])

    @property
    def solid_deflection(self) -> float:
        """ys = L0 - Ls, m: the greatest deflection there is."""
        return self.free_length - self.solid_length

    @property
    def pitch(self) -> float:
        """Coil to coil of the free spring, m (Shigley's table 10-1, memory)."""
        ends = ENDS[self.ends]
        wires = ends["free_wires"] * self.wire_diameter
        return (self.free_length - wires) / (self.active_coils + ends["free_pitches"])

    @property
    def wire_length(self) -> float:
        """Pi D Nt, m; the helix angle is neglected."""
        return math.pi * self.mean_diameter * self.total_coils

    @property
    def mass(self) -> float:
        """Mass of the wire, kg."""
        return math.pi / 4 * self.wire_diameter * self.wire_diameter * self.wire_length * self.grade.density

    @property
    def active_mass(self) -> float:
        """Mass of the active coils, kg."""
        return self.mass * self.active_coils / self.total_coils

    # --- material -------------------------------------------------------------------------------

    @cached_property
    def Sut(self) -> float:
        """Tensile strength, Pa: the one given, or the grade's."""
        return self.tensile_strength or self.grade.tensile_strength(self.wire_diameter)

    @property
    def Ssu(self) -> float:
        """Ultimate strength in shear, Pa: 0.67 Sut (Shigley's eq. 10-30, memory)."""
        return SSU_OVER_SUT * self.Sut

    @property
    def Ssy(self) -> float:
        """Static torsional limit before set removal, Pa (Shigley's table 10-6, memory)."""
        return self.grade.static_before * self.Sut

    @property
    def static_limit(self) -> float:
        """Static torsional limit as built, Pa: after set removal the lower end of its range."""
        return self.grade.static_after[0] * self.Sut if self.set_removed else self.Ssy

    @cached_property
    def E(self) -> float:
        """Young's modulus, Pa."""
        return self.grade.moduli(self.wire_diameter)[0]

    @cached_property
    def G(self) -> float:
        """Shear modulus, Pa: the one given, or the grade's."""
        return self.shear_modulus or self.grade.moduli(self.wire_diameter)[1]

    # --- force ----------------------------------------------------------------------------------

    @cached_property
    def calculated_rate(self) -> float:
        """Return k = d^4 G / (8 D^3 Na), N/m (Shigley's eq. 10-9; Wahl, Mechanical Springs; memory)."""
        # Products, for powers of absurd lengths raise where these give 0 or infinity, which the checks catch.
        d, C = self.wire_diameter, self.index
        return d * self.G / (8 * C * C * C * self.active_coils)

    @property
    def rate(self) -> float:
        """Force over deflection, N/m: the measured one when there is one."""
        return self.measured_rate or self.calculated_rate

    @property
    def solid_force(self) -> float:
        """Force at solid, N."""
        return self.rate * self.solid_deflection

    def force(self, y: ArrayLike) -> NDArray[np.float64]:
        """Return the force at a deflection.

        Parameters
        ----------
        y : array_like
            Deflection from the free length, m.

        Returns
        -------
        float or ndarray
            N; zero where the spring is off its seat (y < 0), the solid force past solid.

        Notes
        -----
        F = k y for 0 <= y <= ys.
        """
        deflection = np.clip(np.asarray(y, dtype=np.float64), 0.0, self.solid_deflection)
        return np.asarray(self.rate * deflection)[()]

    # --- stability and surge --------------------------------------------------------------------

    @property
    def absolutely_stable(self) -> bool:
        """Whether it buckles at no deflection: L0 < constant D/alpha (:func:`buckling_constant`)."""
        return self._slenderness < buckling_constant(self.E, self.G)

    @property
    def buckling_deflection(self) -> float | None:
        """Deflection at which it buckles unguided, m; None when absolutely stable.

        Notes
        -----
        y_cr = L0 C1' [1 - sqrt(1 - C2'/lambda^2)], C1' = E/(2(E - G)), C2' = 2 pi^2 (E - G)/(2G + E),
        lambda = alpha L0/D.

        References
        ----------
        Shigley's Mechanical Engineering Design, eq. 10-10 to 10-13 and table 10-2 (memory).
        """
        if self.absolutely_stable:
            return None
        C1 = self.E / (2 * (self.E - self.G))
        ratio = buckling_constant(self.E, self.G) / self._slenderness
        return self.free_length * C1 * (1 - math.sqrt(1 - ratio**2))

    @property
    def _slenderness(self) -> float:
        return SUPPORTS[self.supports] * self.free_length / self.mean_diameter

    @property
    def surge_frequency(self) -> float:
        """First natural frequency between plates, Hz.

        Notes
        -----
        f1 = (1/2) sqrt(k/m), m the active mass; with one end free half of it.

        References
        ----------
        Shigley's Mechanical Engineering Design, eq. 10-25 (memory).
        """
        return 0.5 * math.sqrt(self.rate / self.active_mass)


def buckling_constant(E: float, G: float) -> float:
    """Return sqrt(C2') = pi sqrt(2(E - G)/(2G + E)): a spring shorter than this times D/alpha is stable.

    Parameters
    ----------
    E, G : float
        Young's and shear modulus in one unit, E > G.

    References
    ----------
    Shigley's Mechanical Engineering Design, eq. 10-12 and 10-13, which prints 2.63 for steel (memory).
    """
    return math.pi * math.sqrt(2 * (E - G) / (2 * G + E))


def _float(value: object) -> float:
    """Return a number as a float; text, booleans and arrays are refused."""
    if isinstance(value, bool) or not isinstance(value, (int, float, np.integer, np.floating)):
        raise InputError(f"{value!r}; give it as a number")
    try:
        return float(value)
    except OverflowError:  # a whole number of more than 300 digits
        return math.inf


def _mm(length: float) -> str:
    return f"{show(length, 'mm', 'length', 5)} ({show(length, 'in', 'length', 4)})"
