"""Search for the lightest, cheapest or longest-lived spring that meets the target and every static check.

The duty is counted once and held by stroke, preload or force. The whole grid is screened as arrays; the best of it are
then judged one by one like any drawn spring, and only what that judgement passes is offered.
"""

from __future__ import annotations

import math
import tomllib
from collections.abc import Iterator
from dataclasses import dataclass, replace
from importlib.resources import files
from itertools import chain
from pathlib import Path
from typing import Any

import numpy as np

from springlife.errors import CriterionError, InputError
from springlife.life import findings as notice
from springlife.life.assess import Assessment, assess, judge, model_of
from springlife.life.case import Case
from springlife.life.damage import DamageModel, greatest_factor
from springlife.life.limits import limit_values
from springlife.life.population import Cycles, in_cells
from springlife.life.reading import Duty
from springlife.life.signal_findings import OF_THE_RECORD
from springlife.life.size_grid import Hold, damages, shortfalls, springs_of, stresses
from springlife.life.size_input import SizeInput
from springlife.life.size_table import Batch, Candidate, Cloud, Table, few_of_each
from springlife.spring.grade import Grade, grade
from springlife.spring.helical import HelicalSpring
from springlife.units import parse

KEPT, JUDGED = 20, 100  # springs offered, and judged one by one before giving up
HELD = {
    "stroke": "deflections as of the drawn spring: same stroke from the same installed deflection",
    "preload": "stroke and least force as of the drawn spring: the installed deflection follows from the rate",
    "force": "forces as of the drawn spring: deflections follow from the rate",
}


