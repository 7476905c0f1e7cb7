"""The figure of a sizing, in the style of the other figures."""

from __future__ import annotations

from typing import TYPE_CHECKING

from springlife.report.figures import ACCENT, GREY, INK, axes_in_style
from springlife.units import convert

if TYPE_CHECKING:
    from matplotlib.figure import Figure

    from springlife.life.size import Candidate, Sizing


def life_over_mass(result: Sizing) -> Figure:
    """Draw life over mass of the springs that meet everything; the best marked, the target as a line.

    Raises
    ------
    ValueError
        When no spring meets everything.
    """
    if not result.found:
        raise ValueError("no spring meets everything, so there is nothing to draw")
    case, say = result.assessment.case, result.assessment.say
    number, unit = result.assessment.target
    per_pass = number / case.duty.target_passes
    scale = convert(1.0, say.units["mass"], "mass")
    finite = [one.passes * per_pass for one in result.found if one.passes is not None]
    top = 10 * max([*finite, number])

    def life(one: Candidate) -> float:
        return top if one.passes is None else one.passes * per_pass

    with axes_in_style() as (figure, axes):
        for peened, marker in ((False, "o"), (True, "s")):
            mine = [one for one in result.found if one.spring.shot_peened == peened]
            label = "shot-peened" if peened else "not peened"
            if mine:
                masses = [one.spring.mass * scale for one in mine]
                axes.plot(
                    masses, [life(one) for one in mine], marker, color=INK, markersize=5, label=label, clip_on=False
                )
        best = result.found[0]
        axes.plot(best.spring.mass * scale, life(best), "o", markerfacecolor="none", color=ACCENT, markersize=13,
                  markeredgewidth=1.8, label=f"best on {result.settings.goal}")  # fmt: skip
        axes.axhline(number, color=GREY, linestyle=(0, (3, 3)), linewidth=1.0, label="target")
        axes.set_yscale("log")
        if len(finite) < len(result.found):
            axes.set_title("springs on the upper edge: no damage, unlimited", fontsize=8, loc="left", color=GREY)
            axes.set_ylim(top=top)
        axes.set_xlabel(f"mass, {say.units['mass']}")
        axes.set_ylabel(f"life, {unit}")
        axes.legend(frameon=False)
    return figure
