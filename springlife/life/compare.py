"""Options side by side, judged from one count: shot-peened or not first of all.

The duty is a motion of the drawn spring. What an option goes through depends on what is held constant, so
that is always said: the order of options can turn on it.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any, Literal, get_args

from springlife.errors import InputError, nearest
from springlife.life.assess import Assessment, assess, judge, part_of
from springlife.life.case import Case, load_case
from springlife.life.findings import Finding, found
from springlife.life.reading import Duty
from springlife.life.scatter import Estimate, b_lives
from springlife.life.signal_findings import OF_THE_RECORD
from springlife.spring.helical import HelicalSpring

Hold = Literal["stroke", "force", "length", "rate"]
HELD = {
    "stroke": "deflections as of the drawn spring: every option moves through the same stroke from the same preload",
    "force": "forces as of the drawn spring: every option's deflection follows from its own rate",
    "length": "lengths between the seats as of the drawn spring: a longer free length preloads more",
    "rate": "rate and deflections as of the drawn spring: every option's active coils are changed to keep the rate",
}
DRAWN = "as drawn"
MOST_SCATTERED = 8  # options whose B10 is drawn; a grid of hundreds goes without
B10_SAMPLES = 4096  # springs drawn for each


@dataclass(frozen=True)
class Option:
    """One option judged. Preload is the force at the duty's least deflection; cost is wire, relative."""

    name: str
    assessment: Assessment
    preload: float | None  # N
    clearance: float | None  # solid deflection less greatest deflection, m
    peak_stress: float | None  # Pa
    relative_cost: float | None  # mass in kg times the grade's relative cost; peening not included
    lives: dict[str, float | None]  # passes by criterion on the case's endurance basis and Miner reading
    b10: Estimate | None = None  # passes that 90 % of springs reach; None without damage or in a large grid
    best_for: tuple[str, ...] = ()  # "mass", "cost": no other option is lighter (cheaper) and lives longer

    @property
    def spring(self) -> HelicalSpring | None:
        """The option's spring, None when it could not be judged."""
        return self.assessment.judgement.spring if self.assessment.judgement else None

    @property
    def life(self) -> float:
        """Passes for ordering: unlimited is infinite, not judged is below everything."""
        j = self.assessment.judgement
        if j is None or self.assessment.verdict == "withheld":
            return -1.0
        return float("inf") if j.life_passes is None else j.life_passes

    def to_dict(self) -> dict[str, Any]:
        """Give the option for JSON."""
        return {
            "name": self.name,
            "preload_N": self.preload,
            "solid_clearance_m": self.clearance,
            "peak_stress_Pa": self.peak_stress,
            "relative_cost": self.relative_cost,
            "life_passes_by_criterion": self.lives,
            "B10_passes": self.b10.to_dict() if self.b10 else None,
            "best_for": list(self.best_for),
            "assessment": self.assessment.to_dict(),
        }


@dataclass(frozen=True)
class Comparison:
    """The drawn spring and its options, in the order of the case; ``held`` says what stays the same."""

    case: Case
    hold: Hold
    options: tuple[Option, ...]
    findings: tuple[Finding, ...]

    @property
    def held(self) -> str:
        """What is held constant, in words."""
        return HELD[self.hold]

    def to_dict(self) -> dict[str, Any]:
        """Give the comparison for JSON."""
        return {
            "title": self.case.input.title,
            "held": self.hold,
            "held_meaning": self.held,
            "options": [option.to_dict() for option in self.options],
            "findings": [finding.to_dict() for finding in self.findings],
        }


def compare(case: Case | str | Path, hold: Hold = "stroke") -> Comparison:
    """Judge the drawn spring, its options, and peened against not; the records are read once.

    Raises
    ------
    FileError, InputError
        When the case or a record cannot be used, or the drawn spring cannot be read.
    """
    if hold not in get_args(Hold):
        raise InputError(f"hold is {hold!r}; {nearest(hold, get_args(Hold))}")
    case = case if isinstance(case, Case) else load_case(case)
    drawn = assess(case)
    base, _ = part_of(case)
    if drawn.duty is None or base is None:
        stops = "; ".join(finding.message for finding in drawn.findings if finding.level == "stop")
        raise InputError(f"{case.path}: the drawn spring cannot be judged, so there is nothing to compare: {stops}")
    pinned = drawn.duty.pinned(base)
    told = [finding for finding in drawn.findings if finding.code in OF_THE_RECORD]
    options = [_option(DRAWN, drawn)]
    options += [_option(variant.name, _judge(variant, base, pinned, told, hold)) for variant in variants(case)]
    if len(options) <= MOST_SCATTERED:
        options = [replace(option, b10=_b10(option.assessment)) for option in options]
    return Comparison(case, hold, _marked(options), _differences(base, options, hold))


