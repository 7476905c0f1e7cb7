"""Sections of the report on the studies that are asked for: scatter, rig test, surge."""

from __future__ import annotations

import math
from functools import partial
from typing import TYPE_CHECKING

from springlife.life.scatter import CONFIDENCE
from springlife.report.blocks import Block, Figure, Section, Table, Text, rows
from springlife.report.figures_rig import rig_cycles
from springlife.report.figures_scatter import tornado
from springlife.report.figures_speed import cam_speeds
from springlife.report.figures_surge import along_the_wire, coil_stress
from springlife.report.scatter_text import describe
from springlife.report.surge_text import READ_AS
from springlife.report.terminal import quantity_of_life
from springlife.units import significant

if TYPE_CHECKING:
    from springlife.life.rig import RigTest
    from springlife.life.scatter import Estimate, ScatterResult
    from springlife.life.surge import EventSurge, SurgeResult


def scatter(study: ScatterResult) -> Section:
    """B lives, failures, what matters most."""
    a = study.assessment

    def life(passes: float) -> str:
        return quantity_of_life(a, passes if math.isfinite(passes) else None)

    text = (
        f"{study.samples} springs drawn, seed {study.seed}; intervals at {100 * CONFIDENCE:g} %. The strengths of the "
        f"endurance data are read as {study.case.input.scatter.strengths_are}."
    )
    lives = Table(
        "Lives",
        ("life", "value", "from", "to"),
        tuple((name, life(one.value), life(one.low), life(one.high)) for name, one in study.b_lives.items()),
    )
    shares = rows(
        [
            ("fail before the target", _percent(study.fails)),
            ("past the static limit", _percent(study.yields)),
            ("pressed past solid", _percent(study.solid)),
            ("held fixed", ", ".join(name.replace("_", " ") for name in study.off)),
        ]
    )
    spreads = Table(
        "What scatters, and by whose word",
        ("variable", "distribution", "source"),
        tuple((one.name.replace("_", " "), describe(one, study), f"{one.source} ({one.provenance})")
              for one in study.spreads),
        align="lllr",
    )  # fmt: skip
    blocks: list[Block] = [Text(text), lives, shares, spreads]
    if study.no_sensitivities:
        blocks.append(Text(f"No ranking of what matters most: {study.no_sensitivities}."))
    else:
        ranked = ", ".join(
            f"{one.variable.replace('_', ' ')} {significant(100 * one.total.value, 2)} %"
            for one in study.sensitivities[:5]
        )
        blocks.append(
            Figure("tornado", "What matters most for life.", f"Shares of the variance of log life: {ranked}.",
                   lambda: tornado(study))
        )  # fmt: skip
    return Section("Scatter", tuple(blocks))


def _percent(share: Estimate) -> str:
    low, high = significant(100 * share.low, 3), significant(100 * share.high, 3)
    return f"{significant(100 * share.value, 3)} % ({low} to {high} %)"


def rig(test: RigTest) -> Section:
    """A constant-amplitude test with the duty's damage."""
    say, j = test.assessment.say, test.judgement
    tau_a, tau_m = (float(stress) for stress in j.model.stress.cycles(test.low, test.high))
    lines = [
        ("deflection", f"{say(test.low, 'length')} to {say(test.high, 'length')}"),
        ("stress", f"{say(tau_a, 'stress')} about {say(tau_m, 'stress')}"),
        ("cycles", f"{test.cycles}, {significant(test.hours, 3)} h at {significant(test.frequency, 3)} Hz"),
        ("springs", f"{test.springs}, all of which must survive, to show {100 * test.reliability:g} % reliability at "
                    f"{100 * test.confidence:g} % confidence"),
    ]  # fmt: skip
    spread = Table(
        "Cycles of equal damage under every published choice",
        ("endurance", "Miner", "criterion", "cycles"),
        tuple(
            (row.endurance, row.miner, row.criterion, "none" if cycles is None else significant(cycles, 3))
            for row, cycles in test.spread
        ),
        align="lllr",
    )
    notes = [Text(f"{finding.level}: {finding.message}.") for finding in test.findings]
    caption = "Cycles with the duty's damage over the test's deflection."
    alt = "Cycles of equal damage over greatest deflection, by criterion."
    figure = Figure("rig", caption, alt, lambda: rig_cycles(test))
    return Section("Rig test with the duty's damage", (rows(lines), *notes, spread, figure))


def surge(study: SurgeResult) -> Section:
    """Lives with the wave in the coils beside the static one."""
    a, static = study.assessment, study.static.damage_per_pass
    lives = Table(
        "Lives with the wave",
        ("damping ratio", "life of the worst coil", "damage a pass", "times static", "coil"),
        tuple(
            (f"{one.zeta:g}", quantity_of_life(a, one.judgement.life_passes),
             significant(float(one.damage[one.worst]), 3),
             f"{significant(float(one.damage[one.worst]) / static, 3)}" if static > 0 else "-",
             significant(study.coil(one.worst), 2))
            for one in study.dampings
        ),
    )  # fmt: skip
    events = Table("Events", ("event", "times static", "coil", "gap closed", "lift-off"),
                   tuple(_surge_event(study, event) for event in study.events))  # fmt: skip
    lines = rows(
        [
            ("verdict with the wave", study.verdict),
            ("static life", quantity_of_life(a, study.static.life_passes)),
            ("first natural frequency", f"{significant(study.wave.first_frequency)} Hz"),
            ("read as", READ_AS),
        ]
    )
    blocks: list[Block] = [lines, lives, events, *(Text(f"{warning}.") for warning in study.warnings)]
    moving = [event for event in study.events if event.slow is None]
    if moving:
        blocks.append(
            Figure("along-the-wire", "Range of deflection along the wire, over that of the record.",
                   "Range of each coil over that of the record, from the fixed to the moving end.",
                   lambda: along_the_wire(study))
        )  # fmt: skip
        blocks.append(
            Figure("coil-stress", "Stress and damage along the coils, for the event that the wave moves most.",
                   "Least and greatest stress of every coil with the wave and without.", lambda: coil_stress(study))
        )  # fmt: skip
    for number, sweep in enumerate(study.cams):
        blocks.append(
            Figure(f"cam-{number + 1}", f"Stress of the worst coil over the speed of {sweep.name}.",
                   f"Least and greatest stress over turns a minute of {sweep.name}.",
                   partial(cam_speeds, study, number))
        )  # fmt: skip
    return Section("Surge: the wave in the coils", tuple(blocks))


def _surge_event(study: SurgeResult, event: EventSurge) -> tuple[str, ...]:
    if event.slow:
        return event.name, "slow", "-", "-", "-"
    shares = [f"{significant(100 * share, 2)} %" if share else "no" for share in (event.closed, event.lifted)]
    return event.name, significant(event.amplification), significant(study.coil(event.worst), 2), *shares
