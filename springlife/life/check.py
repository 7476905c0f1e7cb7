"""Read everything a case names and judge nothing: what the file says, as the program understood it."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Any

from springlife.duty.counting import Count
from springlife.life import findings as notice
from springlife.life import signal_findings
from springlife.life.assess import part_of, say_of
from springlife.life.case import Case, load_case
from springlife.life.findings import Finding
from springlife.life.limits import limit_values
from springlife.life.reading import Duty, EventReading, Watcher, read_duty
from springlife.life.result import spring_facts
from springlife.spring.helical import HelicalSpring
from springlife.spring.stress import stress_map
from springlife.units import UnitSystem, significant

Rows = list[tuple[str, str]]
PLOT = (6, 64)  # lines and columns of a record's plot


@dataclass(frozen=True)
class CheckResult:
    """A case read in full."""

    case: Case
    spring: HelicalSpring | None
    duty: Duty | None
    findings: tuple[Finding, ...]

    @property
    def title(self) -> str:
        """The case's title."""
        return self.case.input.title

    @property
    def stopped(self) -> bool:
        """Whether a stop stands that would withhold judgement."""
        return any(finding.blocks for finding in self.findings)

    @property
    def sections(self) -> list[tuple[str, Rows]]:
        """Headings with label and text, for a person."""
        say = say_of(self.case)
        parts: list[tuple[str, Rows]] = []
        if self.spring:
            parts.append(("Spring", _spring_rows(self.spring, say)))
        if self.duty:
            parts += [(f"Event {event.name!r}", _event_rows(event, say)) for event in self.duty.events]
        return parts

    def to_dict(self) -> dict[str, Any]:
        """Give the check for JSON."""
        events = self.duty.events if self.duty else ()
        return {
            "title": self.title,
            "spring": spring_facts(self.spring) if self.spring else None,
            "events": [
                {
                    "name": event.name,
                    "repeats": event.repeats,
                    "path": event.record,
                    "sha256": event.sha256,
                    "cycles": float(event.count.table("half").count.sum()),
                    "record": event.summary.to_dict() if event.summary else None,
                    "provenance": list(event.provenance),
                }
                for event in events
            ],
            "findings": [finding.to_dict() for finding in self.findings],
        }


def check(case: Case | str | Path, watch: Watcher | None = None) -> CheckResult:
    """Read a case and its records; findings of the part and the motion only.

    Raises
    ------
    FileError, InputError
        When the case or a record cannot be used as given.
    """
    case = case if isinstance(case, Case) else load_case(case)
    spring, seen = part_of(case)
    if spring is None:
        return CheckResult(case, None, None, notice.settle(seen, case.input.waive))
    duty, seen = read_or_stop(case, spring, watch)
    if duty is not None:
        say, limits = say_of(case), limit_values(case.input.limits)
        stress = stress_map(spring, case.judge.stress_factor, case.judge.curvature_on)
        seen = [
            *notice.of_part(spring, case.spring, limits, say),
            *notice.of_motion(spring, stress, duty, limits, say),
            *signal_findings.of_rate(spring, limits, say),
            *signal_findings.of_records(spring, stress, duty, case, limits, say),
        ]
    return CheckResult(case, spring, duty, notice.settle(seen, case.input.waive))


def read_or_stop(case: Case, spring: HelicalSpring, watch: Watcher | None) -> tuple[Duty | None, list[Finding]]:
    """Read the duty; a record with gaps is a stop, not a crash."""
    from springlife.errors import GapError

    try:
        return read_duty(case, spring, watch), []
    except GapError as error:
        return None, [notice.found("gap", str(error))]


def _spring_rows(spring: HelicalSpring, say: UnitSystem) -> Rows:
    return [
        ("wire", f"{spring.grade.title}, {say(spring.wire_diameter, 'length')}, Sut {say(spring.Sut, 'stress')}"),
        ("coil", f"mean diameter {say(spring.mean_diameter, 'length')}, index {significant(spring.index, 3)}, "
                 f"{significant(spring.active_coils)} of {significant(spring.total_coils)} coils active, "
                 f"{spring.ends}"),
        ("length", f"free {say(spring.free_length, 'length')}, solid {say(spring.solid_length, 'length')}"),
        ("rate", say(spring.rate, "rate") + (
            f" (measured; {say(spring.calculated_rate, 'rate')} calculated)" if spring.measured_rate else "")),
        ("solid", f"deflection {say(spring.solid_deflection, 'length')}, force {say(spring.solid_force, 'force')}"),
        ("mass", f"{say(spring.mass, 'mass')}, surge frequency {say(spring.surge_frequency, 'frequency')}"),
    ]  # fmt: skip


def _kept(counted: Count) -> str:
    """Say when there were too many distinct cycles to keep each exactly."""
    return "" if counted.exact else f", kept in cells of {significant(counted.cell, 3)} m (extremes exact)"


def _plot_rows(event: EventReading, say: UnitSystem, kind: str) -> Rows:
    """Draw a record in a few lines: each column spans the least and greatest value of a stretch."""
    if event.envelope is None or event.summary is None or not event.summary.maximum > event.summary.minimum:
        return []
    low, high = event.envelope.columns(PLOT[1])
    bottom, top = event.summary.minimum, event.summary.maximum
    step = (top - bottom) / PLOT[0]
    rows: Rows = []
    for line in range(PLOT[0] - 1, -1, -1):
        inside = (low <= bottom + (line + 1) * step) & (high >= bottom + line * step)
        label = say(top, kind, 3) if line == PLOT[0] - 1 else say(bottom, kind, 3) if line == 0 else ""
        rows.append((label, "".join("┃" if one else " " for one in inside)))
    return rows


def _event_rows(event: EventReading, say: UnitSystem) -> Rows:
    kind = "force" if event.measures == "force" else "length"
    c = event.count
    rows = [
        ("happens", "once a pass" if event.repeats == 1 else f"{event.repeats} times a pass"),
        (
            "cycles",
            f"{significant(float(c.table('half').count.sum()), 6)} counted, residue of {c.residue.size} points",
        ),
        ("extremes", f"{say(c.minimum, kind)} to {say(c.maximum, kind)} {event.measures}"),
    ]
    if event.record is not None:
        rows.insert(0, ("record", f"{event.record}, sha256 {(event.sha256 or '')[:16]}…"))
    if event.summary is not None:
        rows += event.summary.lines()
        rows += _plot_rows(event, say, kind)
    return rows + [("read", line) for line in event.provenance]
