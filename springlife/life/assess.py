"""The judgement of one case: damage a pass, damage at the target, life, margin, band and findings.

``assess`` reads and judges; ``judge`` judges counts already made, so options never touch a record again.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from hashlib import sha256
from pathlib import Path
from typing import Any

import numpy as np

from springlife.duty.schedule import EventCycles
from springlife.errors import CriterionError, GapError, InputError
from springlife.life import findings as notice
from springlife.life import signal_findings
from springlife.life.band import BandRow, Mover, greatest_mover
from springlife.life.case import Case, load_case
from springlife.life.damage import DamageModel, Floats, greatest_factor
from springlife.life.findings import Finding
from springlife.life.limits import limit_values
from springlife.life.reading import Duty, Watcher, read_duty
from springlife.spring.grade import WireRangeError
from springlife.spring.helical import GeometryError, HelicalSpring
from springlife.spring.stress import StressMap, stress_map
from springlife.strength.criteria import CRITERIA, criterion, yield_factor
from springlife.strength.curve import MINERS, endurance_curve
from springlife.strength.endurance import BASES
from springlife.units import UnitSystem, split, system_of

HUGE = 1e9  # a margin beyond is that of a spring without stress


@dataclass(frozen=True)
class EventResult:
    """One event's part: cycles and damage a pass, and its share of the damage."""

    name: str
    repeats: int
    cycles: float
    damage: float
    share: float


@dataclass(frozen=True)
class WorstCycle:
    """The cycle class with the largest damage: deflections (m), stresses (Pa), cycles to failure, events."""

    low: float
    high: float
    tau_a: float
    tau_m: float
    cycles_to_failure: float
    count: float
    share: float
    events: tuple[str, str]


@dataclass(frozen=True)
class Judgement:
    """The numbers of a case that could be judged."""

    spring: HelicalSpring
    model: DamageModel
    cycles: EventCycles
    cycle_damage: Floats
    damage_per_pass: float
    damage_at_target: float
    life_passes: float | None  # None: no damage, unlimited
    stress_margin: float | None  # None: the duty puts no stress on the spring
    margin_governed_by: str
    events: tuple[EventResult, ...]
    worst: WorstCycle | None
    safety_factors: dict[str, float | None] | None
    factors_fixed_preload: dict[str, float | None] | None
    band: tuple[BandRow, ...]

    @cached_property
    def damaging_cycles(self) -> float:
        """Cycles a pass that together do 99 % of the damage: the rest may be as many as it likes."""
        total = float(self.cycle_damage.sum())
        if not 0 < total < np.inf:
            return 0.0
        order = np.argsort(self.cycle_damage)[::-1]
        enough = int(np.searchsorted(np.cumsum(self.cycle_damage[order]), 0.99 * total)) + 1
        return float(self.cycles.count[order[:enough]].sum())

    @property
    def extrapolated(self) -> bool:
        """Whether the life stands for more damaging cycles than the endurance data's basis."""
        return self.life_passes is not None and self.life_passes * self.damaging_cycles > self.model.curve.valid_to


