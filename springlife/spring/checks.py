"""What the published checks of springs recompute: inputs as printed in, SI values out.

``METHODS`` maps the method that a file in data/published names to its function.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import replace
from typing import Any

import numpy as np

from springlife.spring.grade import grade
from springlife.spring.helical import HelicalSpring, buckling_constant
from springlife.spring.stress import FACTORS, StressMap, direct_shear, greatest_index, stress_map
from springlife.units import parse

_KINDS = {
    "wire_diameter": "length",
    "mean_diameter": "length",
    "outer_diameter": "length",
    "free_length": "length",
    "tensile_strength": "stress",
    "shear_modulus": "stress",
    "measured_rate": "rate",
}
_LOADS: tuple[str, ...] = ("low_force", "high_force", "force")
_PROPERTIES = (
    *("index", "active_coils", "solid_length", "solid_deflection", "solid_force", "pitch", "mass", "active_mass"),
    *("Sut", "Ssu", "Ssy", "static_limit", "E", "G", "rate", "surge_frequency"),
)


def wire(inputs: Mapping[str, str]) -> dict[str, float]:
    """Return the wire's strength and moduli at ``wire_diameter``, and its static fractions."""
    one = grade(inputs["grade"])
    d = parse(inputs["wire_diameter"], "length")
    E, G = one.moduli(d)
    return {
        "Sut": one.tensile_strength(d),
        "E": E,
        "G": G,
        "static_before": one.static_before,
        "static_after_low": one.static_after[0],
        "static_after_high": one.static_after[1],
        "greatest_temperature": one.greatest_temperature,
    }


def stress_factors(inputs: Mapping[str, float]) -> dict[str, float]:
    """Return the factors for the index ``C``."""
    C = inputs["C"]
    return {name: factor(C) for name, factor in FACTORS.items()} | {"direct_shear": direct_shear(C)}


def buckling(inputs: Mapping[str, str]) -> dict[str, float]:
    """Return the constant of absolute stability for moduli, or for a grade at a wire diameter."""
    if "grade" in inputs:
        E, G = grade(inputs["grade"]).moduli(parse(inputs["wire_diameter"], "length"))
    else:
        E, G = parse(inputs["E"], "stress"), parse(inputs["G"], "stress")
    return {"constant": buckling_constant(E, G)}


def helical(inputs: Mapping[str, Any]) -> dict[str, float]:
    """Return everything about a spring, under a cycle of force and a static force where they are given."""
    given = dict(inputs)
    wire = grade(given.pop("grade"))
    if "density" in given:
        wire = replace(wire, density=parse(given.pop("density"), "density"))
    factor = given.pop("stress_factor", "bergstraesser")
    loads = {name: parse(given.pop(name), "force") for name in _LOADS if name in given}
    sizes: dict[str, Any] = {key: parse(value, _KINDS[key]) if key in _KINDS else value for key, value in given.items()}
    spring = HelicalSpring(grade=wire, **sizes)
    stress = stress_map(spring, factor)
    found = {name: float(getattr(spring, name)) for name in _PROPERTIES}
    found["stress_factor"] = FACTORS[factor](spring.index)
    return found | _static(spring, stress, loads.get("force", 0.0)) | _cycle(spring, stress, loads)


def _static(spring: HelicalSpring, stress: StressMap, force: float) -> dict[str, float]:
    """Return the load at the static limit, and the margins at a force and at solid."""
    limit = spring.static_limit / stress.static_part
    found = {
        "static_force": spring.rate * limit,
        "static_deflection": limit,
        "free_length_to_static_limit": spring.solid_length + limit,
        "factor_at_solid": spring.static_limit / float(stress.static(spring.solid_deflection)),
    }
    if force:
        found["static_stress"] = stress.static_part * force / spring.rate
        found["static_factor"] = spring.static_limit / found["static_stress"]
    return found


def _cycle(spring: HelicalSpring, stress: StressMap, loads: Mapping[str, float]) -> dict[str, float]:
    if "high_force" not in loads:
        return {}
    low, high = (np.array([loads[name] / spring.rate]) for name in ("low_force", "high_force"))
    (tau_a,), (tau_m,) = stress.cycles(low, high)
    return {"tau_a": float(tau_a), "tau_m": float(tau_m)}


def sized(inputs: Mapping[str, Any]) -> dict[str, float]:
    """Return the spring of one wire that brings a cycle of force just to an amplitude, squared and ground ends."""
    d, amplitude = parse(inputs["wire_diameter"], "length"), parse(inputs["amplitude"], "stress")
    low, high = (parse(inputs[name], "force") for name in ("low_force", "high_force"))
    rate = (high - low) / (parse(inputs["high_deflection"], "length") - parse(inputs["low_deflection"], "length"))
    own = replace(grade(inputs["grade"]), density=parse(inputs["density"], "density"))
    C = greatest_index(amplitude, 8 * (high - low) / 2 / (np.pi * d**2))
    room = (1 + inputs["clash_allowance"]) * parse(inputs["high_deflection"], "length")
    one = HelicalSpring(grade=own, wire_diameter=d, mean_diameter=C * d, total_coils=3, free_length=1.0)
    total = one.calculated_rate / rate + 2  # one active coil: the rate is that of a single coil
    spring = replace(one, total_coils=total, free_length=d * total + room)
    factor = spring.static_limit / float(stress_map(spring).static(spring.solid_deflection))
    return {
        "index": C,
        "mean_diameter": spring.mean_diameter,
        "active_coils": spring.active_coils,
        "solid_length": spring.solid_length,
        "free_length": spring.free_length,
        "factor_at_solid": factor,
        "surge_frequency": spring.surge_frequency,
    }


METHODS: dict[str, Callable[[Mapping[str, Any]], dict[str, float]]] = {
    "wire": wire,
    "stress factors": stress_factors,
    "buckling constant": buckling,
    "spring": helical,
    "sizing by amplitude": sized,
}