@dataclass(frozen=True)
class Sizing:
    """Springs that meet everything, best first; near misses with what they fail; the drawn spring's greatest stroke."""

    assessment: Assessment
    settings: SizeInput
    tried: int
    failures: dict[str, int]  # springs of the grid that fail each check
    excluded: tuple[str, ...]  # wires left out, and why
    found: tuple[Candidate, ...]
    misses: tuple[Candidate, ...]
    cloud: Cloud
    stroke_factor: float | None
    stroke_governed_by: str

    @property
    def held(self) -> str:
        """What is held of the duty, in words."""
        return HELD[self.settings.hold]

    def to_dict(self) -> dict[str, Any]:
        """Give the sizing for JSON."""
        return {
            "title": self.assessment.case.input.title,
            "goal": self.settings.goal,
            "held": self.settings.hold,
            "held_meaning": self.held,
            "tried": self.tried,
            "failures": self.failures,
            "excluded": list(self.excluded),
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
    if search.hold.high <= 0:
        high = result.say(search.hold.high, "length")
        raise InputError(
            f"{result.case.path}: the duty's greatest deflection is {high}, so it never compresses the spring "
            "and nothing can be sized; check the datum and the sign"
        )
    batches = [batch for first in search.wires() for batch in search.batches(first)]
    tried = sum(batch.size for batch in batches)
    if not tried:
        left_out = "".join(f"; {reason}" for reason in search.excluded)
        raise InputError(
            f"{result.case.path}: [size] leaves no spring to try; widen diameters, coils, sizes or grades{left_out}"
        )
    table = Table(batches, search.settings.goal)
    found, refused, best = search.judged(table)
    misses = chain(refused, (table.candidate(row, search.target_passes) for row in table.near_misses(best)))
    factor, governed_by = greatest_stroke(result)
    return Sizing(
        result, search.settings, tried, table.failures(), tuple(search.excluded), found, few_of_each(misses),
        table.cloud(search.target_passes), factor, governed_by,
    )  # fmt: skip


class _Search:
    """What every wire of the search shares: the duty, the drawn spring and the limits."""

    def __init__(self, result: Assessment) -> None:
        assert result.judgement is not None and result.duty is not None
        self.result, self.case = result, result.case
        self.settings: SizeInput = result.case.input.size
        self.drawn = result.judgement.spring
        self.limits = limit_values(result.case.input.limits)
        self.rate = self.settings.rate or self.drawn.rate
        self.hold = Hold(self.settings.hold, self.drawn.rate, *result.duty.extremes(self.drawn))
        self.target_passes = result.case.duty.target_passes
        self.pinned = result.duty.pinned(self.drawn)
        self.cycles = _cycles(result)
        self.excluded: list[str] = []

    def wires(self) -> Iterator[HelicalSpring]:
        """Yield one spring of each wire; wires that could never be judged go to ``excluded``."""
        file = self.case.spring.grade_file
        path = None if file is None else self.case.beside(file)
        for wire in (grade(name, path) for name in self.settings.grades or [self.drawn.grade.name]):
            low, high = wire.diameter_range
            for d in (d for d in self._sizes() if low <= d <= high):
                first = self._first(wire, d)
                seen = notice.of_part(first, self.case.spring, self.limits, self.result.say)
                stops = [finding.message for finding in seen if finding.level == "stop"]
                if stops:
                    self.excluded += [reason for reason in stops if reason not in self.excluded]
                else:
                    yield first

    def _sizes(self) -> list[float]:
        given = self.settings.sizes
        if given is None:
            given = "inch" if self.result.say.name == "inch" else "metric"
        return wire_sizes(given) if isinstance(given, str) else given

    def _first(self, wire: Grade, d: float) -> HelicalSpring:
        """Build one spring of a wire. What was measured on the drawn spring says nothing about it."""
        C = math.sqrt(self.limits["index_low"] * self.limits["index_high"])
        coils = self.drawn.total_coils - self.drawn.active_coils + 2 * self.limits["active_coils_low"]
        same_grade = wire.name == self.drawn.grade.name
        gone: dict[str, Any] = dict.fromkeys(("outer_diameter", "inner_diameter", "measured_rate", "tensile_strength"))
        gone |= {} if same_grade else {"shear_modulus": None}
        part: dict[str, Any] = {"mean_diameter": C * d, "total_coils": coils, "free_length": 4 * coils * d}
        return replace(self.drawn, grade=wire, wire_diameter=d, **part, **gone)

    def batches(self, first: HelicalSpring) -> Iterator[Batch]:
        """Yield the wire's part of the grid, screened, for each peening asked for."""
        springs = springs_of(first, self.settings, self.rate, self.hold, self.limits)
        if not springs.total_coils.size:
            return
        static = shortfalls(springs, self.case, self.rate, self.hold, self.limits)
        worth = np.flatnonzero(sum((ratio < 1).astype(int) for ratio in static.values()) <= 1)
        allowed = self.case.judge.allowed_damage
        for peened in self.settings.peened or [self.drawn.shot_peened]:
            mine = replace(springs, first=replace(first, shot_peened=peened))
            damage = np.full(springs.total_coils.size, np.nan)
            try:
                model = model_of(self.case, mine.first, stresses(mine, self.case))
            except CriterionError as error:
                self.excluded.append(f"{self._wire(mine.first)}: {error}")
                continue
            damage[worth] = damages(mine, worth, model, self.cycles, self.hold, self.case)
            with np.errstate(divide="ignore", invalid="ignore"):
                life = np.where(damage > allowed, allowed / damage, 1.0)
            yield Batch(mine, static | {"life": life}, damage)

    def _wire(self, spring: HelicalSpring) -> str:
        peened = "shot-peened" if spring.shot_peened else "not peened"
        return f"{spring.grade.name} {self.result.say(spring.wire_diameter, 'length')} {peened}"

    def judged(self, table: Table) -> tuple[tuple[Candidate, ...], list[Candidate], int | None]:
        """Judge the best of the screened springs in full; return those that pass, those refused, and the best's row."""
        found: dict[int, Candidate] = {}
        refused: list[Candidate] = []
        told = [finding for finding in self.result.findings if finding.code in OF_THE_RECORD]
        for row in table.passing()[:JUDGED]:
            candidate = self._judged(table.candidate(row, self.target_passes), told)
            if candidate.failed:
                refused.append(candidate)
            else:
                found[int(row)] = candidate
            if len(found) == KEPT:
                break
        return tuple(found.values()), refused, next(iter(found), None)

    def _judged(self, candidate: Candidate, told: list[notice.Finding]) -> Candidate:
        result = judge(self._as_case(candidate.spring), self._duty_of(candidate.spring), told)
        warnings = tuple(finding.code for finding in result.findings if finding.level == "warn")
        stops = {finding.code: 0.0 for finding in result.findings if finding.blocks}
        j = result.judgement
        if j is None:
            return replace(candidate, failed=stops)
        allowed = self.case.judge.allowed_damage
        life = {"life": allowed / j.damage_at_target} if j.damage_at_target > allowed else {}
        return replace(
            candidate, damage=j.damage_at_target, passes=j.life_passes, failed=stops | life, warnings=warnings
        )

    def _as_case(self, spring: HelicalSpring) -> Case:
        """Write a spring into the case, as a person would, so that it is judged like any drawn one."""
        part = {key: value for key, value in self.case.raw["spring"].items() if key != "shear_modulus"}
        if spring.shear_modulus is not None:
            part["shear_modulus"] = self.case.raw["spring"]["shear_modulus"]
        case = replace(self.case, raw=dict(self.case.raw, spring=part))
        own = {
            "grade": spring.grade.name,
            "wire_diameter": f"{spring.wire_diameter!r} m",
            "mean_diameter": f"{spring.mean_diameter!r} m",
            "total_coils": spring.total_coils,
            "free_length": f"{spring.free_length!r} m",
            "shot_peened": spring.shot_peened,
        }
        return case.varied("sized", own, {}, "size: ")

    def _duty_of(self, spring: HelicalSpring) -> Duty:
        slope, shift = self.hold.line(np.array(spring.rate))
        return self.pinned.mapped(float(slope), float(shift))


def _cycles(result: Assessment) -> Cycles:
    """Return the cycles of the whole life in deflections of the drawn spring; many are put into cells."""
    j, duty, case = result.judgement, result.duty, result.case
    assert j is not None and duty is not None
    low, high, count = duty.one_pass(j.spring).life(case.duty.target_passes, case.judge.residue)
    deflection = np.zeros(low.size, dtype=np.intp)
    cycles = Cycles(low, high, count, deflection, deflection)
    return in_cells(cycles, j.model.damage(low, high, count))


def _damage(model: DamageModel, table: tuple[Any, Any, Any], stretch: float, start: float) -> float:
    """Damage of a table of cycles whose deflections are stretched about ``start``."""
    low, high, count = table
    return float(model.damage(start + stretch * (low - start), start + stretch * (high - start), count).sum())


def greatest_stroke(result: Assessment) -> tuple[float | None, str]:
    """Return the factor on the drawn spring's stroke, its least deflection held, at which the target is just met.

    The second value names what governs: fatigue, clash allowance, yield or buckling. None when the duty has no stroke.
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
    if j.spring.buckling_deflection is not None and not j.spring.guided:
        ends["buckling"] = j.spring.buckling_deflection
    governed_by = min(ends, key=lambda name: ends[name])
    ceiling = (ends[governed_by] - low) / (high - low)
    if ceiling <= 0:
        return 0.0, governed_by
    table = result.duty.one_pass(j.spring).life(case.duty.target_passes, case.judge.residue)
    factor = greatest_factor(lambda x: _damage(j.model, table, x, low), case.judge.allowed_damage, ceiling)
    return factor, governed_by if factor == ceiling else "fatigue"