@dataclass(frozen=True)
class Assessment:
    """A judged case. ``judgement`` is None when nothing could be computed; the findings say why."""

    case: Case
    verdict: str
    findings: tuple[Finding, ...]
    judgement: Judgement | None
    duty: Duty | None

    @cached_property
    def say(self) -> UnitSystem:
        """The unit system of the drawing."""
        return say_of(self.case)

    @property
    def target(self) -> tuple[float, str]:
        """The life asked for: number and unit as the case says."""
        return split(self.case.duty.target)

    @property
    def life(self) -> tuple[float | None, str]:
        """Life in the target's own unit; None when unlimited or not judged."""
        passes = self.judgement.life_passes if self.judgement else None
        number, unit = self.target
        per_pass = number / self.case.duty.target_passes
        return (None if passes is None else passes * per_pass), unit

    @property
    def reliability(self) -> str:
        """What the endurance data say about the share of springs that reach the life."""
        curve = self.judgement.model.curve if self.judgement else None
        if curve is None or curve.reliability is None:
            return "nominal strengths, reliability not stated by the source"
        at = "" if curve.confidence is None else f" at {100 * curve.confidence:g} % confidence"
        return f"{100 * curve.reliability:g} % of springs{at}, as the curve file states"

    @property
    def mover(self) -> Mover | None:
        """The published choice that moves the life most."""
        if self.judgement is None:
            return None
        ours = self.case.judge
        return greatest_mover(self.judgement.band, criterion=ours.criterion, endurance=ours.endurance, miner=ours.miner)

    @property
    def sources(self) -> tuple[str, ...]:
        """Where the numbers come from: wire, endurance data, life curve."""
        return (*self.judgement.spring.grade.sources, *self.judgement.model.curve.sources) if self.judgement else ()

    @property
    def inputs(self) -> tuple[tuple[str, str], ...]:
        """Name and SHA-256 of every file read: the case, its grades and curve files, the records."""
        case, events = self.case, () if self.duty is None else self.duty.events
        named = [case.spring.grade_file, None if case.judge.endurance in BASES else case.judge.endurance]
        beside = [(name, sha256(case.beside(name).read_bytes()).hexdigest()) for name in named if name]
        read = [(event.record, event.sha256) for event in events if event.record and event.sha256]
        return ((case.path.name, case.sha256), *beside, *read)

    def to_dict(self) -> dict[str, Any]:
        """Give everything for JSON; SI values under keys that name the unit."""
        from springlife.life.result import as_dict

        return as_dict(self)


def assess(case: Case | str | Path, watch: Watcher | None = None) -> Assessment:
    """Read a case's duty and judge it; ``watch`` is told how far reading is.

    Raises
    ------
    FileError, InputError
        When the case or a record cannot be used as given.
    """
    case = case if isinstance(case, Case) else load_case(case)
    spring, stops = part_of(case)
    if spring is None:
        return _withheld(case, stops, None)
    try:
        duty = read_duty(case, spring, watch)
    except GapError as error:
        return _withheld(case, [notice.found("gap", str(error))], None)
    return judge(case, duty)


def part_of(case: Case) -> tuple[HelicalSpring | None, list[Finding]]:
    """Build the spring; when it cannot exist or its wire is off the table, return the stop instead."""
    try:
        return case.build_spring(), []
    except GeometryError as error:
        return None, [notice.found("impossible-geometry", str(error))]
    except WireRangeError as error:
        return None, [notice.found("wire-off-table", str(error))]


def judge(case: Case, duty: Duty, told: Sequence[Finding] = ()) -> Assessment:
    """Judge a case whose duty has been counted; nothing is read again.

    ``told`` are findings about the records, made once with the drawn spring, that hold for this case too.
    """
    spring, seen = part_of(case)
    if spring is None:
        return _withheld(case, seen, duty)
    say, limits = say_of(case), limit_values(case.input.limits)
    stress = stress_map(spring, case.judge.stress_factor, case.judge.curvature_on)
    seen = [
        *told,
        *notice.of_part(spring, case.spring, limits, say),
        *notice.of_motion(spring, stress, duty, limits, say),
        *notice.of_scope(spring, case, say),
        *signal_findings.of_rate(spring, limits, say),
        *signal_findings.of_records(spring, stress, duty, case, limits, say),
    ]
    try:
        model = model_of(case, spring, stress)
    except CriterionError as error:
        return _withheld(case, [*seen, notice.found("strength-incoherent", str(error))], duty)
    judgement = _judgement(case, duty, spring, model)
    seen += notice.of_curve(model, limits, assumed=case.judge.endurance in BASES)
    seen += notice.of_damage(model, judgement.cycles, judgement.cycle_damage, duty, limits, say)
    seen += notice.of_life(judgement, case)
    seen += signal_findings.of_recounts(spring, model, duty, limits)
    settled = notice.settle(seen, case.input.waive)
    if any(finding.blocks for finding in settled):
        verdict = "withheld"
    else:
        verdict = "meets" if judgement.damage_at_target <= case.judge.allowed_damage else "falls short"
    return Assessment(case, verdict, settled, judgement, duty)


