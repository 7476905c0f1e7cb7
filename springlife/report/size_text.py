"""A sizing for a person at a terminal: what meets everything, best first, and why near misses do not."""

from __future__ import annotations

from typing import TYPE_CHECKING

from springlife.report.terminal import console_for_output, print_rows, print_table, quantity_of_life
from springlife.units import significant

if TYPE_CHECKING:
    from springlife.life.size import Candidate, Sizing

SHOWN = 10


def print_sizing(result: Sizing, caution: str) -> None:
    """Print the best springs, the near misses and the drawn spring's greatest stroke."""
    from rich.text import Text

    console = console_for_output()
    say = result.assessment.say
    heading = "NO SPRING MEETS EVERYTHING"
    if result.found:
        heading = f"THE BEST {len(result.found)} SPRINGS THAT MEET EVERYTHING, OF {result.tried} TRIED"
    console.print(Text(heading, style="bold"))
    console.print(Text(result.assessment.case.input.title))
    goal = {"mass": "lightest", "cost": "cheapest", "life": "longest-lived"}[result.settings.goal]
    stroke = "the duty has no stroke"
    if result.stroke_factor is not None:
        stroke = (
            f"{significant(result.stroke_factor, 3)} times the drawn spring's ({result.stroke_governed_by} governs)"
        )
    print_rows(console, [("goal", f"{goal} first; held by {result.settings.hold}"), ("greatest stroke", stroke)])
    units = say.units
    heads = ("wire", "d " + units["length"], "D " + units["length"], "coils", "L0 " + units["length"],
             "rate " + units["rate"], "mass " + units["mass"], "cost", "life")  # fmt: skip
    if result.found:
        rows = [_row(result, candidate) for candidate in result.found[:SHOWN]]
        print_table(console, f"Meet everything ({len(rows)} shown)", heads, rows)
    if result.misses:
        rows = [
            (*_row(result, one)[:-1], "; ".join(f"{name} {100 * ratio:.1f} %" for name, ratio in one.failed.items()))
            for one in result.misses
        ]
        print_table(console, "Near misses, by how much of what is asked they reach", (*heads[:-1], "fails on"), rows)
    console.print()
    console.print(Text(caution, style="italic"))


def _row(result: Sizing, candidate: Candidate) -> tuple[str, ...]:
    say, s = result.assessment.say, candidate.spring
    return (
        f"{s.grade.name}{' peened' if s.shot_peened else ''}",
        say.number(s.wire_diameter, "length"),
        say.number(s.mean_diameter, "length"),
        f"{s.total_coils:g}",
        say.number(s.free_length, "length"),
        say.number(s.rate, "rate", 3),
        say.number(s.mass, "mass", 3),
        significant(candidate.cost, 3),
        quantity_of_life(result.assessment, candidate.passes),
    )
