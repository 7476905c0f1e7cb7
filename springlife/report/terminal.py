"""Results for a person at a terminal: verdict first, then what it rests on.

Text from a case is printed as text, never as markup; colour only where a terminal shows it.
"""

from __future__ import annotations

import os
import sys
from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING, Any

from springlife.life.limits import LIMITS
from springlife.units import METRIC, significant

if TYPE_CHECKING:
    from rich.console import Console

    from springlife.life.assess import Assessment, Judgement
    from springlife.life.band import BandRow
    from springlife.life.check import CheckResult
    from springlife.life.findings import Finding
    from springlife.life.tally import Tally
    from springlife.life.verify import Verification
    from springlife.spring.grade import Grade

# Words and weight carry the meaning; colour only repeats it.
VERDICTS = {
    "meets": ("MEETS THE TARGET", "bold green"),
    "falls short": ("FALLS SHORT OF THE TARGET", "bold red"),
    "withheld": ("JUDGEMENT WITHHELD", "bold red"),
}
LEVEL_STYLE = {"stop": "bold red", "warn": "yellow", "note": ""}
PIPED_WIDTH = 100
BEYOND = 1e5  # targets: a longer life is a number without meaning


def console_for_output() -> Console:
    """Make a console: the terminal's width, or a page's when piped; no colour then, and none with NO_COLOR."""
    from rich.console import Console

    piped = not sys.stdout.isatty() and "COLUMNS" not in os.environ

    class Plain(Console):
        """A console that leaves a reader gone away to the caller."""

        def on_broken_pipe(self) -> None:
            raise BrokenPipeError

    return Plain(highlight=False, markup=False, emoji=False, width=PIPED_WIDTH if piped else None)


def print_rows(console: Console, rows: Iterable[tuple[str, str]], style: str = "bold") -> None:
    """Print label and text in two columns; the text wraps under itself."""
    from rich.table import Table
    from rich.text import Text

    table = Table.grid(padding=(0, 2))
    table.add_column(no_wrap=True)
    table.add_column(ratio=1)
    for label, text in rows:
        table.add_row(Text(label, style=style), Text(text))
    console.print(table)


def print_table(
    console: Console, title: str, heads: Sequence[str], rows: Iterable[Sequence[str]], left: int = 1
) -> None:
    """Print a plain table: the first ``left`` columns flush left, numbers flush right."""
    from rich.table import Table
    from rich.text import Text

    table = Table(box=None, padding=(0, 2, 0, 0), title=None, show_edge=False, header_style="dim")
    for number, head in enumerate(heads):
        table.add_column(head, justify="left" if number < left else "right", overflow="fold")
    for row in rows:
        table.add_row(*(Text(cell) for cell in row))
    console.print()
    console.print(Text(title, style="bold"))
    console.print(table)


def print_assessment(result: Assessment, caution: str, beneath: str = "") -> None:
    """Print a judged case; ``beneath`` stands right under the verdict."""
    from rich.text import Text

    console = console_for_output()
    text, style = VERDICTS[result.verdict]
    console.print(Text(text, style=style))
    if beneath:
        console.print(Text(beneath, style="bold"))
    given = result.case.input
    console.print(Text(" · ".join(part for part in (given.title, given.part, given.revision) if part)))
    console.print()
    if result.judgement:
        print_rows(console, _summary(result, result.judgement))
    print_findings(console, result.findings)
    if result.judgement:
        _print_events(console, result.judgement)
        _print_factors(console, result.judgement)
        _print_band(console, result)
    console.print()
    console.print(Text(caution, style="italic"))


def quantity_of_life(result: Assessment, passes: float | None) -> str:
    """Write a number of passes in the target's own unit; digits end where the methods have none."""
    if passes is None:
        return "unlimited"
    if passes > BEYOND * result.case.duty.target_passes:
        return f"over {significant(BEYOND)} targets"
    number, unit = result.target
    return f"{significant(passes * number / result.case.duty.target_passes, 3)} {unit}"


