"""The figure of a sizing, in the style of the other figures."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from springlife.report.style import ACCENT, GREY, INK, axes_in_style
from springlife.units import convert

if TYPE_CHECKING:
    from matplotlib.figure import Figure

    from springlife.life.size import Sizing
    from springlife.life.size_table import Candidate


DRAWN = 2000  # points of the cloud at most, every so-manieth of the grid


def life_over_mass(result: Sizing) -> Figure:
    """Draw life over mass of the springs that pass every static check; those offered and the best marked.

    Raises
    ------
    ValueError
        When no spring meets everything.
    """
    if not result.found:
        raise ValueError("no spring meets everything, so there is nothing to draw")
    case, say, cloud = result.assessment.case, result.assessment.say, result.cloud
    number, unit = result.assessment.target
    per_pass = number / case.duty.target_passes
    scale = convert(1.0, say.units["mass"], "mass")
    every = slice(None, None, -(-cloud.mass.size // DRAWN))
    lives = cloud.passes[every] * per_pass
    finite = lives[np.isfinite(lives) & (lives > 0)]
    top, bottom = 10 * max([*finite, number]), min([*finite, number]) / 10

    def life(one: Candidate) -> float:
        return top if one.passes is None else one.passes * per_pass

    with axes_in_style() as (figure, axes):
        for peened, marker, label in ((False, "o", "not peened"), (True, "s", "shot-peened")):
            mine = cloud.peened[every] == peened
            heights = np.clip(lives[mine], bottom, top)
            axes.plot(scale * cloud.mass[every][mine], heights, marker, color=GREY, markersize=1.5, alpha=0.4)
            offered = [one for one in result.found if one.spring.shot_peened == peened]
            if offered:
                masses = [one.spring.mass * scale for one in offered]
                axes.plot(masses, [life(one) for one in offered], marker, color=INK, markersize=5,
                          label=f"offered, {label}", clip_on=False)  # fmt: skip
        best = result.found[0]
        axes.plot(best.spring.mass * scale, life(best), "o", markerfacecolor="none", color=ACCENT, markersize=13,
                  markeredgewidth=1.8, label=f"best on {result.settings.goal}", clip_on=False)  # fmt: skip
        axes.plot([], [], "o", color=GREY, markersize=2.5, label="pass the static checks")
        axes.axhline(number, color=GREY, linestyle=(0, (3, 3)), linewidth=1.0, label="target")
        axes.set_yscale("log")
        axes.set_ylim(bottom, top)
        if np.isinf(lives).any():
            axes.set_title("springs on the upper edge: no damage, unlimited", fontsize=8, loc="left", color=GREY)
        axes.set_xlabel(f"mass, {say.units['mass']}")
        axes.set_ylabel(f"life, {unit}")
        axes.legend(frameon=False)
    return figure
