"""A case with the wave in its coils for a person at a terminal: lives beside the static one, then event by event."""

from __future__ import annotations

from typing import TYPE_CHECKING

from springlife.report.terminal import VERDICTS, console_for_output, print_findings, print_rows, print_table
from springlife.report.terminal import quantity_of_life as life_text
from springlife.units import significant

if TYPE_CHECKING:
    from springlife.life.cam import CamSweep
    from springlife.life.surge import Damped, EventSurge, SurgeResult

READ_AS = (
    "the active wire as a uniform rod between seats that it does not leave; end coils, clashing coils, friction and "
    "a pitch that varies are not in it, and the damping ratio is an assumption until it is measured"
)


def print_surge(result: SurgeResult, caution: str) -> None:
    """Print a case with the wave in its coils."""
    from rich.text import Text

    console = console_for_output()
    console.print(Text(result.case.input.title, style="bold"))
    print_surge_part(result)
    stops = tuple(finding for finding in result.assessment.findings if finding.blocks)
    if stops:
        print_findings(console, stops)
    console.print()
    console.print(Text(caution, style="italic"))


def print_surge_part(result: SurgeResult) -> None:
    """Print what the wave adds to an assessment."""
    console = console_for_output()
    wave, static = result.wave, result.static
    word = VERDICTS[result.verdict][0].lower()
    frequency = significant(wave.first_frequency)
    console.print()
    print_rows(
        console,
        [
            ("with surge", f"{word}; target {result.case.duty.target}"),
            ("wave", f"first natural frequency {frequency} Hz, damping ratio {wave.zeta:g}"),
            ("static life", life_text(result.assessment, static.life_passes)),
        ],
    )
    heads: tuple[str, ...] = ("damping ratio", "life of the worst coil", "damage a pass", "over static", "coil")
    print_table(console, "Lives with the wave", heads, [_damped_row(result, one) for one in result.dampings])
    unit = result.assessment.say.units["force"]
    heads = (
        *("event", "times static", "coil"),
        *(f"fixed seat, {unit}", f"moving seat, {unit}", "gap closed", "lift-off"),
    )
    print_table(console, "Events", heads, [_event_row(result, event) for event in result.events])
    for cam in result.cams:
        _print_cam(result, cam)
    console.print()
    print_rows(console, [("warn", text) for text in result.warnings], style="yellow")
    print_rows(console, [("read as", READ_AS), ("coils", "counted in active coils from the fixed end")], style="dim")


def _damped_row(result: SurgeResult, one: Damped) -> tuple[str, ...]:
    static = result.static.damage_per_pass
    damage = float(one.damage[one.worst])
    over = f"{significant(damage / static, 3)} times" if static > 0 else "-"
    life = life_text(result.assessment, one.judgement.life_passes)
    return f"{one.zeta:g}", life, significant(damage, 3), over, significant(result.coil(one.worst), 2)


def _event_row(result: SurgeResult, event: EventSurge) -> tuple[str, ...]:
    if event.slow:
        return event.name, "slow", "-", "-", "-", "-", "-"
    number = result.assessment.say.number
    forces = [
        f"{number(low, 'force', 3)} to {number(high, 'force', 3)}"
        for low, high in (event.fixed_force, event.moving_force)
    ]
    shares = [f"{significant(100 * share, 2)} %" if share else "no" for share in (event.closed, event.lifted)]
    return event.name, significant(event.amplification), significant(result.coil(event.worst), 2), *forces, *shares


def _print_cam(result: SurgeResult, cam: CamSweep) -> None:
    """Print a cam, a row a speed."""
    force = result.assessment.say.units["force"]
    heads = ("rpm", "times static", "coil", f"least seat force, {force}", "damage a turn", "hours to damage 1")
    rows = [
        (
            f"{one.turns_per_minute:g}",
            significant(one.amplification),
            significant(result.coil(one.place), 2),
            result.assessment.say.number(one.least_seat_force, "force", 3),
            significant(one.damage, 3),
            "unlimited" if one.hours is None else significant(one.hours, 3),
        )
        for one in cam.speeds
    ]
    slow = significant(cam.slow_damage, 3)
    print_table(console_for_output(), f"Cam {cam.name!r} (damage a turn in slow motion {slow})", heads, rows)
