"""A proposed rig test for a person at a terminal."""

from __future__ import annotations

from typing import TYPE_CHECKING

from springlife.report.terminal import console_for_output, print_findings, print_rows, print_table
from springlife.units import significant

if TYPE_CHECKING:
    from springlife.life.rig import RigTest


def print_rig(test: RigTest, caution: str) -> None:
    """Print limits, cycles, hours and springs, how far the cycles move with the model, and refusals."""
    from rich.text import Text

    console = console_for_output()
    case, j, say = test.assessment.case, test.judgement, test.assessment.say
    head = "RIG TEST NOT TO BE RUN AS PROPOSED" if test.stopped else "RIG TEST WITH THE DUTY'S DAMAGE"
    console.print(Text(head, style="bold red" if test.stopped else "bold"))
    console.print(Text(case.input.title))
    console.print()
    tau_a, tau_m = (float(part) for part in j.model.stress.cycles(test.low, test.high))
    factor = (
        ""
        if test.life_factor == 1
        else f" ({test.life_factor:g} times the {significant(test.exact_cycles)} of equal damage)"
    )
    ends = [(say(y, "length"), say(float(j.spring.force(y)), "force")) for y in (test.low, test.high)]
    rows = [
        ("limits", f"deflection {ends[0][0]} to {ends[1][0]}, force {ends[0][1]} to {ends[1][1]}"),
        ("stress", f"{say(tau_a, 'stress')} about {say(tau_m, 'stress')}"),
        ("cycles", f"{test.cycles}{factor}, {significant(test.hours, 3)} h at {significant(test.frequency, 3)} Hz"),
        ("damage", f"{significant(j.damage_at_target, 3)}, that of {case.duty.target} of the duty"),
        ("springs", f"{test.springs}, all of which must survive, to show {100 * test.reliability:g} % reliability at "
                    f"{100 * test.confidence:g} % confidence"),
    ]  # fmt: skip
    print_rows(console, rows)
    print_findings(console, test.findings)
    band = [
        (row.endurance, row.miner, row.criterion, "none" if cycles is None else significant(cycles, 3))
        for row, cycles in test.spread
    ]
    print_table(
        console,
        "Cycles of equal damage under every published choice",
        ("endurance", "Miner", "criterion", "cycles"),
        band,
        left=3,
    )
    console.print()
    console.print(Text(caution, style="italic"))
