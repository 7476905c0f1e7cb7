"""The grid of a sizing as arrays: springs of one wire, what each fails on, and the damage of the duty to each.

What springs of one wire have in common is read from one ``HelicalSpring`` of it; coil diameter and coils are arrays
of shape (n, 1) against the duty's cycles of shape (m,).
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, cast

import numpy as np
from numpy.typing import NDArray

from springlife.errors import InputError
from springlife.life.damage import DamageModel
from springlife.life.population import AT_ONCE, Cycles
from springlife.life.size_input import SizeInput
from springlife.spring.helical import SUPPORTS, HelicalSpring, buckling_constant
from springlife.spring.stress import StressMap, stress_map

if TYPE_CHECKING:
    from springlife.life.case import Case

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]
STEPS = 48  # mean diameters tried for each wire when no step is given
LARGEST = 1_000_000  # springs of one wire; more is a step typed wrong
ROOM = 1 + 1e-9  # free length over the shortest, so that rounding does not eat the clash allowance
ROUNDING = 1e-12


@dataclass(frozen=True)
class Springs:
    """Springs of one wire: ``first`` carries wire, ends and treatment; the arrays are of shape (n, 1), SI."""

    first: HelicalSpring
    mean_diameter: Floats
    total_coils: Floats
    free_length: Floats

    @property
    def wire_diameter(self) -> float:
        """One for all, m."""
        return self.first.wire_diameter

    @property
    def set_removed(self) -> bool:
        """One for all."""
        return self.first.set_removed

    @property
    def active_coils(self) -> Floats:
        """Total coils less the inactive ones of the ends."""
        return self.total_coils - (self.first.total_coils - self.first.active_coils)

    @property
    def rate(self) -> Floats:
        """N/m: k ~ 1/(D^3 Na)."""
        one = self.first
        return one.rate * (one.mean_diameter / self.mean_diameter) ** 3 * one.active_coils / self.active_coils

    @property
    def solid_length(self) -> Floats:
        """One wire diameter more for each coil more, m."""
        return self.first.solid_length + self.wire_diameter * (self.total_coils - self.first.total_coils)

    @property
    def solid_deflection(self) -> Floats:
        """Ls below the free length, m."""
        return self.free_length - self.solid_length

    @property
    def mass(self) -> Floats:
        """kg: m ~ D Nt."""
        one = self.first
        return one.mass * (self.mean_diameter / one.mean_diameter) * (self.total_coils / one.total_coils)

    @property
    def surge_frequency(self) -> Floats:
        """First natural frequency between plates, Hz: f1 ~ 1/(D^2 Na)."""
        one = self.first
        return (
            one.surge_frequency * (one.mean_diameter / self.mean_diameter) ** 2 * one.active_coils / self.active_coils
        )

    @property
    def buckling_deflection(self) -> Floats:
        """Deflection at which they buckle unguided, m; infinite when absolutely stable."""
        one = self.first
        slenderness = SUPPORTS[one.supports] * self.free_length / self.mean_diameter
        ratio = np.minimum(buckling_constant(one.E, one.G) / slenderness, 1.0)
        critical = self.free_length * one.E / (2 * (one.E - one.G)) * (1 - np.sqrt(1 - ratio**2))
        return np.where(ratio < 1, critical, np.inf)


@dataclass(frozen=True)
class Hold:
    """What the candidates' deflections follow from: those of the drawn spring, or forces kept as its own."""

    by: str
    rate: float  # of the drawn spring, N/m
    low: float  # least and greatest deflection of the drawn spring, m
    high: float

    def line(self, rate: Floats) -> tuple[Floats, Floats]:
        """Return slope and shift (m) of a candidate's deflection over the drawn spring's, for rates in N/m.

        Notes
        -----
        By stroke y' = y; by force y' = y k/k'; by preload y' = y + y0 (k/k' - 1), which keeps the stroke and the
        force at the least deflection y0.
        """
        stretch = self.rate / rate
        if self.by == "force":
            return stretch, np.zeros_like(rate)
        if self.by == "preload":
            return np.ones_like(rate), max(self.low, 0.0) * (stretch - 1)
        return np.ones_like(rate), np.zeros_like(rate)

    def highest(self, rate: Floats) -> Floats:
        """Return the greatest deflection, m."""
        slope, shift = self.line(rate)
        return slope * self.high + shift