def variants(case: Case) -> Iterator[Case]:
    """Yield the case's options, and the drawn spring with peening turned over unless an option does just that."""
    peened = case.spring.shot_peened
    turned = {"shot_peened": not peened}
    own = case.options()
    if not any(option.spring == case.spring.model_copy(update=turned) for option in own):
        yield case.varied("not shot-peened" if peened else "shot-peened", turned, {}, "")
    yield from own


def _judge(variant: Case, base: HelicalSpring, pinned: Duty, told: list[Finding], hold: Hold) -> Assessment:
    spring, _ = part_of(variant)
    if spring is None:
        return judge(variant, pinned, told)
    if hold == "rate":
        coils = spring.total_coils + spring.active_coils * (spring.calculated_rate / base.rate - 1)
        variant = variant.varied(variant.name, {"total_coils": coils}, {}, "")
        spring, _ = part_of(variant)
    if hold == "force" and spring is not None:
        return judge(variant, pinned.mapped(base.rate / spring.rate, 0.0), told)
    if hold == "length" and spring is not None:
        return judge(variant, pinned.mapped(1.0, spring.free_length - base.free_length), told)
    return judge(variant, pinned, told)


def _b10(result: Assessment) -> Estimate | None:
    lives = b_lives(result, samples=B10_SAMPLES)
    return lives["B10"] if lives else None


def _option(name: str, result: Assessment) -> Option:
    """Put an assessment's facts together for the table."""
    j = result.judgement
    if j is None or result.duty is None:
        return Option(name, result, None, None, None, None, {})
    low, high = result.duty.extremes(j.spring)
    ours = result.case.judge
    lives = {
        row.criterion: row.life_passes
        for row in j.band
        if row.endurance == ours.endurance and row.miner == ours.miner and row.withheld is None
    }
    return Option(
        name=name,
        assessment=result,
        preload=float(j.spring.force(low)),
        clearance=j.spring.solid_deflection - high,
        peak_stress=float(j.model.stress.static(min(high, j.spring.solid_deflection))),
        relative_cost=None if j.spring.grade.relative_cost is None else j.spring.mass * j.spring.grade.relative_cost,
        lives=lives,
    )


def _marked(options: list[Option]) -> tuple[Option, ...]:
    """Mark the options that none beats on life and mass, or on life and cost, at once."""

    def price(option: Option, goal: str) -> float | None:
        if goal == "cost":
            return option.relative_cost
        return option.spring.mass if option.spring else None

    def beaten(one: Option, goal: str) -> bool:
        own = price(one, goal)
        if own is None or one.life < 0:
            return True
        for other in options:
            cost = price(other, goal)
            if cost is None or other.life < 0:
                continue
            if cost <= own and other.life >= one.life and (cost < own or other.life > one.life):
                return True
        return False

    goals = ("mass", "cost")
    return tuple(
        replace(option, best_for=tuple(goal for goal in goals if not beaten(option, goal))) for option in options
    )


def _differences(base: HelicalSpring, options: list[Option], hold: Hold) -> tuple[Finding, ...]:
    """Note options that change rate or lengths: what is held then decides what they go through."""
    changed = []
    for option in options:
        spring = option.spring
        if spring is None:
            continue
        parts = [
            word
            for word, ours, theirs in (
                ("rate", base.rate, spring.rate),
                ("free length", base.free_length, spring.free_length),
                ("solid length", base.solid_length, spring.solid_length),
            )
            if abs(theirs / ours - 1) > 1e-6
        ]
        if parts:
            changed.append(f"{option.name!r} changes {' and '.join(parts)}")
    if not changed:
        return ()
    listed = "; ".join(changed[:6]) + (f"; and {len(changed) - 6} more" if len(changed) > 6 else "")
    return (found("options-differ", f"{listed}; held: {hold}"),)