def _withheld(case: Case, seen: list[Finding], duty: Duty | None) -> Assessment:
    return Assessment(case, "withheld", notice.settle(seen, case.input.waive), None, duty)


def say_of(case: Case) -> UnitSystem:
    """Return the unit system of the drawing."""
    return system_of(case.raw["spring"]["wire_diameter"])


def model_of(
    case: Case, spring: HelicalSpring, stress: StressMap, *, by: str = "", basis: str = "", miner: str = ""
) -> DamageModel:
    """Put stress, criterion and curve together as the case asks, or with other published choices.

    Raises
    ------
    CriterionError
        The criterion has no usable strength from this endurance basis.
    """
    judge_as = case.judge
    rule = criterion(by or judge_as.criterion)
    basis = basis or judge_as.endurance
    curve = endurance_curve(
        basis if basis in BASES else case.beside(basis),
        rule,
        shot_peened=spring.shot_peened,
        family=spring.grade.cyclic_family,
        Sut=spring.Sut,
        Ssu=spring.Ssu,
        Ssy=spring.Ssy,
        f=judge_as.strength_fraction,
        knee=judge_as.knee,
    )
    return DamageModel(stress, rule, curve, spring.Ssu, spring.Ssy, miner or judge_as.miner)


def _judgement(case: Case, duty: Duty, spring: HelicalSpring, model: DamageModel) -> Judgement:
    """Compute the numbers, once the model stands."""
    one_pass = duty.one_pass(spring)
    cycles = one_pass.cycles("repeat")
    damage = model.damage(cycles.low, cycles.high, cycles.count)
    per_pass = float(damage.sum())
    life = _Life(case, duty, spring)
    at_target = life.damage(model)
    margin, governed_by = _margin(case, model, spring, one_pass.total.maximum, life)
    single = _single_cycle(duty, spring)
    return Judgement(
        spring=spring,
        model=model,
        cycles=cycles,
        cycle_damage=damage,
        damage_per_pass=per_pass,
        damage_at_target=at_target,
        life_passes=life.passes(model),
        stress_margin=margin,
        margin_governed_by=governed_by,
        events=_event_results(duty, cycles, damage),
        worst=_worst(model, duty, cycles, damage),
        safety_factors=_factors(case, spring, model, *single) if single else None,
        factors_fixed_preload=_factors(case, spring, model, *single, fixed=True) if single else None,
        band=_band(case, spring, model.stress, life),
    )


class _Life:
    """The cycles of a pass and of the life to the target, evaluated under any model."""

    def __init__(self, case: Case, duty: Duty, spring: HelicalSpring) -> None:
        self.allowed = case.judge.allowed_damage
        self.residue = case.judge.residue
        one_pass = duty.one_pass(spring)
        self.steady = one_pass.life(1.0, "repeat")
        self.first = one_pass.life(1.0, self.residue)
        self.target = one_pass.life(case.duty.target_passes, self.residue)

    def damage(self, model: DamageModel, factor: float = 1.0) -> float:
        """Damage at the target, every stress times ``factor``."""
        return float(model.damage(*self.target, factor=factor).sum())

    def passes(self, model: DamageModel) -> float | None:
        """Passes until the damage reaches the allowed sum: the first pass, then the steady state."""
        each = float(model.damage(*self.steady).sum())
        first = each if self.residue == "repeat" else float(model.damage(*self.first).sum())
        if each == 0:
            return None
        if not np.isfinite(each):
            return 0.0
        if first >= self.allowed:
            return self.allowed / first
        return 1.0 + (self.allowed - first) / each


def _margin(
    case: Case, model: DamageModel, spring: HelicalSpring, high: float, life: _Life
) -> tuple[float | None, str]:
    """Return the factor on every stress at which the target is just met, and what governs it."""
    peak = float(model.stress.static(np.asarray(high)))
    ceiling = spring.static_limit / peak if peak > 0 else np.inf
    if not ceiling < HUGE:
        return None, "no stress"
    factor = greatest_factor(lambda x: life.damage(model, x), case.judge.allowed_damage, ceiling)
    return factor, "yield" if factor == ceiling else "fatigue"


