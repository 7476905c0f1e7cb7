"""A fit of own tests for a person at a terminal."""

from __future__ import annotations

from typing import TYPE_CHECKING

from springlife.report.terminal import console_for_output, print_rows, print_table
from springlife.units import METRIC, significant

if TYPE_CHECKING:
    from springlife.life.fitting import OwnFit


def print_fit(result: OwnFit, caution: str) -> None:
    """Print each group's line with its intervals, then whether the groups differ."""
    from rich.text import Text

    console = console_for_output()
    tests = result.tests
    print_rows(
        console,
        [
            ("tests", f"{tests.path.name}, {len(tests.cycles)} springs, {int((~tests.failed).sum())} run-outs"),
            ("wire", f"{result.wire}: Sut {METRIC(result.Sut, 'stress')}, Ssu {METRIC(result.Ssu, 'stress')}"),
            ("amplitudes", f"made fully reversed by {result.fit.criterion}"),
        ],
    )
    _print_lines(console, result)
    for line in result.fit.lines:
        points = result.design_points(line.group)
        shown = [points[0], points[len(points) // 2], points[-1]]
        rows = [
            (
                METRIC.number(S, "stress"),
                significant(float(line.life(S)), 3),
                significant(N, 3),
                *(significant(end, 3) for end in _interval(result, line.group, S)),
            )
            for N, S in shown
        ]
        share = f"{100 * result.reliability:g} % at {100 * result.confidence:g} % confidence"
        heads = ("amplitude MPa", "median life", f"design life, {share}", "median from", "to")
        print_table(console, f"Group {line.group!r}", heads, rows, left=0)
    if result.fit.comparisons:
        rows = [
            (c.question, significant(c.statistic, 3), str(c.dof), significant(c.p_value, 2))
            for c in result.fit.comparisons
        ]
        print_table(console, "Do the groups differ? (likelihood-ratio tests)", ("question", "2 dL", "dof", "p"), rows)
    print_rows(console, [("note", note) for note in result.fit.notes])
    console.print()
    console.print(Text(caution, style="italic"))


def _interval(result: OwnFit, group: str, amplitude: float) -> tuple[float, float]:
    line = next(line for line in result.fit.lines if line.group == group)
    estimate = line.estimate(amplitude, 0.5, result.confidence)
    return estimate.low, estimate.high


def _print_lines(console: object, result: OwnFit) -> None:
    rows = []
    for line in result.fit.lines:
        low, high = line.slope_interval(result.confidence)
        least, most = line.scatter_interval(result.confidence)
        rows.append(
            (
                line.group,
                f"{line.failures} + {line.run_outs}",
                f"{significant(line.slope, 3)} ({significant(low, 3)} to {significant(high, 3)})",
                f"{significant(line.s, 2)} ({significant(least, 2)} to {significant(most, 2)})",
                f"{METRIC.number(line.amplitudes[0], 'stress', 3)} to {METRIC.number(line.amplitudes[1], 'stress', 3)}",
            )
        )
    heads = ("group", "failed + run-out", "slope k (interval)", "sd of log10 N (interval)", "tested MPa")
    print_table(console, "Basquin lines by maximum likelihood", heads, rows)  # type: ignore[arg-type]