def _summary(result: Assessment, j: Judgement) -> list[tuple[str, str]]:
    """Label and sentence of each line under the verdict."""
    case, say = result.case, result.say
    spring, curve = j.spring, j.model.curve
    passes = case.duty.target_passes
    margin = "none: the duty puts no stress on the spring"
    if j.stress_margin is not None:
        margin = f"{significant(j.stress_margin, 3)} on every stress ({j.margin_governed_by} governs)"
    return [
        ("life", f"{quantity_of_life(result, j.life_passes)}, target {case.duty.target} "
                 f"({significant(passes)} passes of {case.duty.one_pass})"
                 + (f"; extrapolated past the {significant(curve.valid_to)} cycles of the data"
                    if j.extrapolated else "")),
        ("damage", f"{significant(j.damage_at_target, 3)} at the target, {case.judge.allowed_damage:g} allowed; "
                   f"{significant(j.damage_per_pass, 3)} a pass"),
        ("margin", margin),
        ("governs", _governing(result, j)),
        ("strength", f"{spring.grade.title}: Sut {say(spring.Sut, 'stress')}, Ssu {say(spring.Ssu, 'stress')}, "
                     f"static limit {say(spring.static_limit, 'stress')}"),
        ("", f"{case.judge.endurance} {'peened' if spring.shot_peened else 'unpeened'} by {case.judge.criterion}: "
             f"Sse {say(curve.strength_at_knee, 'stress')} at {significant(curve.knee)} cycles, "
             f"slope {significant(curve.slope, 3)}, Miner {case.judge.miner}"),
        ("spring", f"C {significant(spring.index, 3)}, {significant(spring.active_coils)} active coils, "
                   f"rate {say(spring.rate, 'rate')}, solid at {say(spring.solid_deflection, 'length')}, "
                   f"surge {say(spring.surge_frequency, 'frequency', 3)}"),
        ("stress", f"{case.judge.stress_factor} factor on "
                   f"{'mean and amplitude' if case.judge.curvature_on == 'both' else 'the amplitude'}; "
                   f"residue: {case.judge.residue}"),
        ("counted", _how_counted(result)),
        *([("limits", _changed_limits(result))] if case.input.limits else []),
        ("reliability", result.reliability),
    ]  # fmt: skip


def _changed_limits(result: Assessment) -> str:
    """Name the thresholds that the case set itself."""
    changed = (f"{key} {value:g} for {LIMITS[key].value:g}" for key, value in result.case.input.limits.items())
    return f"set by the case: {', '.join(changed)}"


def _how_counted(result: Assessment) -> str:
    """Say whether every cycle was kept as it was."""
    assert result.duty is not None
    coarse = [event.name for event in result.duty.events if not event.count.exact]
    if not coarse:
        return "every cycle exactly"
    return f"{', '.join(coarse)}: too many distinct cycles, kept in cells with their mean ends; extremes exact"


def _governing(result: Assessment, j: Judgement) -> str:
    """Say which event and cycle carry the largest share of the damage."""
    if j.worst is None:
        return "nothing: the duty has no cycle"
    say, worst = result.say, j.worst
    place = f"{say(worst.low, 'length')} to {say(worst.high, 'length')}"
    stresses = f"{say(worst.tau_a, 'stress')} about {say(worst.tau_m, 'stress')}"
    life = "no damage" if worst.cycles_to_failure == float("inf") else (
        f"fails after {significant(worst.cycles_to_failure, 3)} such cycles"
    )  # fmt: skip
    event = max(j.events, key=lambda event: event.share)
    head = f"{event.name!r} with {100 * event.share:.0f} % of the damage; " if event.share > 0 else ""
    between = "" if worst.events[0] == worst.events[1] else f" (from {worst.events[0]!r} to {worst.events[1]!r})"
    return f"{head}worst cycle {place}{between}: {stresses}, {life}"


def print_findings(console: Console, findings: Sequence[Finding]) -> None:
    """Print findings, stops first, each with what to do."""
    from rich.table import Table
    from rich.text import Text

    if not findings:
        return
    table = Table.grid(padding=(0, 2))
    table.add_column(no_wrap=True)
    table.add_column(ratio=1)
    for finding in findings:
        text = Text(f"{finding.code}: ", style="bold").append(finding.message, style="not bold")
        if finding.waived_by is not None:
            text.append(f" [waived by {finding.waived_by}: {finding.reason}]", style="not bold")
        elif finding.level != "note":
            text.append(f"; {finding.remedy}", style="not bold")
        table.add_row(Text(finding.level, style=LEVEL_STYLE[finding.level]), text)
    console.print()
    console.print(Text("Findings", style="bold"))
    console.print(table)


def _print_events(console: Console, j: Judgement) -> None:
    rows = [
        (e.name, str(e.repeats), significant(e.cycles), significant(e.damage, 3), f"{100 * e.share:.1f} %")
        for e in j.events
    ]
    print_table(console, "One pass", ("event", "repeats", "cycles", "damage", "share"), rows)


