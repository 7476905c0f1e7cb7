"""A scatter study for a person at a terminal: lives and failures, then what matters most, then what was assumed."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from springlife.life.scatter import CONFIDENCE, REPLICATES
from springlife.report.terminal import VERDICTS, console_for_output, print_findings, print_rows, print_table
from springlife.report.terminal import quantity_of_life as life_text
from springlife.units import significant

if TYPE_CHECKING:
    from springlife.life.scatter import Estimate, ScatterResult
    from springlife.life.spread import Spread

ASSUMED = (
    "B lives and shares rest on the distributions listed, their tails above all; the life factor, duty and damage "
    "sum are judgements unless the case gives its own. They are no test of the part."
)


def print_scatter(result: ScatterResult, caution: str) -> None:
    """Print a scatter study."""
    from rich.text import Text

    console = console_for_output()
    console.print(Text(result.case.input.title, style="bold"))
    console.print(Text(f"{result.samples} springs drawn, seed {result.seed}; intervals at {100 * CONFIDENCE:g} %."))
    console.print()
    print_rows(console, _results(result))
    stops = tuple(finding for finding in result.assessment.findings if finding.blocks)
    if stops:
        print_findings(console, stops)
    _print_sensitivities(result)
    rows = [(_words(one.name), describe(one, result), _origin(one)) for one in result.spreads]
    print_table(console, "What scatters, and by whose word", ("variable", "distribution", "source"), rows, left=3)
    print_rows(console, _notes(result), style="dim")
    console.print()
    console.print(Text(caution, style="italic"))


def _results(result: ScatterResult) -> list[tuple[str, str]]:
    """Label and sentence of each number of the study."""
    assessment, duty = result.assessment, result.case.duty
    assert assessment.judgement is not None  # the study refuses a case that was not judged
    drawn = life_text(assessment, assessment.judgement.life_passes)
    rows = [("as drawn", f"{drawn}, target {duty.target}: {VERDICTS[assessment.verdict][0].lower()}")]
    for name, life in result.b_lives.items():
        rows.append(
            (f"{name} life", f"{_life(result, life.value)} ({_life(result, life.low)} to {_life(result, life.high)})")
        )
    return [
        *rows,
        ("failing", f"{_percent(result.fails)} before the target"),
        ("yielding", f"{_percent(result.yields)} past the static limit at the greatest deflection"),
        ("solid", f"{_percent(result.solid)} pressed past solid"),
    ]


def _life(result: ScatterResult, passes: float) -> str:
    return life_text(result.assessment, passes if math.isfinite(passes) else None)


def _percent(share: Estimate) -> str:
    if share.value == 0:
        return f"none (under {significant(100 * share.high, 2)} %)"
    if share.value == 1:
        return f"all (over {significant(100 * share.low, 4)} %)"
    low, high = significant(100 * share.low, 3), significant(100 * share.high, 3)
    return f"{significant(100 * share.value, 3)} % ({low} to {high} %)"


def _print_sensitivities(result: ScatterResult) -> None:
    console = console_for_output()
    if result.no_sensitivities:
        print_rows(console, [("no ranking", result.no_sensitivities)])
        return
    rows = [
        (
            _words(one.variable),
            *(f"{_tenths(part.value)} % ± {_tenths(part.high - part.value)}" for part in (one.first, one.total)),
        )
        for one in result.sensitivities
    ]
    print_table(console, "Share of the variance of log life", ("variable", "alone", "with all it acts through"), rows)


def _tenths(share: float) -> str:
    return f"{round(100 * share, 1) + 0.0:.1f}"  # no minus before a rounded zero


def describe(spread: Spread, result: ScatterResult) -> str:
    """Say a distribution in the drawing's units."""
    if spread.name == "life":
        assert spread.log_sd is not None
        return f"factor, lognormal, sd {significant(spread.log_sd / math.log(10), 3)} of log10"
    if spread.log_sd is not None:
        cov = math.sqrt(math.expm1(spread.log_sd**2))
        median = "" if spread.centre == 1 else f", median {significant(spread.centre, 3)}"
        word = "lognormal" if spread.name == "allowed_damage" else "factor, lognormal"
        return f"{word}, cov {significant(100 * cov, 3)} %{median}"
    assert spread.half_range is not None and spread.sigmas is not None
    say = result.assessment.say
    if spread.kind == "number":
        text = f"{significant(spread.centre)} ± {significant(spread.half_range, 3)}"
    else:
        text = f"{say.number(spread.centre, spread.kind)} ± {say(spread.half_range, spread.kind, 3)}"
    return f"{text} at {spread.sigmas:g} sigma"


def _origin(spread: Spread) -> str:
    if spread.source.startswith(spread.provenance):
        return spread.source
    return f"{spread.source} ({spread.provenance})"


def _words(name: str) -> str:
    return name.replace("_", " ")


def _notes(result: ScatterResult) -> list[tuple[str, str]]:
    """Say how the numbers came about."""
    given = result.case.input.scatter
    rows = [("strengths", f"of the endurance data read as {given.strengths_are}")]
    if result.off:
        rows.append(("held", ", ".join(_words(name) for name in result.off)))
    if result.cells < result.distinct_cycles:
        error = f"{significant(100 * result.cell_error, 2)} %"
        rows.append(("cycles", f"{result.distinct_cycles} distinct cycles in {result.cells}: damage within {error}"))
    if result.pairing_held:
        rows.append(("pairing", "cycles between events measured differently stay paired as for the drawn spring"))
    rows.append(("drawn by", f"{REPLICATES} independently scrambled Sobol sets; their differences make the intervals"))
    return [*rows, ("read as", ASSUMED)]
