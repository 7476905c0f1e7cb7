"""What the published checks of surge recompute; ``METHODS`` maps the names in data/published to functions."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any

import numpy as np

from springlife.spring.surge import Wave, impact_stress, transfer
from springlife.spring.surge_filter import Floats
from springlife.spring.surge_wave import march, struck
from springlife.units import parse

WAVE = Wave(1.0, 0.0)
CELLS = 400


def constant_speed(inputs: Mapping[str, int]) -> dict[str, float]:
    """Return the end forces over sqrt(k m) times the speed, just after each whole number of travel times."""
    cells = inputs["cells"]
    motion = march(np.arange(6 * cells + 1) / cells, WAVE, cells)
    return {f"moving_end_after_{n}": float(motion.moving_end[n * cells]) for n in (0, 2, 4)} | {
        f"fixed_end_after_{n}": float(motion.fixed_end[n * cells]) for n in (1, 3, 5)
    }


def sine(inputs: Mapping[str, float]) -> dict[str, float]:
    """Return the end forces over the static one, at a frequency over the first natural one."""
    fixed, moving = transfer(inputs["over_first"] * WAVE.first_frequency, np.array([0.0, 1.0]), WAVE)
    return {"fixed_end": float(fixed.real), "moving_end": float(moving.real)}


def mass(inputs: Mapping[str, float]) -> dict[str, float]:
    """Return the greatest force at the fixed end over sqrt(k m) times the speed, and the contact time over T.

    Rows hold for the middle of a step, half a step after the front has come: two steps lead to none.
    """
    coarse, fine = (struck(inputs["mass_ratio"], 1.0, 9 * n, WAVE, n) for n in (CELLS, 2 * CELLS))
    peak = 2 * fine.fixed_end.max() - coarse.fixed_end.max()
    return {"peak": float(peak), "contact_time": _end_of_contact(fine.times, fine.moving_end)}


def _end_of_contact(times: Floats, force: Floats) -> float:
    """Return when the force comes to nothing, on the line through the last two steps of contact."""
    last = int(np.argmax(force <= 0)) - 1
    before, after = force[last - 1], force[last]
    return float(times[last] + (times[last] - times[last - 1]) * after / (before - after))


def impact(inputs: Mapping[str, Any]) -> dict[str, float]:
    """Return the stress of an end driven at a speed."""
    speed, G = parse(inputs["speed"], "velocity"), parse(inputs["shear_modulus"], "stress")
    return {"stress": impact_stress(speed, G, float(inputs["density"]))}


METHODS: dict[str, Callable[[Mapping[str, Any]], dict[str, float]]] = {
    "end at constant speed": constant_speed,
    "end in sine motion": sine,
    "mass strikes the end": mass,
    "impact": impact,
}