def _print_factors(console: Console, j: Judgement) -> None:
    if j.safety_factors is None or j.factors_fixed_preload is None:
        return

    def cell(value: float | None) -> str:
        return "-" if value is None else significant(value, 3)

    rows = [
        (name.replace("_", "-"), cell(value), cell(j.factors_fixed_preload[name]))
        for name, value in j.safety_factors.items()
    ]
    heads = ("criterion", "proportional", "preload held")
    print_table(console, "Safety factors of the constant-amplitude duty", heads, rows)


def _print_band(console: Console, result: Assessment) -> None:
    """Print the band of lives: a row a basis and Miner reading, a column a criterion."""
    assert result.judgement is not None
    band = result.judgement.band
    criteria = list(dict.fromkeys(row.criterion for row in band))
    lines: dict[tuple[str, str], dict[str, BandRow]] = {}
    for row in band:
        lines.setdefault((row.endurance, row.miner), {})[row.criterion] = row
    rows = [
        (basis, miner, *(_band_cell(result, cells[name]) for name in criteria))
        for (basis, miner), cells in lines.items()
        if not all(cell.withheld for cell in cells.values())
    ]
    title = "Life under every published choice"
    print_table(console, title, ("endurance", "Miner", *criteria), rows, left=2)
    if result.mover:
        print_rows(console, [("", f"One choice changed at a time, {result.mover.sentence()}.")])
    reasons = dict.fromkeys(row.withheld for row in band if row.withheld)
    if reasons:
        print_rows(console, [("withheld", reason or "") for reason in reasons], style="dim")


def _band_cell(result: Assessment, row: BandRow) -> str:
    return "withheld" if row.withheld else quantity_of_life(result, row.life_passes)


def print_check(result: CheckResult) -> None:
    """Print what a case names, read but not judged."""
    from rich.text import Text

    console = console_for_output()
    console.print(Text(result.title, style="bold"))
    for heading, rows in result.sections:
        console.print()
        console.print(Text(heading, style="bold"))
        print_rows(console, rows, style="")
    print_findings(console, result.findings)


def print_tally(result: Tally, top: int) -> None:
    """Print a counted record: the largest ranges first."""
    console = console_for_output()
    print_rows(console, result.lines())
    table = result.table
    shown = len(table) if top == 0 else min(top, len(table))
    heads = tuple(f"{name} {result.unit}".strip() for name in ("range", "mean", "low", "high"))
    rows: list[Sequence[Any]] = [
        (*(significant(float(row[key]), 5) for key in ("range", "mean", "low", "high")), f"{row['count']:g}")
        for row in table[:shown]
    ]
    print_table(console, f"Cycles, largest first ({shown} of {len(table)} rows)", (*heads, "count"), rows, left=0)


def print_grades(grades: Sequence[Grade], *, full: bool) -> None:
    """Print wire grades as a table, or one of them in full."""
    console = console_for_output()
    rows = []
    for entry in grades:
        low, high = entry.diameter_range
        rows.append(
            (
                entry.name,
                entry.title,
                f"{METRIC.number(low, 'length', 5)} to {METRIC.number(high, 'length', 5)}",
                f"{METRIC.number(entry.tensile_strength(high), 'stress')} to "
                f"{METRIC.number(entry.tensile_strength(low), 'stress')}",
                METRIC.number(entry.greatest_temperature, "temperature", 3),
            )
        )
    heads = ("grade", "wire", "diameter mm", "Sut MPa", "to degC")
    print_table(console, "Wire grades", heads, rows, left=2)
    if full:
        for entry in grades:
            print_rows(console, [("", line) for line in entry.describe()])


def print_verification(result: Verification) -> None:
    """Print every published answer beside ours, then what agrees."""
    console = console_for_output()
    rows = [
        (
            row.check.id,
            row.answer.name,
            row.answer.text,
            significant(row.ours, 6),
            "agrees" if row.agrees else "DIFFERS",
        )
        for row in result.rows
    ]
    print_table(console, "Published examples", ("example", "quantity", "printed", "here", ""), rows, left=2)
    agreeing = sum(row.agrees for row in result.rows)
    recounts = f"{result.recounts_agree} of {result.recounted} random histories recounted by the rainflow package agree"
    print_rows(console, [("", f"{agreeing} of {len(rows)} printed answers agree; {recounts}.")])
