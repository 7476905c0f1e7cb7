"""Fit own fatigue tests of springs of one wire, and keep the result as a curve file that a case can name."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Any

from springlife.errors import InputError
from springlife.spring.grade import grade
from springlife.spring.helical import SSU_OVER_SUT
from springlife.strength.criteria import criterion
from springlife.strength.fit import Fit, fit_tests, write_curve
from springlife.strength.own_tests import OwnTests, read_tests


@dataclass(frozen=True)
class OwnFit:
    """Tests of one wire with their fit; strengths in Pa."""

    tests: OwnTests
    fit: Fit
    wire: str
    Sut: float
    Ssu: float
    Ssy: float
    reliability: float
    confidence: float

    def to_dict(self) -> dict[str, Any]:
        """Give the fit for JSON."""
        return self.fit.to_dict() | {
            "tests": {"path": self.tests.path.name, "sha256": self.tests.sha256, "springs": len(self.tests.cycles)},
            "wire": self.wire,
            "Sut_Pa": self.Sut,
            "Ssu_Pa": self.Ssu,
            "Ssy_Pa": self.Ssy,
            "reliability": self.reliability,
            "design_confidence": self.confidence,
            "design_curve": {
                line.group: [{"cycles": N, "amplitude_Pa": S} for N, S in self.design_points(line.group)]
                for line in self.fit.lines
            },
        }

    def design_points(self, group: str) -> tuple[tuple[float, float], ...]:
        """Return (cycles, Pa) of a group's design curve between the amplitudes tested."""
        line = next(line for line in self.fit.lines if line.group == group)
        return line.curve_points(self.reliability, self.confidence)

    def write(self, path: str | Path, *, title: str, force: bool = False) -> None:
        """Write the curve file; see :func:`springlife.strength.fit.write_curve`."""
        source = f"{self.tests.path.name}, {len(self.tests.cycles)} springs of {self.wire}, sha256 {self.tests.sha256}"
        write_curve(
            self.fit,
            path,
            title=title,
            source=source,
            reliability=self.reliability,
            confidence=self.confidence,
            force=force,
        )


def fit_own_tests(
    path: str | Path,
    *,
    wire: str,
    wire_diameter: float,
    tensile_strength: float | None = None,
    by: str = "gerber",
    reliability: float = 0.9,
    confidence: float = 0.9,
    grade_file: str | Path | None = None,
) -> OwnFit:
    """Read and fit a table of tests.

    Parameters
    ----------
    path : str or Path
        CSV with stress_amplitude, stress_mean, cycles, outcome and, if several, group.
    wire : str
        Grade of the springs tested.
    wire_diameter : float
        m.
    tensile_strength : float, optional
        Pa, from the certificate; the grade's at this diameter otherwise.
    by : str
        Criterion that brings other mean stresses to the fully reversed amplitude.

    Raises
    ------
    FileError, InputError
        The table, the wire or the shares cannot be used; or the tests do not carry a fit.
    """
    for name, share in (("reliability", reliability), ("confidence", confidence)):
        if not 0 < share < 1:
            raise InputError(f"{name} is {share:g}; give a share between 0 and 1, such as 0.9")
    if tensile_strength is not None and not tensile_strength > 0:
        raise InputError(f"tensile strength is {tensile_strength:g} Pa; it must be above zero")
    own = grade(wire, grade_file)
    Sut = own.tensile_strength(wire_diameter) if tensile_strength is None else tensile_strength
    Ssu, Ssy = SSU_OVER_SUT * Sut, own.static_before * Sut
    tests = read_tests(path)
    fit = fit_tests(
        tests.amplitude, tests.mean, tests.cycles, tests.failed, tests.group, criterion=criterion(by), Ssu=Ssu, Ssy=Ssy
    )
    return OwnFit(tests, fit, own.title, Sut, Ssu, Ssy, reliability, confidence)
