"""Search for the lightest, cheapest or longest-lived spring that meets the target and every static check.

The duty is counted once and held by stroke (or by force, scaled by the ratio of rates); every candidate is a
``HelicalSpring`` judged by the same laws as a drawn one. Free length is the shortest that keeps the clash allowance.
"""

from __future__ import annotations

import math
import tomllib
from collections.abc import Iterator
from dataclasses import dataclass, replace
from importlib.resources import files
from pathlib import Path
from typing import Any

import numpy as np

from springlife.errors import CriterionError, InputError
from springlife.life.assess import Assessment, assess, model_of
from springlife.life.case import Case
from springlife.life.damage import DamageModel, greatest_factor
from springlife.life.limits import limit_values
from springlife.life.size_input import SizeInput
from springlife.spring.grade import Grade, WireRangeError, grade
from springlife.spring.helical import GeometryError, HelicalSpring
from springlife.spring.stress import stress_map
from springlife.units import UnitSystem, parse

STEPS = 48  # mean diameters tried for each wire when no step is given
KEPT, MISSES = 20, 10
# What was given or measured for the drawn spring alone.
_NOT_THE_CANDIDATES = ("outer_diameter", "inner_diameter", "measured_rate", "tensile_strength")
ROOM = 1 + 1e-9  # free length over the shortest, so that rounding does not eat the clash allowance


@dataclass(frozen=True)
class Candidate:
    """One spring tried: ``failed`` maps each failed check to its shortfall (1 is on the limit, less is short)."""

    spring: HelicalSpring
    damage: float | None  # at the target; None when it was not evaluated
    passes: float | None
    failed: dict[str, float]

    @property
    def cost(self) -> float:
        """Relative wire cost."""
        relative = self.spring.grade.relative_cost
        return math.inf if relative is None else self.spring.mass * relative

    def to_dict(self) -> dict[str, Any]:
        """Give the candidate for JSON."""
        s = self.spring
        return {
            "grade": s.grade.name,
            "shot_peened": s.shot_peened,
            "wire_diameter_m": s.wire_diameter,
            "mean_diameter_m": s.mean_diameter,
            "total_coils": s.total_coils,
            "free_length_m": s.free_length,
            "solid_length_m": s.solid_length,
            "rate_N_per_m": s.rate,
            "mass_kg": s.mass,
            "relative_cost": None if math.isinf(self.cost) else self.cost,
            "damage_at_target": self.damage,
            "life_passes": self.passes,
            "failed": self.failed,
        }


@dataclass(frozen=True)
class Sizing:
    """Springs that meet everything, best first; near misses with what they fail; the drawn spring's greatest stroke."""

    assessment: Assessment
    settings: SizeInput
    tried: int
    found: tuple[Candidate, ...]
    misses: tuple[Candidate, ...]
    stroke_factor: float | None
    stroke_governed_by: str

    def to_dict(self) -> dict[str, Any]:
        """Give the sizing for JSON."""
        return {
            "title": self.assessment.case.input.title,
            "goal": self.settings.goal,
            "held": self.settings.hold,
            "tried": self.tried,
            "found": [candidate.to_dict() for candidate in self.found],
            "near_misses": [candidate.to_dict() for candidate in self.misses],
            "greatest_stroke_factor": self.stroke_factor,
            "stroke_governed_by": self.stroke_governed_by,
        }


def wire_sizes(series: str) -> list[float]:
    """Return a series of data/wire_sizes.toml, m, rising."""
    text = files("springlife").joinpath("data/wire_sizes.toml").read_text(encoding="utf-8")
    table = tomllib.loads(text)[series]
    return [parse(f"{size} {table['unit']}", "length") for size in table["sizes"]]


def size(case: Case | str | Path) -> Sizing:
    """Search the springs that the case's [size] table allows.

    Raises
    ------
    FileError, InputError
        The case cannot be used or judged, or the limits leave nothing to try.
    """
    result = assess(case)
    if result.judgement is None or result.duty is None:
        stops = "; ".join(finding.message for finding in result.findings if finding.level == "stop")
        raise InputError(f"{result.case.path}: the drawn spring cannot be judged, so nothing can be sized: {stops}")
    search = _Search(result)
    candidates = [search.checked(spring) for spring in search.springs()]
    if not candidates:
        raise InputError(f"{result.case.path}: [size] leaves no spring to try; widen diameters, sizes or grades")
    found = search.evaluated([candidate for candidate in candidates if not candidate.failed])
    good = [candidate for candidate in found if not candidate.failed]
    short = [candidate for candidate in [*candidates, *found] if len(candidate.failed) == 1]
    if good:  # a near miss is of interest when it would have been better
        best = search.price(good[0])
        short = [one for one in short if search.price(one) < best]
    short.sort(key=lambda candidate: -min(candidate.failed.values()))
    factor, governed_by = greatest_stroke(result)
    return Sizing(
        result, search.settings, len(candidates), tuple(good[:KEPT]), tuple(short[:MISSES]), factor, governed_by
    )


