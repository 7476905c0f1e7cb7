"""The figure of a cam's speeds: stress of the worst coil over turns a minute."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from springlife.report.style import ACCENT, GREY, INK, PALE, axes_in_style, drawable
from springlife.units import convert

if TYPE_CHECKING:
    from matplotlib.figure import Figure

    from springlife.life.surge import SurgeResult

ORDERS = 30  # harmonics of the turning speed that are marked where they meet the first surge frequency


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
            f"speed of {drawable(sweep.name)}, turns a minute; numbers: harmonic that meets the first surge frequency"
        )
        axes.set_ylabel(f"shear stress, {unit}")
        axes.legend(frameon=False, loc="lower left", bbox_to_anchor=(0.02, 0.18))
    return figure
