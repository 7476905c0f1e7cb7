"""What the program notices about a case. Each check is one function that yields findings with their numbers.

The catalogue (level, meaning, remedy, whether a waiver lifts it) is data/findings.toml; thresholds are
data/limits.toml and can be set in the case.
"""

from __future__ import annotations

import tomllib
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass, replace
from importlib.resources import files
from typing import TYPE_CHECKING, Any, Literal

import numpy as np

from springlife.life.reading import ROUNDING
from springlife.units import UnitSystem, convert, significant

if TYPE_CHECKING:
    from springlife.duty.schedule import EventCycles
    from springlife.life.assess import Judgement
    from springlife.life.case import Case
    from springlife.life.case_input import SpringInput, WaiveInput
    from springlife.life.damage import DamageModel, Floats
    from springlife.life.reading import Duty
    from springlife.spring.helical import HelicalSpring
    from springlife.spring.stress import StressMap

Level = Literal["stop", "warn", "note"]
FAR = 1.5  # a given shear modulus off the grade's by more is a slip of the unit
LEVELS: tuple[Level, ...] = ("stop", "warn", "note")


@dataclass(frozen=True)
class Entry:
    """One line of the catalogue."""

    level: Level
    what: str
    remedy: str
    lifts: bool


def _load() -> dict[str, Entry]:
    text = files("springlife").joinpath("data/findings.toml").read_text(encoding="utf-8")
    return {code: Entry(**entry) for code, entry in tomllib.loads(text).items()}


CATALOGUE: dict[str, Entry] = _load()


@dataclass(frozen=True)
class Finding:
    """Something noticed: a code of the catalogue, its level here, and a sentence with the numbers."""

    code: str
    level: Level
    message: str
    waived_by: str | None = None
    reason: str | None = None

    @property
    def remedy(self) -> str:
        """What to do about it."""
        return CATALOGUE[self.code].remedy

    @property
    def blocks(self) -> bool:
        """Whether the verdict is withheld because of it."""
        return self.level == "stop" and self.waived_by is None

    def to_dict(self) -> dict[str, Any]:
        """Give the finding for JSON."""
        return {
            "code": self.code,
            "level": self.level,
            "message": self.message,
            "remedy": self.remedy,
            "waived": self.waived_by is not None,
            "waived_by": self.waived_by,
            "reason": self.reason,
        }


def found(code: str, message: str, level: Level | None = None) -> Finding:
    """Make a finding at the catalogue's level, or at a milder one."""
    return Finding(code, level or CATALOGUE[code].level, message)


def settle(findings: Iterable[Finding], waivers: Iterable[WaiveInput]) -> tuple[Finding, ...]:
    """Apply waivers and put the findings in order: open stops first, waived ones in their level's place.

    A finding whose catalogue entry does not lift stays as it is: there is nothing left to judge.
    """
    named = {waiver.finding: waiver for waiver in waivers}
    settled = [
        replace(finding, waived_by=named[finding.code].by, reason=named[finding.code].reason)
        if finding.code in named and CATALOGUE[finding.code].lifts
        else finding
        for finding in findings
    ]
    return tuple(sorted(settled, key=lambda finding: (LEVELS.index(finding.level), finding.code)))


def of_part(
    spring: HelicalSpring, given: SpringInput, limits: Mapping[str, float], say: UnitSystem
) -> Iterator[Finding]:
    """Yield what the drawing alone shows: index, coils, strength, temperature, plating."""
    C = spring.index
    if not limits["index_low"] <= C <= limits["index_high"]:
        hard = not limits["index_least"] <= C <= limits["index_greatest"]
        allowed = f"{limits['index_low']:g} to {limits['index_high']:g}"
        message = f"spring index {significant(C, 3)} is outside {allowed}"
        yield found("index-range", message, "stop" if hard else "warn")
    if spring.active_coils < limits["active_coils_low"]:
        message = f"{significant(spring.active_coils, 3)} active coils are fewer than {limits['active_coils_low']:g}"
        yield found("coils-too-few", message)
    if given.shear_modulus is not None:
        usual = spring.grade.moduli(spring.wire_diameter)[1]
        if not 1 / FAR < spring.G / usual < FAR:
            message = f"shear modulus {say(spring.G, 'stress')} is far from the {say(usual, 'stress')} of "
            yield found("unit-mismatch", f"{message}{spring.grade.name}")
    Sut = spring.Sut
    if not limits["tensile_low_MPa"] * 1e6 <= Sut <= limits["tensile_high_MPa"] * 1e6:
        allowed = f"{limits['tensile_low_MPa']:g} to {limits['tensile_high_MPa']:g} MPa"
        yield found("strength-implausible", f"tensile strength {say(Sut, 'stress')} is outside {allowed}")
    if given.finish == "plated" and not given.baked and Sut > limits["plated_tensile_MPa"] * 1e6:
        yield found("hydrogen", f"plated wire of {say(Sut, 'stress')} tensile strength, and no bake stated")
    yield from _temperature(spring, limits, say)
    message = "end-coil contact and wear, corrosion, side load, surface damage and relaxation are not judged here"
    yield found("not-covered", message)