class _Search:
    """The drawn spring's judgement with the limits of the search."""

    def __init__(self, result: Assessment) -> None:
        assert result.judgement is not None and result.duty is not None
        self.result, self.case = result, result.case
        self.settings: SizeInput = result.case.input.size
        self.drawn = result.judgement.spring
        self.limits = limit_values(result.case.input.limits)
        self.rate = self.settings.rate or self.drawn.rate
        self.low, self.high = result.duty.extremes(self.drawn)
        one_pass = result.duty.one_pass(self.drawn)
        self.target = one_pass.life(result.case.duty.target_passes, result.case.judge.residue)
        self.steady = one_pass.life(1.0, "repeat")

    def stretch(self, spring: HelicalSpring) -> float:
        """What is held: by stroke deflections are the drawn spring's, by force they follow the rate."""
        return 1.0 if self.settings.hold == "stroke" else self.drawn.rate / spring.rate

    def springs(self) -> Iterator[HelicalSpring]:
        """Yield every spring of the grid with about the rate asked for."""
        given = self.settings
        file = self.case.spring.grade_file
        path = None if file is None else self.case.beside(file)
        names = given.grades or [self.drawn.grade.name]
        peened = given.peened or [self.drawn.shot_peened]
        for wire in (grade(name, path) for name in names):
            for d in self._sizes(wire):
                for D in self._diameters(d):
                    for total in self._coils(wire, d, D):
                        for is_peened in peened:
                            spring = self._spring(wire, d, D, total, is_peened)
                            if spring is not None:
                                yield spring

    def _sizes(self, wire: Grade) -> list[float]:
        given = self.settings.sizes
        if given is None:
            given = "inch" if self.result.say.name == "inch" else "metric"
        sizes = wire_sizes(given) if isinstance(given, str) else given
        low, high = wire.diameter_range
        return [d for d in sizes if low <= d <= high]

    def _diameters(self, d: float) -> list[float]:
        """Mean diameters inside index range and envelope."""
        given = self.settings
        low = d * self.limits["index_low"]
        high = d * self.limits["index_high"]
        if given.least_inner_diameter is not None:
            low = max(low, given.least_inner_diameter + d)
        if given.largest_outer_diameter is not None:
            high = min(high, given.largest_outer_diameter - d)
        if high < low:
            return []
        if given.diameter_step is not None:
            first = math.ceil(low / given.diameter_step - 1e-9)
            last = math.floor(high / given.diameter_step + 1e-9)
            return [number * given.diameter_step for number in range(first, last + 1)]
        return [float(D) for D in np.linspace(low, high, STEPS)]

    def _coils(self, wire: Grade, d: float, D: float) -> list[float]:
        """Total coils on the step's grid about those that give the rate."""
        given = self.settings
        G = self.case.spring.shear_modulus or wire.moduli(d)[1]
        active = d**4 * G / (8 * D**3 * self.rate)
        inactive = self.drawn.total_coils - self.drawn.active_coils
        tolerance, step = given.rate_tolerance, given.coil_step
        # All that keep the rate's tolerance, and one more at either end to show what lies just outside.
        first = math.ceil((active / (1 + tolerance) + inactive) / step) - 1
        last = math.floor((active / (1 - tolerance) + inactive) / step) + 1
        return [number * step for number in range(first, last + 1) if number * step > inactive + 1]

    def _spring(self, wire: Grade, d: float, D: float, total: float, peened: bool) -> HelicalSpring | None:
        """Build a candidate with the shortest free length that keeps the clash allowance."""
        try:
            part: dict[str, Any] = dict.fromkeys(_NOT_THE_CANDIDATES) | {"mean_diameter": D, "free_length": 1e3 * D}
            spring = replace(self.drawn, grade=wire, wire_diameter=d, total_coils=total, shot_peened=peened, **part)
            room = self.high * self.stretch(spring) * (1 + self.limits["clash_allowance"])
            return replace(spring, free_length=spring.solid_length + room * ROOM)
        except (GeometryError, WireRangeError):
            return None

    def checked(self, spring: HelicalSpring) -> Candidate:
        """Check everything but life; each failed check with how near it comes (1 would pass)."""
        given, limits = self.settings, self.limits
        high = self.high * self.stretch(spring)
        stress = stress_map(spring, self.case.judge.stress_factor, self.case.judge.curvature_on)
        least = limits["yield_factor"]
        ratios = {
            "rate": 1 - max(0.0, abs(spring.rate / self.rate - 1) - given.rate_tolerance),
            "yield in service": spring.static_limit / float(stress.static(high)) / least,
            "yield at solid": spring.static_limit / float(stress.static(spring.solid_deflection)) / least,
            "active coils": spring.active_coils / limits["active_coils_low"],
        }
        for name, limit, value in (
            ("solid length", given.greatest_solid_length, spring.solid_length),
            ("free length", given.greatest_free_length, spring.free_length),
            ("mass", given.greatest_mass, spring.mass),
        ):
            if limit is not None:
                ratios[name] = limit / value
        critical = spring.buckling_deflection
        if critical is not None and not spring.guided:
            ratios["buckling"] = critical / high
        if given.working_frequency is not None:
            ratios["surge"] = spring.surge_frequency / (limits["surge_ratio"] * given.working_frequency)
        return Candidate(spring, None, None, {name: ratio for name, ratio in ratios.items() if ratio < 1 - 1e-12})

    def price(self, candidate: Candidate) -> float:
        """What is to be small: mass, cost, or the reciprocal of life."""
        if self.settings.goal == "mass":
            return candidate.spring.mass
        if self.settings.goal == "cost":
            return candidate.cost
        return 0.0 if candidate.passes is None else -candidate.passes

    def evaluated(self, candidates: list[Candidate]) -> list[Candidate]:
        """Judge lives in the order of the goal; for mass and cost, until enough have been found."""
        done: list[Candidate] = []
        good = 0
        for candidate in sorted(candidates, key=self.price):
            judged = self._judged(candidate)
            done.append(judged)
            good += not judged.failed
            if good >= KEPT and self.settings.goal != "life":
                break
        if self.settings.goal == "life":
            # Unlimited lives first, and among equals the lighter spring.
            done.sort(key=lambda one: (-math.inf if one.passes is None else -one.passes, one.spring.mass))
        return done

    def _judged(self, candidate: Candidate) -> Candidate:
        stress = stress_map(candidate.spring, self.case.judge.stress_factor, self.case.judge.curvature_on)
        try:
            model = model_of(self.case, candidate.spring, stress)
        except CriterionError:
            return replace(candidate, failed={"criterion has no strength": 0.0})
        stretch = self.stretch(candidate.spring)
        damage = _damage(model, self.target, stretch)
        each = _damage(model, self.steady, stretch)
        allowed = self.case.judge.allowed_damage
        failed = {} if damage <= allowed else {"life": allowed / damage}
        return replace(candidate, damage=damage, passes=allowed / each if each > 0 else None, failed=failed)