def _event_results(duty: Duty, cycles: EventCycles, damage: Floats) -> tuple[EventResult, ...]:
    """Share cycles half and half between the events of their two ends."""
    size = len(duty.events)
    both = np.concatenate([cycles.event_low, cycles.event_high])
    counted = np.bincount(both, np.concatenate([cycles.count, cycles.count]) / 2, size)
    harmed = np.bincount(both, np.concatenate([damage, damage]) / 2, size)
    total = harmed.sum()
    shares = harmed / total if 0 < total < np.inf else np.where(np.isinf(harmed), 1.0, 0.0)
    return tuple(
        EventResult(event.name, event.repeats, float(counted[i]), float(harmed[i]), float(shares[i]))
        for i, event in enumerate(duty.events)
    )


def _worst(model: DamageModel, duty: Duty, cycles: EventCycles, damage: Floats) -> WorstCycle | None:
    """Pick the cycle class with the largest damage; without damage, the one nearest to it."""
    if cycles.low.size == 0:
        return None
    tau_a, tau_m = model.stress.cycles(cycles.low, cycles.high)
    rank = np.lexsort((tau_a, model.criterion.equivalent(tau_a, tau_m, model.Ssu, model.Ssy), damage))
    i = int(rank[-1])
    total = float(damage.sum())
    return WorstCycle(
        low=float(cycles.low[i]),
        high=float(cycles.high[i]),
        tau_a=float(tau_a[i]),
        tau_m=float(tau_m[i]),
        cycles_to_failure=float(model.cycles_to_failure(cycles.low[i : i + 1], cycles.high[i : i + 1])[0]),
        count=float(cycles.count[i]),
        share=float(damage[i]) / total if 0 < total < np.inf else 0.0,
        events=(duty.events[int(cycles.event_low[i])].name, duty.events[int(cycles.event_high[i])].name),
    )


def _single_cycle(duty: Duty, spring: HelicalSpring) -> tuple[float, float] | None:
    """Return the deflection limits of a constant-amplitude duty, or None."""
    table = duty.one_pass(spring).total.table("repeat")
    return (float(table.low[0]), float(table.high[0])) if table.low.size == 1 else None


def _factors(
    case: Case, spring: HelicalSpring, model: DamageModel, low: float, high: float, *, fixed: bool = False
) -> dict[str, float | None]:
    """Safety factors of a constant-amplitude duty by each criterion, and against yield.

    ``fixed`` holds the preload stress, so that the load line starts there.
    """
    tau_a, tau_m = (float(part[0]) for part in model.stress.cycles(np.array([low]), np.array([high])))
    factors: dict[str, float | None] = {}
    for name, rule in CRITERIA.items():
        try:
            Sse = model_of(case, spring, model.stress, by=name).curve.strength_at_knee
        except CriterionError:
            factors[name.replace("-", "_")] = None
            continue
        strengths = (Sse, model.Ssu, model.Ssy)
        factor = (
            rule.factor_fixed_preload(tau_a, tau_m, tau_m - tau_a, *strengths)
            if fixed
            else rule.safety_factor(tau_a, tau_m, *strengths)
        )
        factors[name.replace("-", "_")] = float(factor)
    # Against yield as the static check has it: after set removal with the direct-shear factor and its own limit.
    factors["yield"] = float(yield_factor(0.0, model.stress.static(high), spring.static_limit))
    return factors


def _band(case: Case, spring: HelicalSpring, stress: StressMap, life: _Life) -> tuple[BandRow, ...]:
    """Judge the life under every criterion, endurance basis and Miner reading."""
    bases = list(BASES)
    if case.judge.endurance not in bases:
        bases.insert(0, case.judge.endurance)
    rows = []
    for basis in bases:
        for by in CRITERIA:
            for miner in MINERS:
                try:
                    model = model_of(case, spring, stress, by=by, basis=basis, miner=miner)
                except InputError as error:
                    rows.append(BandRow(by, basis, miner, None, str(error)))
                    continue
                rows.append(BandRow(by, basis, miner, life.passes(model)))
    return tuple(rows)
