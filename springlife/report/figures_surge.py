"""The wave in the coils: how much more each coil moves than the record says, and what stress that makes."""

from __future__ import annotations

from typing import TYPE_CHECKING

from springlife.report.style import ACCENT, GREY, INK, PALE, SIZE, axes_in_style, drawable
from springlife.units import convert

if TYPE_CHECKING:
    from matplotlib.figure import Figure

    from springlife.life.surge import SurgeResult

MOST = 6  # events drawn: those whose coils move most
PATTERNS = ("-", (0, (6, 2)), (0, (6, 2, 1, 2)), (0, (1, 1.6)), (0, (3, 1.5)), (0, (8, 3, 2, 3)))


def coil_stress(result: SurgeResult) -> Figure:
    """Draw least and greatest stress of every coil, with the wave and without, and the damage a pass.

    The event with the greatest amplification is shown; the damage is that of the whole pass.
    """
    event = max(result.events, key=lambda one: one.amplification)
    j, say = result.static, result.assessment.say
    unit = say.units["stress"]
    scale = convert(1.0, unit, "stress")
    coils = result.positions * j.spring.active_coils
    low, high = (scale * j.model.stress.of_deflection(ends) for ends in (event.low, event.high))
    still = [scale * float(j.model.stress.of_deflection(end)) for end in (event.static_low, event.static_high)]
    with axes_in_style() as (figure, axes):
        axes.fill_between(coils, low, high, color=PALE, label="with the wave")
        axes.plot(coils, low, color=INK, linewidth=1.2)
        axes.plot(coils, high, color=INK, linewidth=1.2)
        for number, level in enumerate(still):
            label = "without" if number == 0 else None
            axes.axhline(level, color=GREY, linestyle=(0, (6, 2)), linewidth=1.2, label=label)
        axes.axhline(
            scale * j.spring.static_limit, color=GREY, linestyle=(0, (1, 2)), linewidth=1.2, label="static limit"
        )
        axes.set_xlabel("active coil, from the fixed end")
        axes.set_ylabel(f"least and greatest shear stress, {unit}")
        axes.set_ylim(bottom=0, top=1.45 * max(float(high.max()), scale * j.spring.static_limit))
        beside = axes.twinx()
        beside.spines["top"].set_visible(False)
        beside.plot(coils, result.nominal.damage, color=ACCENT, linewidth=1.6, linestyle=(0, (4, 1, 1, 1)))
        beside.set_yscale("log")
        beside.set_ylabel(f"damage a pass (without the wave {j.damage_per_pass:.2g})", color=ACCENT)
        axes.legend(
            frameon=False, loc="upper center", ncols=3, title=f"event: {drawable(event.name)}", title_fontsize=8
        )
    return figure


def along_the_wire(study: SurgeResult) -> Figure:
    """Draw each place's range of deflection with the wave over that of the record, for every event that moves."""
    moving = [event for event in study.events if event.slow is None and event.static_high > event.static_low]
    moving = sorted(moving, key=lambda event: -event.amplification)[:MOST]
    coils = study.positions * study.static.spring.active_coils
    with axes_in_style((SIZE[0], 3.2)) as (figure, axes):
        for number, event in enumerate(moving):
            ratio = (event.high - event.low) / (event.static_high - event.static_low)
            axes.plot(coils, ratio, color=INK if number else ACCENT, linestyle=PATTERNS[number],
                      label=drawable(event.name))  # fmt: skip
        axes.axhline(1.0, color=GREY, linewidth=0.8, linestyle=(0, (3, 3)))
        axes.set_ylim(bottom=0)
        axes.set_xlabel("active coils from the fixed end")
        axes.set_ylabel("range with the wave, times static")
        if moving:
            axes.legend(frameon=False)
    return figure
