"""A comparison for a person at a terminal: what is held, then one column an option or one row when many."""

from __future__ import annotations

from typing import TYPE_CHECKING

from springlife.life.compare import B10_SAMPLES
from springlife.report.terminal import console_for_output, print_findings, print_table, quantity_of_life
from springlife.strength.criteria import CRITERIA
from springlife.units import significant

if TYPE_CHECKING:
    from springlife.life.compare import Comparison, Option

MOST_COLUMNS = 5


def print_comparison(result: Comparison, caution: str) -> None:
    """Print options side by side; a large grid as a ranked list."""
    from rich.text import Text

    console = console_for_output()
    console.print(Text(result.case.input.title, style="bold"))
    console.print(Text(f"Held: {result.hold} - {result.held}."))
    names = [option.name for option in result.options]
    if len(names) <= MOST_COLUMNS:
        columns = [_cells(option) for option in result.options]
        rows = [(label, *(column[label] for column in columns)) for label in columns[0]]
        print_table(console, "Options", ("", *names), rows)
    else:
        ranked = sorted(result.options, key=lambda option: option.life, reverse=True)
        labels = ("verdict", "life", "stress margin", "mass", "relative wire cost", "best on life against")
        rows = [(option.name, *(_cells(option)[label] for label in labels)) for option in ranked]
        print_table(console, "Options, longest life first", ("option", *labels), rows)
    if any(option.b10 for option in result.options):
        text = f"B10: 90 % of {B10_SAMPLES} springs drawn by the case's scatter reach this life."
        console.print(Text(text, style="dim"))
    print_findings(console, result.findings)
    console.print()
    console.print(Text(caution, style="italic"))


def _cells(option: Option) -> dict[str, str]:
    """Every line of an option's column."""
    a, j, say = option.assessment, option.assessment.judgement, option.assessment.say

    def shown(value: float | None, kind: str) -> str:
        return "-" if value is None else say(value, kind)

    codes = [finding.code for finding in a.findings if finding.level != "note"]
    cells = {
        "verdict": a.verdict,
        "life": quantity_of_life(a, j.life_passes) if j else "-",
        "damage at target": significant(j.damage_at_target, 3) if j else "-",
        "stress margin": significant(j.stress_margin, 3) if j and j.stress_margin is not None else "-",
        "margin governed by": j.margin_governed_by if j else "-",
    }
    cells |= {
        f"life by {name}": quantity_of_life(a, option.lives[name]) if name in option.lives else "withheld"
        for name in CRITERIA
    }
    b10 = option.b10
    return cells | {
        "B10 life": quantity_of_life(a, b10.value) if b10 else "-",
        "rate": shown(j.spring.rate if j else None, "rate"),
        "preload": shown(option.preload, "force"),
        "peak stress": shown(option.peak_stress, "stress"),
        "static limit": shown(j.spring.static_limit if j else None, "stress"),
        "clearance to solid": shown(option.clearance, "length"),
        "mass": shown(j.spring.mass if j else None, "mass"),
        "relative wire cost": "-" if option.relative_cost is None else significant(option.relative_cost, 3),
        "surge frequency": shown(j.spring.surge_frequency if j else None, "frequency"),
        "best on life against": " and ".join(option.best_for) or "-",
        "findings": ", ".join(codes) or "none",
    }