def springs_of(first: HelicalSpring, given: SizeInput, rate: float, hold: Hold, limits: Mapping[str, float]) -> Springs:
    """Return every spring of one wire on the grid, with the shortest free length that keeps the clash allowance.

    Raises
    ------
    InputError
        The steps are so small that the grid has too many springs.
    """
    D = _diameters(first.wire_diameter, given, limits)
    inactive = first.total_coils - first.active_coils
    active = first.rate * first.active_coils / rate * (first.mean_diameter / D) ** 3
    step, tolerance = given.coil_step, given.rate_tolerance
    # All that keep the rate's tolerance, and one more at either end to show what lies just outside.
    begin = np.ceil((active / (1 + tolerance) + inactive) / step) - 1
    end = np.floor((active / (1 - tolerance) + inactive) / step) + 1
    begin = np.maximum(begin, max(given.least_coils or 0.0, inactive + step) / step - ROUNDING)
    end = np.minimum(end, (given.greatest_coils or math.inf) / step + ROUNDING)
    begin, number = np.ceil(begin), np.maximum(np.floor(end) - np.ceil(begin) + 1, 0)
    if number.sum() > LARGEST:
        raise InputError(
            f"size: {number.sum():.0f} springs of {first.grade.name} wire would have to be tried; "
            "give greatest_coils, or larger steps in coil_step and diameter_step"
        )
    each = number.astype(np.intp)
    place = np.arange(each.sum()) - np.repeat(np.cumsum(each) - each, each)
    total = step * (np.repeat(begin, each) + place)
    shape = Springs(first, np.repeat(D, each)[:, None], total[:, None], np.empty((0, 1)))
    room = hold.highest(shape.rate) * (1 + limits["clash_allowance"])
    return Springs(first, shape.mean_diameter, shape.total_coils, shape.solid_length + room * ROOM)


def _diameters(d: float, given: SizeInput, limits: Mapping[str, float]) -> Floats:
    """Mean diameters inside index range and envelope, m."""
    low, high = d * limits["index_low"], d * limits["index_high"]
    if given.least_inner_diameter is not None:
        low = max(low, given.least_inner_diameter + d)
    if given.largest_outer_diameter is not None:
        high = min(high, given.largest_outer_diameter - d)
    if high < low:
        return np.empty(0)
    if given.diameter_step is None:
        return np.linspace(low, high, STEPS)
    first, last = math.ceil(low / given.diameter_step - 1e-9), math.floor(high / given.diameter_step + 1e-9)
    if last - first > LARGEST:
        raise InputError(f"size.diameter_step is {given.diameter_step:g} m; the envelope holds too many such steps")
    return np.arange(first, last + 1, dtype=np.float64) * given.diameter_step


def shortfalls(springs: Springs, case: Case, rate: float, hold: Hold, limits: Mapping[str, float]) -> dict[str, Floats]:
    """Return how much of what each static check asks is reached, shape (n,): at 1 and above it is passed."""
    given = case.input.size
    high, one = hold.highest(springs.rate), springs.first
    stress = stresses(springs, case)
    with np.errstate(divide="ignore"):
        ratios = {
            "rate": 1 - np.maximum(0.0, np.abs(springs.rate / rate - 1) - given.rate_tolerance),
            "yield in service": one.static_limit / stress.static(high) / limits["yield_factor"],
            "yield at solid": one.static_limit / stress.static(springs.solid_deflection) / limits["yield_factor"],
            "active coils": springs.active_coils / limits["active_coils_low"],
        }
    for name, limit, value in (
        ("solid length", given.greatest_solid_length, springs.solid_length),
        ("free length", given.greatest_free_length, springs.free_length),
        ("mass", given.greatest_mass, springs.mass),
    ):
        if limit is not None:
            ratios[name] = limit / value
    if not one.guided:
        ratios["buckling"] = springs.buckling_deflection / high
    if given.working_frequency is not None:
        ratios["surge"] = springs.surge_frequency / (limits["surge_ratio"] * given.working_frequency)
    return {name: np.where(ratio < 1 - ROUNDING, ratio, 1.0).ravel() for name, ratio in ratios.items()}


def stresses(springs: Springs, case: Case) -> StressMap:
    """Return the stress map of many springs; it reads only numbers of them, and takes arrays as they are."""
    return stress_map(cast("HelicalSpring", springs), case.judge.stress_factor, case.judge.curvature_on)


def damages(springs: Springs, which: Ints, model: DamageModel, cycles: Cycles, hold: Hold, case: Case) -> Floats:
    """Return the damage of the duty's cycles to the springs at positions ``which``, shape of ``which``.

    ``model`` gives criterion, curve and strengths, which are one for all springs of a wire.
    """
    parts = np.array_split(which, max(1, -(-which.size * cycles.low.size // AT_ONCE)))
    return np.concatenate([_damage(_chosen(springs, part), model, cycles, hold, case) for part in parts])


def _chosen(springs: Springs, which: Ints) -> Springs:
    shape = (springs.mean_diameter, springs.total_coils, springs.free_length)
    return Springs(springs.first, *(part[which] for part in shape))


def _damage(springs: Springs, model: DamageModel, cycles: Cycles, hold: Hold, case: Case) -> Floats:
    slope, shift = hold.line(springs.rate)
    many = DamageModel(stresses(springs, case), model.criterion, model.curve, model.Ssu, model.Ssy, model.miner)
    damage = many.damage(slope * cycles.low + shift, slope * cycles.high + shift, cycles.count)
    return np.asarray(damage.sum(axis=1), dtype=np.float64)