def _damage(model: DamageModel, table: tuple[Any, Any, Any], stretch: float = 1.0, start: float = 0.0) -> float:
    """Damage of a table of cycles whose deflections are stretched about ``start``."""
    low, high, count = table
    return float(model.damage(start + stretch * (low - start), start + stretch * (high - start), count).sum())


def greatest_stroke(result: Assessment) -> tuple[float | None, str]:
    """Return the factor on the drawn spring's stroke, its least deflection held, at which the target is just met.

    The second value names what governs: fatigue, clash allowance or yield. None when the duty has no stroke.
    """
    j = result.judgement
    assert j is not None and result.duty is not None
    case, limits = result.case, limit_values(result.case.input.limits)
    low, high = result.duty.extremes(j.spring)
    if not high > low:
        return None, "no stroke"
    yields = j.spring.static_limit / j.model.stress.static_part
    ends = {
        "clash allowance": j.spring.solid_deflection / (1 + limits["clash_allowance"]),
        "yield": yields / limits["yield_factor"],
    }
    governed_by = min(ends, key=lambda name: ends[name])
    ceiling = (ends[governed_by] - low) / (high - low)
    if ceiling <= 0:
        return 0.0, governed_by
    table = result.duty.one_pass(j.spring).life(case.duty.target_passes, case.judge.residue)
    factor = greatest_factor(lambda x: _damage(j.model, table, x, low), case.judge.allowed_damage, ceiling)
    return factor, governed_by if factor == ceiling else "fatigue"


def describe(candidate: Candidate, say: UnitSystem) -> str:
    """Name a candidate as a drawing would."""
    s = candidate.spring
    peened = "peened" if s.shot_peened else "not peened"
    return (
        f"{s.grade.name} {peened}, wire {say(s.wire_diameter, 'length')}, mean {say(s.mean_diameter, 'length')}, "
        f"{s.total_coils:g} coils, free {say(s.free_length, 'length')}"
    )