def _temperature(spring: HelicalSpring, limits: Mapping[str, float], say: UnitSystem) -> Iterator[Finding]:
    seen = say(spring.temperature, "temperature", 3)
    greatest = spring.grade.greatest_temperature
    if spring.temperature > greatest:
        yield found("too-hot", f"{seen} is above the {say(greatest, 'temperature', 3)} of {spring.grade.name}")
    celsius = convert(spring.temperature, "degC", "temperature")
    if spring.shot_peened and celsius > limits["peened_temperature_C"]:
        message = f"{seen} lets the compressive stress of shot peening fade"
        yield found("too-hot", message, "warn")


def of_motion(
    spring: HelicalSpring, stress: StressMap, duty: Duty, limits: Mapping[str, float], say: UnitSystem
) -> Iterator[Finding]:
    """Yield what the greatest and least deflection show: solid, clash, lift-off, yield, buckling."""
    low, high = duty.extremes(spring)
    yield from _solid(duty, high, spring, limits, say)
    yield from _lift_off(duty, low, limits, say)
    yield from _yields(spring, stress, high, limits, say)
    critical = spring.buckling_deflection
    if critical is not None and high > critical:
        message = f"buckles at {say(critical, 'length')}, before the greatest deflection {say(high, 'length')}"
        yield found("buckles", message, "note" if spring.guided else "stop")


def _solid(
    duty: Duty, high: float, spring: HelicalSpring, limits: Mapping[str, float], say: UnitSystem
) -> Iterator[Finding]:
    solid = spring.solid_deflection
    free = spring.free_length
    if high >= free:
        message = f"greatest deflection {say(high, 'length')} is not less than the free length {say(free, 'length')}"
        yield found("impossible-geometry", message)
    if high > solid + ROUNDING:
        past = [
            f"{event.name!r} {event.past_solid.describe()}"
            for event in duty.events
            if event.past_solid.any and event.past_solid.limit == solid
        ]
        where = f" ({'; '.join(past)})" if past else ""
        message = (
            f"greatest deflection {say(high, 'length')} passes solid at {say(solid, 'length')} "
            f"by {say(high - solid, 'length', 3)}{where}"
        )
        yield found("past-solid", message)
    elif high > 0 and (solid - high) / high < limits["clash_allowance"]:
        share = (solid - high) / high
        message = (
            f"clash allowance {100 * share:.1f} % between the greatest deflection {say(high, 'length')} and "
            f"solid at {say(solid, 'length')} is under {100 * limits['clash_allowance']:g} %"
        )
        yield found("near-solid", message)


def _lift_off(duty: Duty, low: float, limits: Mapping[str, float], say: UnitSystem) -> Iterator[Finding]:
    if low >= -ROUNDING:
        return
    off = [event for event in duty.events if event.off_seat.any]
    worst = max((event.off_seat.share for event in off), default=0.0)
    where = "; ".join(f"{event.name!r} {event.off_seat.describe()}" for event in off)
    message = f"deflection falls to {say(low, 'length', 3)}, below the free length: the force is zero there ({where})"
    yield found("lift-off", message, "stop" if worst > limits["lift_off_fraction"] else "warn")


def _yields(
    spring: HelicalSpring, stress: StressMap, high: float, limits: Mapping[str, float], say: UnitSystem
) -> Iterator[Finding]:
    for place, deflection in (("in service", high), ("at solid", spring.solid_deflection)):
        peak = float(stress.static(np.asarray(deflection)))
        if peak <= 0:
            continue
        factor = spring.static_limit / peak
        if factor < limits["yield_factor"]:
            message = (
                f"factor against yield {place} is {significant(factor, 3)}: {say(peak, 'stress')} against the static "
                f"limit {say(spring.static_limit, 'stress')}; {limits['yield_factor']:g} is asked"
            )
            yield found("yields", message, "stop" if factor < 1 else "warn")


