"""A sizing for a person at a terminal: what meets everything, best first, and why near misses do not."""

from __future__ import annotations

from typing import TYPE_CHECKING

from springlife.report.terminal import console_for_output, print_rows, print_table, quantity_of_life
from springlife.units import significant

if TYPE_CHECKING:
    from springlife.life.size import Sizing
    from springlife.life.size_table import Candidate

SHOWN, LEFT_OUT = 10, 4


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
    rows = [("goal", f"{goal} first"), ("held", result.held), ("greatest stroke", stroke)]
    if result.failures:
        rows.append(("fail", ", ".join(f"{name} {number}" for name, number in result.failures.items())))
    rows += [("left out", reason) for reason in result.excluded[:LEFT_OUT]]
    if result.found:
        warned = ", ".join(result.found[0].warnings)
        rows.append(("the best", f"judged on its own meets the target; warnings: {warned or 'none'}"))
    if result.settings.working_frequency is None:
        rows.append(("surge", "not checked: [size] gives no working_frequency"))
    print_rows(console, rows)
    units = say.units
    heads = ("wire", "d " + units["length"], "D " + units["length"], "coils", "L0 " + units["length"],
             "rate " + units["rate"], "mass " + units["mass"], "cost", "life")  # fmt: skip
    if result.found:
        shown = [_row(result, candidate) for candidate in result.found[:SHOWN]]
        print_table(console, f"Meet everything ({len(shown)} shown)", heads, shown)
    if result.misses:
        misses = [
            (*_row(result, one)[:-1], "; ".join(f"{name} {100 * ratio:.1f} %" for name, ratio in one.failed.items()))
            for one in result.misses
        ]
        print_table(console, "Near misses, by how much of what is asked they reach", (*heads[:-1], "fails on"), misses)
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
