"""Figures of a spring that moves fast: stress along the coils, and stress over the speed of a cam."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from springlife.report.style import ACCENT, GREY, INK, PALE, axes_in_style
from springlife.units import convert

if TYPE_CHECKING:
    from matplotlib.figure import Figure

    from springlife.life.surge import SurgeResult

ORDERS = 30  # harmonics of the turning speed that are marked where they meet the first surge frequency


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
        axes.legend(frameon=False, loc="upper center", ncols=3, title=f"event: {event.name}", title_fontsize=8)
    return figure


def cam_speeds(result: SurgeResult, cam: int = 0) -> Figure:
    """Draw least and greatest stress of the worst coil over the speed of a cam; the speeds to avoid are its peaks.

    Thin lines mark where a harmonic of the speed meets the first surge frequency.

    Raises
    ------
    ValueError
        When the case has no such cam.
    """
    if not result.cams[cam : cam + 1]:
        raise ValueError("the case has no cam, so there is no speed to draw over")
    sweep = result.cams[cam]
    j, say = result.static, result.assessment.say
    unit = say.units["stress"]
    scale = convert(1.0, unit, "stress")
    speeds = np.array([one.turns_per_minute for one in sweep.speeds])
    low = scale * j.model.stress.of_deflection(np.array([one.low for one in sweep.speeds]))
    high = scale * j.model.stress.of_deflection(np.array([one.high for one in sweep.speeds]))
    with axes_in_style() as (figure, axes):
        axes.fill_between(speeds, low, high, color=PALE)
        axes.plot(speeds, high, color=INK, linewidth=1.6, marker="o", markersize=3, label="greatest, worst coil")
        axes.plot(speeds, low, color=INK, linewidth=1.6, marker="s", markersize=3, label="least, worst coil")
        axes.axhline(
            scale * j.spring.static_limit, color=GREY, linestyle=(0, (1, 2)), linewidth=1.2, label="static limit"
        )
        top = 1.35 * max(float(high.max()), scale * j.spring.static_limit)
        axes.set_ylim(0, top)
        if speeds.size > 1:
            axes.set_xlim(speeds.min(), speeds.max())
        free = np.inf  # the speed left of which a number still finds room
        for order in range(1, ORDERS + 1):
            meets = 60 * result.wave.first_frequency / order
            if speeds.min() <= meets <= min(speeds.max(), free):
                free = meets - 0.03 * float(np.ptp(speeds))
                axes.axvline(meets, color=ACCENT, linewidth=0.6, alpha=0.6)
                axes.annotate(
                    str(order), (meets, 0.955 * top), color=ACCENT, fontsize=7, ha="center", annotation_clip=True
                )
        axes.set_xlabel(
            f"speed of {sweep.name}, turns a minute; numbers: harmonic that meets the first surge frequency"
        )
        axes.set_ylabel(f"shear stress, {unit}")
        axes.legend(frameon=False, loc="lower left", bbox_to_anchor=(0.02, 0.18))
    return figure