def of_curve(model: DamageModel, limits: Mapping[str, float], assumed: bool) -> Iterator[Finding]:
    """Yield what the finite-life curve shows: its slope, and that it is assumed."""
    slope = model.curve.slope
    if not limits["slope_low"] <= slope <= limits["slope_high"]:
        allowed = f"{limits['slope_low']:g} to {limits['slope_high']:g}"
        yield found("slope-implausible", f"slope {significant(slope, 3)} of the life curve is outside {allowed}")
    if assumed:
        message = f"finite lives follow {model.curve.label}, slope {significant(slope, 3)}, not tests of this spring"
        yield found("assumed-curve", message)


def of_damage(
    model: DamageModel,
    cycles: EventCycles,
    damage: Floats,
    duty: Duty,
    limits: Mapping[str, float],
    say: UnitSystem,
) -> Iterator[Finding]:
    """Yield what the cycles' lives show: static failures, lives under the curve, one cycle that rules."""
    lives = model.cycles_to_failure(cycles.low, cycles.high)
    failing = lives == 0
    if failing.any():
        _, mean = model.stress.cycles(cycles.low[failing], cycles.high[failing])
        message = (
            f"{significant(float(cycles.count[failing].sum()))} cycles a pass have a mean stress up to "
            f"{say(float(mean.max()), 'stress')}, at or past the intercept of {model.criterion.name}"
        )
        yield found("mean-past-intercept", message)
    short = (lives < model.curve.valid_from) & ~failing
    if short.any():
        message = (
            f"{significant(float(cycles.count[short].sum()))} cycles a pass have a life down to "
            f"{significant(float(lives[short].min()), 3)} cycles, under {model.curve.valid_from:g}, "
            "where the curve is not valid"
        )
        yield found("below-1e3", message)
    yield from _one_cycle(cycles, damage, duty, limits, say)


def _one_cycle(
    cycles: EventCycles, damage: Floats, duty: Duty, limits: Mapping[str, float], say: UnitSystem
) -> Iterator[Finding]:
    """Yield a warning when a recorded duty hangs on one cycle: a specified programme has no such doubt."""
    total = float(damage.sum())
    recorded = np.array([event.recorded for event in duty.events], dtype=bool)
    if not (0 < total < np.inf) or not recorded.any():
        return
    ends = recorded[cycles.event_low] & recorded[cycles.event_high]
    if not ends.any():
        return
    largest = int(np.argmax(np.where(ends, cycles.high - cycles.low, -np.inf)))
    repeats = duty.events[int(cycles.event_high[largest])].repeats
    share = float(damage[largest]) / total
    if cycles.count[largest] <= repeats and share > limits["one_cycle_share"]:
        message = (
            f"the largest recorded cycle, {say(float(cycles.low[largest]), 'length')} to "
            f"{say(float(cycles.high[largest]), 'length')}, carries {100 * share:.0f} % of the damage"
        )
        yield found("one-cycle-rules", message)


def of_scope(spring: HelicalSpring, case: Case, say: UnitSystem) -> Iterator[Finding]:
    """Yield a warning when Zimmerli's pair is used on a wire or in a place that it was not made for."""
    from springlife.strength.endurance import zimmerli_scope

    if case.judge.endurance != "zimmerli":
        return
    scope = zimmerli_scope()
    outside = []
    if spring.wire_diameter >= scope.wire_diameter_below:
        outside.append(
            f"wire of {say(spring.wire_diameter, 'length')} is not under {say(scope.wire_diameter_below, 'length', 3)}"
        )
    if not spring.grade.ferrous:
        outside.append(f"{spring.grade.name} is not steel")
    if spring.temperature > scope.temperature_up_to:
        seen = say(spring.temperature, "temperature", 3)
        outside.append(f"{seen} is above {say(scope.temperature_up_to, 'temperature', 3)}")
    if case.spring.environment != scope.environment:
        outside.append(f"the environment is {case.spring.environment}")
    if outside:
        yield found("endurance-scope", f"Zimmerli's data used outside their scope: {'; '.join(outside)}")


def of_life(judgement: Judgement, case: Case) -> Iterator[Finding]:
    """Yield a warning when the duty asks for more damaging cycles than the endurance data's basis."""
    asked = judgement.damaging_cycles * case.duty.target_passes
    basis = judgement.model.curve.valid_to
    if asked > basis:
        message = (
            f"the target asks for {significant(asked, 3)} damaging cycles; the endurance data's basis ends at "
            f"{basis:g}, and strength is known to fall further beyond"
        )
        yield found("endurance-scope", message)
