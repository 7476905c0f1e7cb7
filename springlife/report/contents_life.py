"""Sections of the report on counting, damage, the band of lives and the optional studies."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from springlife.life.assess import judge as judge_again
from springlife.report import figures_band, figures_counts, figures_damage, worked_numbers
from springlife.report.blocks import Block, Figure, Section, Table, Text, rows
from springlife.report.figures_options import options_haigh
from springlife.report.recount import recounted
from springlife.report.terminal import quantity_of_life
from springlife.strength.criteria import CRITERIA
from springlife.units import significant

if TYPE_CHECKING:
    from springlife.life.assess import Assessment, Judgement
    from springlife.life.compare import Comparison, Option

RESIDUES = {
    "repeat": "the pass recurs, the residue closes on itself",
    "half": "the life happens once, residue as half cycles",
    "drop": "the residue is left out",
}


def counting(result: Assessment, j: Judgement) -> Section:
    """Settings, the count by range, what the residue does, the independent recount."""
    judge, unit = result.case.judge, result.say.units["length"]
    total = j.damage_per_pass
    count_table = Table(
        "Counted cycles of one pass by range",
        (f"range from, {unit}", f"to, {unit}", "cycles a pass", "damage a pass", "share of the damage"),
        tuple(
            (result.say.number(low, "length"), result.say.number(high, "length"), significant(count),
             significant(damage, 3), f"{100 * damage / total:.1f} %" if 0 < total < np.inf else "-")
            for low, high, count, damage in figures_damage.range_classes(j)
        ),
        align="r",
        empty="the duty has no cycle",
    )  # fmt: skip
    text = (
        "Rainflow counting (ASTM E1049-85, 5.4.4) in deflection. Events and passes are counted in sequence, with the "
        f"cycles that span them; residue: {judge.residue}, {RESIDUES[judge.residue]}. No gate: every cycle counts."
    )
    residue = Table(
        "What the reading of the residue does",
        ("residue", "meaning", "damage at the target", "life"),
        tuple(_residue_row(result, name) for name in RESIDUES),
        align="llr",
    )
    recount = Table(
        "Recount of one occurrence of each record by the rainflow package",
        ("event", "outcome"),
        tuple(recounted(result)),
        align="llr",
        empty="the duty has no record",
    )
    cycles = significant(float(j.cycles.count.sum()))
    figures = (
        Figure("from-to", "Cycles a pass by their lower and upper end.",
               f"Matrix of {cycles} cycles a pass by lower and upper deflection.",
               lambda: figures_counts.from_to(result)),
        Figure("exceedance", "Ranges and how many cycles a pass reach them.",
               "Range of deflection over the number of cycles with at least that range.",
               lambda: figures_counts.exceedance(result)),
        Figure("crossings", "Levels and how often a pass rises through them.",
               "Deflection over the number of rises through it.", lambda: figures_counts.crossings(result)),
    )  # fmt: skip
    return Section("Counting", (Text(text), count_table, residue, recount, *figures))


def _residue_row(result: Assessment, name: str) -> tuple[str, str, str, str]:
    """Judge the same counts with another reading of the residue."""
    assert result.duty is not None
    again = result
    if name != result.case.judge.residue:
        again = judge_again(result.case.varied(result.case.name, {}, {"residue": name}, ""), result.duty)
    j = again.judgement
    if j is None:
        return name, RESIDUES[name], "-", "-"
    return name, RESIDUES[name], significant(j.damage_at_target, 3), quantity_of_life(again, j.life_passes)


def damage(result: Assessment, j: Judgement) -> Section:
    """From cycles to damage to life."""
    judge = result.case.judge
    lines = [
        ("damage a pass", f"{significant(j.damage_per_pass, 4)} in the steady state, all cycles summed"),
        ("damage at the target", f"{significant(j.damage_at_target, 3)}; {judge.allowed_damage:g} allowed"),
        ("life", quantity_of_life(result, j.life_passes)
         + ("; extrapolated past the cycles that the endurance data reach" if j.extrapolated else "")),
        ("damaging cycles", f"{significant(j.damaging_cycles)} a pass do 99 % of the damage"),
    ]  # fmt: skip
    blocks: list[Block] = [rows(lines), *worked_numbers.of_damage(result, j)]
    if j.safety_factors is not None and j.factors_fixed_preload is not None:
        cells = tuple(
            (name.replace("_", "-"), _factor(value), _factor(j.factors_fixed_preload[name]))
            for name, value in j.safety_factors.items()
        )
        heads = ("criterion", "proportional", "preload held")
        blocks.append(Table("Safety factors of the constant-amplitude duty", heads, cells))
    by_event = ", ".join(f"{event.name} {100 * event.share:.1f} %" for event in j.events[:12])
    blocks += [
        Figure("life-curve", "The life curve, the duty's cycles to the target, and the damage by decade of life.",
               f"Life curve with knee {result.say(j.model.curve.strength_at_knee, 'stress')} at "
               f"{significant(j.model.curve.knee)} cycles, and the duty's cycles.",
               lambda: figures_damage.life_curve(result)),
        Figure("by-event", "Share of damage and cycles by event.", f"Shares of the damage: {by_event}.",
               lambda: figures_damage.by_event(result)),
        Figure("by-range", "Cycles and damage by range.", "Cycles a pass and share of the damage by range.",
               lambda: figures_damage.by_range(result)),
    ]  # fmt: skip
    return Section("Damage and life", tuple(blocks))


def _factor(value: float | None) -> str:
    return "-" if value is None else significant(value, 3)


def band(result: Assessment, j: Judgement) -> Section:
    """The life under every published choice."""
    criteria = list(CRITERIA)
    cells: dict[tuple[str, str], dict[str, str]] = {}
    for row in j.band:
        life = "withheld" if row.withheld else quantity_of_life(result, row.life_passes)
        cells.setdefault((row.endurance, row.miner), {})[row.criterion] = life
    table = Table(
        "Life under every published choice",
        ("endurance", "Miner", *criteria),
        tuple((*key, *(lives[name] for name in criteria)) for key, lives in cells.items()),
        align="llr",
    )
    blocks: list[Block] = [table]
    if result.mover:
        blocks.append(Text(f"One choice changed at a time, {result.mover.sentence()}."))
    blocks += [Text(f"Withheld: {why}.") for why in dict.fromkeys(row.withheld for row in j.band) if why]
    blocks.append(
        Figure("life-band", "Life under every published choice; ringed: the one chosen.",
               "Lives by criterion, endurance basis and Miner reading, with the target.",
               lambda: figures_band.life_band(result))
    )  # fmt: skip
    return Section("How far the life moves with the method", tuple(blocks))


def options(comparison: Comparison) -> Section:
    """The drawn spring and its alternatives."""
    heads = ("option", "verdict", "life", "damage at target", "margin", "B10 life", "mass", "findings")
    table = Table(
        f"Options; held: {comparison.hold}", heads, tuple(_option(one) for one in comparison.options), align="llrrrrrl"
    )
    blocks: list[Block] = [Text(f"Held: {comparison.held}."), table]
    blocks += [Text(f"{finding.message}; {finding.remedy}.") for finding in comparison.findings]
    if any(one.assessment.judgement for one in comparison.options):
        names = ", ".join(option.name for option in comparison.options[:8])
        blocks.append(
            Figure("options", "Options on one Haigh diagram.", f"Lines and governing cycles of the options {names}.",
                   lambda: options_haigh(comparison))
        )  # fmt: skip
    return Section("Options", tuple(blocks))


def _option(one: Option) -> tuple[str, ...]:
    a, j = one.assessment, one.assessment.judgement
    codes = ", ".join(dict.fromkeys(f.code for f in a.findings if f.level != "note" and f.waived_by is None)) or "none"
    if j is None:
        return one.name, a.verdict, "-", "-", "-", "-", "-", codes
    return (
        one.name,
        a.verdict,
        quantity_of_life(a, j.life_passes),
        significant(j.damage_at_target, 3),
        "-" if j.stress_margin is None else significant(j.stress_margin, 3),
        quantity_of_life(a, one.b10.value if one.b10.value < np.inf else None) if one.b10 else "-",
        a.say(j.spring.mass, "mass"),
        codes,
    )
